package screen

// The smallest terminal that shows something of use, and the one that is assumed
// where the terminal does not tell.
const (
	leastWidth, leastHeight = 60, 18
	usualWidth, usualHeight = 80, 24
)

// box is a rectangle of cells.
type box struct{ x, y, w, h int }

// layout places the regions. From top to bottom: one line of header, the body,
// one line of message, one of keys. In the body the plane stands above the traces
// and the readings to the right of both.
type layout struct {
	tooSmall bool
	body     int // rows
	left     int // width of plane and traces
	plane    box // without its title line
	traces   box
	readings box
	panels   int // traces side by side
}

const gap = 3 // columns between plane and readings

func arrange(w, h int) layout {
	if w < leastWidth || h < leastHeight {
		return layout{tooSmall: true}
	}
	l := layout{body: h - 3}
	right := min(23+w/10, 46)
	l.left = w - right - gap
	below := max(l.body*36/100, 6)
	rows := l.body - 1 - below
	if rows%2 == 0 { // the real axis is the middle row
		rows--
		below++
	}
	l.plane = box{0, 1, l.left, rows}
	l.traces = box{0, 1 + rows, l.left, below}
	l.readings = box{l.left + gap, 0, right, l.body}
	l.panels = min(max((l.left+gap)/68, 1), 3)
	return l
}

// resize takes a new size of the terminal.
func (m *Model) resize(w, h int) {
	if w <= 0 || h <= 0 {
		w, h = usualWidth, usualHeight
	}
	m.w, m.h = w, h
	m.lay = arrange(w, h)
	m.newRun()
	m.dirty = everything
}
