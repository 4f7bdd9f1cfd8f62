package canvas_test

import (
	"strings"
	"testing"

	"github.com/charmbracelet/x/ansi"
	"pgregory.net/rapid"

	"polewright/ui/canvas"
	"polewright/ui/theme"
)

var colour = theme.New(theme.Options{Depth: theme.Sixteen, Dark: true})

func TestRunsOfEqualInk(t *testing.T) {
	var c canvas.Canvas
	c.Reset(12, 1)
	c.Text(0, 0, "ab", theme.Faint)
	c.Text(4, 0, "cd", theme.Faint) // the blanks between do not end the run
	c.Text(7, 0, "e", theme.Text)
	line := c.Lines(colour, true)[0]
	if want := colour.Open(theme.Faint) + "ab  cd " + colour.Open(theme.Text) + "e"; line != want {
		t.Errorf("%q, expected %q", line, want)
	}
}

func TestListsAreCutBetweenEntries(t *testing.T) {
	list := []string{"damp -30%", "drive +10%", "mass +10%"}
	for w, want := range map[int]string{32: "damp -30%, drive +10%, mass +10%", 31: "damp -30%, drive +10%, 1 more",
		28: "damp -30%, 2 more", 16: "damp -30%, driv~"} {
		if got := canvas.CutList(list, w, '~'); got != want {
			t.Errorf("%d cells: %q, expected %q", w, got, want)
		}
	}
}

func TestDrawingOutsideIsIgnored(t *testing.T) {
	var c canvas.Canvas
	c.Reset(3, 2)
	c.Text(-1, 0, "xyzuv", theme.Text)
	c.Text(0, 5, "no", theme.Text)
	c.Set(3, 1, 'x', theme.Text)
	if got := strings.Join(c.Lines(colour, true), "/"); got != "yzu/" {
		t.Errorf("%q", got)
	}
}

func TestWideAndControlCharacters(t *testing.T) {
	var c canvas.Canvas
	c.Reset(6, 1)
	c.Text(0, 0, "漢\x1b[31m\x07字ab", theme.Text) // the escape is gone, its letters are text
	if got := c.Lines(colour, true)[0]; got != "漢[31m" {
		t.Errorf("%q", got)
	}
	c.Reset(4, 1)
	c.Text(0, 0, "漢字", theme.Text)
	c.Set(1, 0, 'x', theme.Text) // half of a wide character takes all of it
	if got := c.Lines(colour, true)[0]; got != " x字" {
		t.Errorf("%q", got)
	}
}

func TestASCIIShowsNothingElse(t *testing.T) {
	var c canvas.Canvas
	c.Reset(8, 1)
	c.Text(0, 0, "é漢x", theme.Text)
	if got := c.Lines(theme.New(theme.Options{ASCII: true}), true)[0]; got != "???x" {
		t.Errorf("%q", got)
	}
}

func TestCutAndWrap(t *testing.T) {
	for _, c := range []struct {
		text string
		w    int
		want string
	}{{"climb speed", 11, "climb speed"}, {"climb speed", 6, "climb…"}, {"漢字漢", 4, "漢…"}, {"x", 0, ""}} {
		if got := canvas.Cut(c.text, c.w, '…'); got != c.want {
			t.Errorf("cut %q to %d: %q, expected %q", c.text, c.w, got, c.want)
		}
	}
	if got := strings.Join(canvas.Wrap("one two  longerthanthat x", 7), "|"); got != "one two|longert|hanthat|x" {
		t.Errorf("wrapped to %q", got)
	}
}

// Every row of any drawing is as wide as the canvas.
func TestRowsAreAsWideAsTheCanvas(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		var c canvas.Canvas
		w := rapid.IntRange(1, 20).Draw(t, "w")
		c.Reset(w, 2)
		for range rapid.IntRange(0, 6).Draw(t, "n") {
			text := rapid.StringOf(rapid.RuneFrom([]rune("ab 漢é\x1b\n…字"))).Draw(t, "text")
			c.Text(rapid.IntRange(-3, w).Draw(t, "x"), rapid.IntRange(0, 1).Draw(t, "y"), text, theme.Ink(rapid.IntRange(0, 4).Draw(t, "ink")))
		}
		for _, l := range c.Lines(colour, false) {
			if n := ansi.StringWidth(l); n != w {
				t.Fatalf("%q is %d cells wide, expected %d", l, n, w)
			}
		}
	})
}
