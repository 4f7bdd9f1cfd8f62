package wire

import (
	"strconv"
	"unicode/utf8"
)

// diff sends the cells in which next differs from shown, and takes it for shown.
func (t *Thinner) diff() {
	p := printer{t: t}
	for y := range t.next {
		if t.next[y].touched {
			p.row = y
			p.line(&t.shown[y], &t.next[y])
		}
	}
	if p.front != 0 || p.back != 0 {
		t.out = append(t.out, plain...)
	}
	t.moved = t.moved || len(t.out) > 0
	t.shown, t.next = t.next, t.shown
}

const plain = "\x1b[m"

// printer is the state of the terminal that is written to.
type printer struct {
	t           *Thinner
	row         int
	at          int  // column of the cursor
	placed      bool // the cursor is in this row
	front, back uint8
}

// Moving on by less than near cells costs more than sending them again; blanks
// from erased cells on are erased, which costs two sequences.
const (
	near   = 5
	erased = 11
)

func (p *printer) line(old, new *row) {
	p.placed = false
	end := max(len(old.cells), len(new.cells))
	rest := end // from here on the new row is blank
	if new.blank {
		for rest > 0 && new.at(rest-1) == blank {
			rest--
		}
	}
	wide := false // half a character is never sent: such rows go whole
	for i := range end {
		wide = wide || old.at(i).r == 0 || new.at(i).r == 0
	}
	same := func(i int) bool { return !wide && old.at(i) == new.at(i) }
	if wide && equal(old, new, end) {
		return
	}
	for i := 0; i < rest; {
		if new.at(i) == unknown || same(i) {
			i++
			continue
		}
		p.goTo(i)
		i = p.run(i, rest, new, same)
	}
	if !new.blank {
		return
	}
	for i := rest; i < end || i == end && !old.blank; i++ { // the last: what lies behind all cells
		if old.at(i) != blank || i == end {
			p.goTo(rest)
			p.paint(0, 0)
			p.t.out = append(p.t.out, "\x1b[K"...)
			return
		}
	}
}

func equal(a, b *row, end int) bool {
	for i := range end {
		if a.at(i) != b.at(i) {
			return false
		}
	}
	return a.blank == b.blank
}

// run sends cells from i on until there is more to skip than to send.
func (p *printer) run(i, end int, new *row, same func(int) bool) int {
	for i < end {
		gap := 0
		for i+gap < end && same(i+gap) {
			gap++
		}
		if gap >= near || i+gap == end {
			return i + gap
		}
		c := new.at(i)
		if c == unknown {
			return i
		}
		n := 0
		for c == blank && i+n < end && new.at(i+n) == blank {
			n++
		}
		if n >= erased {
			p.paint(p.front, 0)
			count := strconv.Itoa(n)
			p.t.out = append(append(append(p.t.out, "\x1b["...), count...), 'X')
			i += n
			p.goTo(i)
			continue
		}
		if c.r == 0 {
			i++
			continue
		}
		front := c.front
		if c.r == ' ' {
			front = p.front
		}
		p.paint(front, c.back)
		p.t.out = utf8.AppendRune(p.t.out, c.r)
		i++
		p.at++
		if i < end && new.at(i).r == 0 {
			p.at++
		}
	}
	return i
}

// goTo moves the cursor to a column of this row.
func (p *printer) goTo(col int) {
	switch {
	case !p.placed:
		p.t.move(p.row, col)
	case col > p.at:
		p.t.out = append(strconv.AppendInt(append(p.t.out, "\x1b["...), int64(col-p.at), 10), 'C')
	}
	p.at, p.placed = col, true
}

// move moves the cursor to a cell.
func (t *Thinner) move(row, col int) {
	t.out = strconv.AppendInt(append(t.out, "\x1b["...), int64(row+1), 10)
	t.out = append(strconv.AppendInt(append(t.out, ';'), int64(col+1), 10), 'H')
}

// paint sets the styles of what follows.
func (p *printer) paint(front, back uint8) {
	if front != p.front {
		p.t.out = append(p.t.out, p.t.sequence(front, plain)...)
		p.front, p.back = front, 0
	}
	if back != p.back {
		p.t.out = append(p.t.out, p.t.sequence(back, "\x1b[49m")...)
		p.back = back
	}
}

func (t *Thinner) sequence(n uint8, none string) string {
	if n == 0 {
		return none
	}
	return t.styles[n-1]
}
