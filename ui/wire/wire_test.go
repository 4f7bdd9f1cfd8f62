package wire_test

import (
	"fmt"
	"strings"
	"testing"
	"unicode/utf8"

	"pgregory.net/rapid"

	"polewright/ui/canvas"
	"polewright/ui/theme"
	"polewright/ui/wire"
)

// terminal is a plain terminal: every sequence does what ECMA-48 says, one cell at
// a time. What erasing leaves has the shade in force, as many terminals have it.
type terminal struct {
	t        testing.TB
	w, h     int
	cells    []string // character and style, by row
	row, col int
	ink      string
	shade    string
}

func newTerminal(t testing.TB, w, h int) *terminal {
	v := &terminal{t: t, w: w, h: h}
	for i := range w * h {
		v.cells = append(v.cells, fmt.Sprintf("?%d", i)) // what another program left
	}
	return v
}

func (v *terminal) put(s string, n int) {
	if v.row >= v.h || v.col+n > v.w {
		v.t.Fatalf("%q is written outside, at %d, %d", s, v.row, v.col)
	}
	start := v.row*v.w + v.col // half a wide character goes with its other half
	if start > 0 && v.cells[start] == "half" {
		v.cells[start-1] = "gone"
	}
	if end := start + n; end < len(v.cells) && v.cells[end] == "half" {
		v.cells[end] = "gone"
	}
	for i := range n {
		style := v.ink + v.shade
		if s == " " {
			style = v.shade
		}
		v.cells[v.row*v.w+v.col] = s + style
		if i > 0 {
			v.cells[v.row*v.w+v.col] = "half"
		}
		v.col++
	}
}

func (v *terminal) blank(n int) {
	at := v.row*v.w + v.col
	for i := range min(n, v.w-v.col) {
		v.cells[at+i] = " " + v.shade
	}
}

func (v *terminal) write(p []byte) {
	for len(p) > 0 {
		switch {
		case p[0] == '\r':
			v.col, p = 0, p[1:]
		case p[0] == '\n':
			v.row, p = v.row+1, p[1:]
		case p[0] == 0x1b:
			end := strings.IndexFunc(string(p), func(r rune) bool { return r >= '@' && r != '[' })
			args, final := string(p[2:end]), p[end]
			var a, b int
			fmt.Sscanf(args, "%d;%d", &a, &b)
			switch final {
			case 'm':
				switch {
				case args == "":
					v.ink, v.shade = "", ""
				case args == "49":
					v.shade = ""
				case strings.HasPrefix(args, "48;"):
					v.shade = args
				default:
					v.ink, v.shade = args, ""
				}
			case 'H':
				v.row, v.col = max(a, 1)-1, max(b, 1)-1
			case 'C':
				v.col = min(v.col+a, v.w-1)
			case 'X':
				v.blank(a)
			case 'K':
				v.blank(v.w)
			default:
				v.t.Fatalf("the terminal does not know %q", p[:end+1])
			}
			p = p[end+1:]
		default:
			r, n := utf8.DecodeRune(p)
			v.put(string(r), canvas.Width(r))
			p = p[n:]
		}
	}
}

// renderer sends the lines that differ, as the screen's one does.
func renderer(lines, before []string, w int) []byte {
	out := "\x1b[H"
	for i, l := range lines {
		if before == nil || before[i] != l {
			if i == 0 && before == nil {
				out += "\r"
			}
			out += l
			if width(l) < w {
				out += "\x1b[K"
			}
			if i < len(lines)-1 {
				out += "\r"
			}
		}
		if i < len(lines)-1 {
			out += "\n"
		}
	}
	return []byte(out + fmt.Sprintf("\x1b[%d;H", len(lines)))
}

// width of a line with sequences of style and long blanks.
func width(l string) int {
	n := 0
	for len(l) > 0 {
		if l[0] == 0x1b {
			end := strings.IndexFunc(l, func(r rune) bool { return r >= '@' && r != '[' })
			if l[end] == 'C' {
				var k int
				fmt.Sscanf(l[2:], "%d", &k)
				n += k
			}
			l = l[end+1:]
			continue
		}
		r, k := utf8.DecodeRuneInString(l)
		n += canvas.Width(r)
		l = l[k:]
	}
	return n
}

