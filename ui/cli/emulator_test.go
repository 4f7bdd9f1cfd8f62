//go:build unix

package cli_test

import (
	"strconv"
	"strings"
	"unicode/utf8"
)

// emulator keeps what a terminal shows of the bytes it was sent: enough of one for
// what the program sends, all characters one cell wide.
type emulator struct {
	rows, cols int
	cells      [][]rune
	main       [][]rune // while the alternate screen is shown
	row, col   int
	rest       []byte // a sequence that is not whole yet
}

func newEmulator(rows, cols int) *emulator {
	e := &emulator{rows: rows, cols: cols}
	e.cells = e.blank()
	return e
}

func (e *emulator) blank() [][]rune {
	cells := make([][]rune, e.rows)
	for i := range cells {
		cells[i] = []rune(strings.Repeat(" ", e.cols))
	}
	return cells
}

func (e *emulator) resize(rows, cols int) {
	old := e.cells
	e.rows, e.cols = rows, cols
	e.cells = e.blank()
	for i := range min(rows, len(old)) {
		copy(e.cells[i], old[i])
	}
	e.row, e.col = min(e.row, rows-1), min(e.col, cols-1)
}

// text is the screen, one line per row.
func (e *emulator) text() string {
	lines := make([]string, len(e.cells))
	for i, r := range e.cells {
		lines[i] = strings.TrimRight(string(r), " ")
	}
	return strings.Join(lines, "\n")
}

func (e *emulator) write(p []byte) {
	p = append(e.rest, p...)
	e.rest = nil
	for len(p) > 0 {
		n := e.next(p)
		if n == 0 {
			e.rest = append([]byte(nil), p...)
			return
		}
		p = p[n:]
	}
}

// next takes one character or sequence and returns its length, 0 where it is not
// whole.
func (e *emulator) next(p []byte) int {
	switch p[0] {
	case '\r':
		e.col = 0
	case '\n':
		e.row++
		if e.row == e.rows {
			e.cells = append(e.cells[1:], []rune(strings.Repeat(" ", e.cols)))
			e.row--
		}
	case '\b':
		e.col = max(e.col-1, 0)
	case 0x1b:
		return e.escape(p)
	default:
		if p[0] < ' ' {
			return 1
		}
		if !utf8.FullRune(p) {
			return 0
		}
		r, n := utf8.DecodeRune(p)
		if e.col == e.cols { // the wrap that was pending
			e.col = 0
			e.next([]byte("\n"))
		}
		e.cells[e.row][e.col] = r
		e.col++
		return n
	}
	return 1
}

func (e *emulator) escape(p []byte) int {
	if len(p) < 2 {
		return 0
	}
	switch p[1] {
	case '[':
		for i := 2; i < len(p); i++ {
			if p[i] >= 0x40 && p[i] <= 0x7e {
				e.control(string(p[2:i]), p[i])
				return i + 1
			}
		}
		return 0
	case ']': // up to BEL or ESC \
		for i := 2; i < len(p); i++ {
			if p[i] == 7 {
				return i + 1
			}
			if p[i] == '\\' && p[i-1] == 0x1b {
				return i + 1
			}
		}
		return 0
	case '(', ')':
		if len(p) < 3 {
			return 0
		}
		return 3
	}
	return 2
}

func (e *emulator) control(args string, final byte) {
	var n [2]int
	for i, a := range strings.SplitN(args, ";", 3) {
		if i < 2 {
			n[i], _ = strconv.Atoi(a)
		}
	}
	one := max(n[0], 1)
	switch final {
	case 'A':
		e.row = max(e.row-one, 0)
	case 'B':
		e.row = min(e.row+one, e.rows-1)
	case 'C':
		e.col = min(e.col+one, e.cols-1)
	case 'D':
		e.col = max(e.col-one, 0)
	case 'G':
		e.col = min(one, e.cols) - 1
	case 'd':
		e.row = min(one, e.rows) - 1
	case 'H':
		e.row, e.col = min(one, e.rows)-1, min(max(n[1], 1), e.cols)-1
	case 'X':
		e.erase(e.row, e.col, e.col+one)
	case 'K':
		from, to := []int{e.col, 0, 0}[n[0]%3], []int{e.cols, e.col + 1, e.cols}[n[0]%3]
		e.erase(e.row, from, to)
	case 'J':
		if n[0] == 2 {
			e.cells = e.blank()
			return
		}
		e.erase(e.row, e.col, e.cols)
		for r := e.row + 1; r < e.rows; r++ {
			e.erase(r, 0, e.cols)
		}
	case 'h', 'l':
		e.mode(args, final == 'h')
	}
}

func (e *emulator) erase(row, from, to int) {
	for i := max(from, 0); i < min(to, e.cols); i++ {
		e.cells[row][i] = ' '
	}
}

func (e *emulator) mode(args string, on bool) {
	if args != "?1049" {
		return
	}
	switch {
	case on && e.main == nil:
		e.main, e.cells = e.cells, e.blank()
	case !on && e.main != nil:
		old := e.main
		e.main, e.cells = nil, e.blank()
		for i := range min(e.rows, len(old)) {
			copy(e.cells[i], old[i])
		}
	}
}
