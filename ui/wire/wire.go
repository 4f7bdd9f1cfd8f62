// Package wire stands between the renderer and the terminal and sends only the
// cells that change. The renderer sends whole lines; over a slow link most of
// their bytes say what the screen shows already.
package wire

import (
	"bytes"
	"os"
	"sync"
	"unicode/utf8"

	"polewright/ui/canvas"
)

// Terminal is the file of a terminal whose frames are thinned. It knows a frame
// by how it begins: with the cursor at home. Whatever else is written, and every
// frame that it does not understand, goes through as it is.
type Terminal struct {
	*os.File
	mu   sync.Mutex
	thin Thinner
}

// New takes over what is written to a terminal.
func New(f *os.File) *Terminal { return &Terminal{File: f} }

// Write takes one whole frame, or anything that is none.
func (t *Terminal) Write(p []byte) (int, error) {
	t.mu.Lock()
	defer t.mu.Unlock()
	out := t.thin.Thin(p)
	if len(out) == 0 {
		return len(p), nil
	}
	if _, err := t.File.Write(out); err != nil {
		return 0, err
	}
	return len(p), nil
}

// Pass sends a sequence that shows nothing, between two frames. Frames do not notice.
func (t *Terminal) Pass(sequence string) error {
	t.mu.Lock()
	defer t.mu.Unlock()
	_, err := t.File.WriteString(sequence)
	return err
}

// WriteString is Write; it keeps that of the file from being used.
func (t *Terminal) WriteString(s string) (int, error) { return t.Write([]byte(s)) }

// Thinner knows what a terminal shows. Its zero value knows nothing yet.
type Thinner struct {
	shown, next []row
	styles      []string // of cells, by number less one; 0 is plain
	parser      parser
	out         []byte
	row, col    int  // where the renderer believes the cursor to be
	moved       bool // the cursor is elsewhere
}

// cell is a character, the style of its ink, and that of the shade behind it.
type cell struct {
	r           rune
	front, back uint8
}

// unknown is a cell of which nothing is known.
var unknown = cell{r: -1}

var blank = cell{r: ' '}

// row is a line of cells. Behind them all is blank, or unknown.
type row struct {
	cells   []cell
	blank   bool // the rest is
	touched bool // by this frame
	erased  bool // the rest, by this frame
}

func (r *row) at(i int) cell {
	switch {
	case i < len(r.cells):
		return r.cells[i]
	case r.blank:
		return blank
	}
	return unknown
}

// set puts a cell, filling what lies before it.
func (r *row) set(i int, c cell) {
	for len(r.cells) <= i {
		r.cells = append(r.cells, r.at(len(r.cells)))
	}
	r.cells[i], r.touched = c, true
}

// erase blanks the rest from column i on.
func (r *row) erase(i int) {
	for len(r.cells) < i {
		r.cells = append(r.cells, r.at(len(r.cells)))
	}
	r.cells, r.blank, r.touched, r.erased = r.cells[:i], true, true, true
}

// forget drops all knowledge.
func (t *Thinner) forget() {
	for i := range t.shown {
		t.shown[i] = row{cells: t.shown[i].cells[:0]}
	}
}

var home = []byte("\x1b[H")

// Thin returns what to send in place of p; it is valid until the next call.
func (t *Thinner) Thin(p []byte) []byte {
	t.out = t.out[:0]
	if bytes.HasPrefix(p, home) && t.parse(p) {
		t.diff()
		return t.out
	}
	if t.moved {
		t.move(t.row, t.col)
		t.moved = false
	}
	t.forget()
	t.out = append(t.out, p...)
	return t.out
}