// Whatever changes, the terminal shows the same cells as if all had been sent.
func TestTheSameIsShown(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		w, h := rapid.IntRange(12, 60).Draw(t, "w"), rapid.IntRange(2, 5).Draw(t, "h")
		th := theme.New(theme.Options{Depth: theme.Depth(rapid.IntRange(0, 3).Draw(t, "depth"))})
		plain, thin := newTerminal(bare{t: t}, w, h), newTerminal(bare{t: t}, w, h)
		var thinner wire.Thinner
		var c canvas.Canvas
		c.Reset(w, h)
		var before []string
		for range rapid.IntRange(1, 12).Draw(t, "frames") {
			for range rapid.IntRange(0, 6).Draw(t, "changes") {
				x, y := rapid.IntRange(-2, w).Draw(t, "x"), rapid.IntRange(0, h-1).Draw(t, "y")
				ink := theme.Ink(rapid.IntRange(0, int(theme.Grid)).Draw(t, "ink"))
				switch text := rapid.SampledFrom([]string{"●", "12.50", "漢字", strings.Repeat(" ", 20), "a long line of words that goes on", ""}).Draw(t, "text"); text {
				case "":
					level := uint8(rapid.IntRange(0, theme.Shades-1).Draw(t, "level"))
					for i := range 9 {
						c.Shade(x+i, y, level)
					}
				default:
					c.Text(x, y, text, ink)
				}
			}
			lines := c.Lines(th, rapid.Bool().Draw(t, "trim"))
			if rapid.IntRange(0, 5).Draw(t, "repaint") == 0 {
				before = nil // as after a resize, when nothing is known for sure
				thin.cells[rapid.IntRange(0, w*h-1).Draw(t, "spoiled")] = "spoiled"
			}
			frame := renderer(lines, before, w)
			plain.write(frame)
			thin.write(thinner.Thin(frame))
			if strings.Join(plain.cells, "|") != strings.Join(thin.cells, "|") {
				t.Fatalf("frame %q\nsent %q\nshown %q\n want %q", frame, thinner.Thin(frame), thin.cells, plain.cells)
			}
			before = lines
		}
	})
}

// bare lets a terminal live inside a property.
type bare struct {
	testing.TB
	t *rapid.T
}

func (b bare) Fatalf(f string, a ...any) { b.t.Fatalf(f, a...) }

func TestOnlyWhatChangesIsSent(t *testing.T) {
	var th wire.Thinner
	first := []string{"noise  1.18 x floor", "settle 0.50 s", "last"}
	th.Thin(renderer(first, nil, 40))
	next := []string{"noise  1.19 x floor", "settle 0.50 s", "last"}
	if got := string(th.Thin(renderer(next, first, 40))); got != "\x1b[1;11H9" {
		t.Errorf("%q", got)
	}
	if got := string(th.Thin(renderer(next, next, 40))); got != "" {
		t.Errorf("%q for the same frame", got)
	}
	shorter := []string{"noise", "settle 0.50 s", "last"}
	if got := string(th.Thin(renderer(shorter, next, 40))); got != "\x1b[1;6H\x1b[K" {
		t.Errorf("%q", got)
	}
}

// What is no frame goes through whole, with the cursor where the renderer left it,
// and makes the next frame a full one.
func TestOtherThingsGoThrough(t *testing.T) {
	var th wire.Thinner
	lines := []string{"one", "two"}
	th.Thin(renderer(lines, nil, 20))
	th.Thin(renderer([]string{"one!", "two"}, lines, 20))
	if got := string(th.Thin([]byte("\x1b[2K"))); got != "\x1b[2;1H\x1b[2K" {
		t.Errorf("%q", got)
	}
	if got := string(th.Thin(renderer([]string{"one!", "two"}, []string{"", "two"}, 20))); !strings.Contains(got, "one!") {
		t.Errorf("%q: what another wrote over is not sent again", got)
	}
	for _, odd := range []string{"\x1b[Hx\x1b[3Jy", "\x1b[H\x1b[7mx", "\x1b[H\x07", "\x1b[Ha\x1b", "\x1b[H\xff", "\x1b[Ha\u0301", "\x1b[H\x1b[5;7Hx", "\x1b[H\x1b[99999;Hx"} {
		if got := string(th.Thin([]byte(odd))); !strings.HasSuffix(got, odd) {
			t.Errorf("%q became %q", odd, got)
		}
	}
}

func BenchmarkThin(b *testing.B) {
	var lines [2][]string
	for k := range lines {
		for y := range 40 {
			lines[k] = append(lines[k], fmt.Sprintf("\x1b[0;38;5;244m%s\x1b[m %d %d", strings.Repeat("· ", 40), y, k))
		}
	}
	frames := [2][]byte{renderer(lines[0], lines[1], 120), renderer(lines[1], append([]string{lines[1][0]}, lines[0][1:]...), 120)}
	var th wire.Thinner
	b.ReportAllocs()
	for i := 0; b.Loop(); i++ {
		th.Thin(frames[i%2])
	}
}
