package screen

import (
	"strconv"
	"strings"
	"time"

	tea "github.com/charmbracelet/bubbletea"
)

// What goes to the terminal. A renderer may send a whole line when one cell of it
// changes, so lines are kept short, and over a slow link only some of them go out
// while poles move.

// longBlank is the run of blanks from which erasing them and moving on (two
// sequences, 10 bytes) is shorter.
const longBlank = 11

// shorten replaces long runs of blanks by ECH and CUF (ECMA-48), which leave the
// same cells blank. Blanks on a shade are sent as such: terminals differ in what
// erasing leaves behind them.
func shorten(frame string) string {
	if !strings.Contains(frame, strings.Repeat(" ", longBlank)) {
		return frame
	}
	b := make([]byte, 0, len(frame))
	shaded := false
	for i := 0; i < len(frame); {
		if frame[i] == '\x1b' {
			switch rest := frame[i:]; {
			case strings.HasPrefix(rest, "\x1b[48;"):
				shaded = true
			case strings.HasPrefix(rest, "\x1b[49m"), strings.HasPrefix(rest, "\x1b[0"), strings.HasPrefix(rest, "\x1b[m"):
				shaded = false
			}
		}
		if frame[i] != ' ' || shaded {
			b = append(b, frame[i])
			i++
			continue
		}
		n := 1
		for i+n < len(frame) && frame[i+n] == ' ' {
			n++
		}
		if n < longBlank {
			b = append(b, frame[i:i+n]...)
		} else {
			count := strconv.Itoa(n)
			b = append(append(append(b, "\x1b["...), count...), "X\x1b["...)
			b = append(append(b, count...), 'C')
		}
		i += n
	}
	return string(b)
}

// calmRate is how many bytes a second go out while poles move, where the link is
// slow.
const calmRate = 900

// calmAgain is how soon lines that were held back are tried again.
const calmAgain = 400 * time.Millisecond

type calmMsg struct{}

// trickle lets those changed lines through for which there is room, the status
// and the plane's before the others. Lines that are held back keep their old
// text until there is room, or the hands rest.
type trickle struct {
	room   float64 // bytes
	at     time.Time
	behind bool // some lines are held back
	ticks  bool
}

func (m *Model) calm(frame string) string {
	now := m.cfg.Now()
	c := &m.slow
	if c.at.IsZero() {
		c.room = calmRate
	}
	c.room = min(c.room+calmRate*now.Sub(c.at).Seconds(), calmRate)
	c.at, c.behind = now, false
	if !m.resting || m.frame == "" {
		return frame
	}
	next, shown := strings.Split(frame, "\n"), strings.Split(m.frame, "\n")
	if len(next) != len(shown) {
		return frame
	}
	for _, y := range m.urgency(len(next)) {
		if next[y] == shown[y] {
			continue
		}
		cost := float64(difference(shown[y], next[y]))
		if cost > c.room {
			c.behind = true
			continue
		}
		c.room -= cost
		shown[y] = next[y]
	}
	return strings.Join(shown, "\n")
}

// difference bounds the bytes that change one line into another where only the
// cells that differ are sent: those between the first and the last of them, with
// moving there and an ink before and after.
func difference(a, b string) int {
	const around = 30
	n := min(len(a), len(b))
	head := 0
	for head < n && a[head] == b[head] {
		head++
	}
	tail := 0
	for tail < n-head && a[len(a)-1-tail] == b[len(b)-1-tail] {
		tail++
	}
	return min(max(len(b)-head-tail, 0)+around, len(b)+around/3)
}

// urgency are the lines in the order in which they go out: where the held pole
// is, the status, and the rest from the top.
func (m *Model) urgency(n int) []int {
	var order []int
	if p, ok := m.heldPlace(); ok && m.open == none && m.window.Inside(p) {
		order = append(order, 1+m.lay.plane.y+m.window.Row(imag(p)), 1+m.lay.plane.y+m.window.Row(-imag(p)))
	}
	order = append(order, n-2, n-1)
	for y := range n {
		order = append(order, y)
	}
	return order
}

// catchUp tries the lines that were held back, in a while.
func (m *Model) catchUp() tea.Cmd {
	if !m.slow.behind || m.slow.ticks {
		return nil
	}
	m.slow.ticks = true
	return tea.Tick(calmAgain, func(time.Time) tea.Msg { return calmMsg{} })
}