// parse applies a frame to a copy of what is shown; false where it has something
// else than a frame has.
func (t *Thinner) parse(p []byte) bool {
	t.next = t.next[:min(len(t.next), len(t.shown))]
	for len(t.next) < len(t.shown) {
		t.next = append(t.next, row{})
	}
	for i := range t.shown {
		s, n := &t.shown[i], &t.next[i]
		n.cells, n.blank, n.touched, n.erased = append(n.cells[:0], s.cells...), s.blank, false, false
	}
	t.parser = parser{t: t}
	skipped := false
	for i := 0; i < len(p); {
		switch b := p[i]; {
		case b == 0x1b:
			n := t.parser.sequence(p[i:])
			if n == 0 {
				return false
			}
			i += n
		case b == '\r':
			t.parser.col = 0
			i++
		case b == '\n':
			skipped = skipped || i == 0 || p[i-1] != '\r'
			t.parser.row++
			i++
		case b < ' ' || b == 0x7f:
			return false
		default:
			r, n := utf8.DecodeRune(p[i:])
			if !t.parser.put(r) {
				return false
			}
			i += n
		}
	}
	t.row, t.col = t.parser.row, t.parser.col
	if !skipped { // all is drawn anew, and there is a reason for it
		t.forget()
		for i := range t.next {
			t.next[i].blank = t.next[i].erased
		}
	}
	return t.parser.front == 0 && t.parser.back == 0
}

// parser is the state of a terminal that reads a frame.
type parser struct {
	t           *Thinner
	row, col    int
	front, back uint8
}

const (
	mostRows  = 2000
	mostCells = 5000
)

func (p *parser) line() *row {
	t := p.t
	for len(t.next) <= p.row {
		t.next = append(t.next, row{})
	}
	for len(t.shown) < len(t.next) {
		t.shown = append(t.shown, row{})
	}
	return &t.next[p.row]
}

// put draws one character. A wide one has a cell with the rune 0 behind it.
func (p *parser) put(r rune) bool {
	w := canvas.Width(r)
	if w < 1 || w > 2 || r == utf8.RuneError || p.row >= mostRows || p.col >= mostCells {
		return false
	}
	l := p.line()
	c := cell{r, p.front, p.back}
	if r == ' ' {
		c.front = 0 // nothing of it is seen
	}
	l.set(p.col, c)
	if w == 2 {
		l.set(p.col+1, cell{0, p.front, p.back})
	}
	p.col += w
	return true
}

// sequence reads a control sequence and returns its length, 0 where a frame has
// no such one.
func (p *parser) sequence(s []byte) int {
	if len(s) < 3 || s[1] != '[' {
		return 0
	}
	n := 2
	for n < len(s) && (s[n] >= '0' && s[n] <= '9' || s[n] == ';') {
		n++
	}
	if n == len(s) {
		return 0
	}
	args := s[2:n]
	count := 0
	for _, b := range args {
		if b == ';' {
			break
		}
		count = min(count*10+int(b-'0'), mostCells)
	}
	n++
	switch s[n-1] {
	case 'm':
		if !p.style(args, s[:n]) {
			return 0
		}
	case 'H': // home, or the start of a line
		p.row, p.col = max(count, 1)-1, 0
		if i := bytes.IndexByte(args, ';'); i >= 0 && i != len(args)-1 || p.row >= mostRows {
			return 0
		}
	case 'K':
		if len(args) > 0 || p.back != 0 {
			return 0
		}
		p.line().erase(p.col)
	case 'X':
		if p.back != 0 {
			return 0
		}
		for i := range max(count, 1) {
			p.line().set(p.col+i, blank)
		}
	case 'C':
		p.col += max(count, 1)
	default:
		return 0
	}
	return n
}

// style takes the styles of the theme: each starts with a reset, but for the
// shades, which leave the ink.
func (p *parser) style(args, whole []byte) bool {
	switch {
	case len(args) == 0 || len(args) == 1 && args[0] == '0':
		p.front, p.back = 0, 0
	case bytes.Equal(args, []byte("49")):
		p.back = 0
	case bytes.HasPrefix(args, []byte("48;")):
		p.back = p.t.number(whole)
		return p.back != 0
	case bytes.HasPrefix(args, []byte("0;")):
		p.front, p.back = p.t.number(whole), 0
		return p.front != 0
	default:
		return false
	}
	return true
}

// number of a style; 0 where there are too many.
func (t *Thinner) number(sequence []byte) uint8 {
	for i, s := range t.styles {
		if s == string(sequence) {
			return uint8(i + 1)
		}
	}
	if len(t.styles) >= 200 {
		return 0
	}
	t.styles = append(t.styles, string(sequence))
	return uint8(len(t.styles))
}
