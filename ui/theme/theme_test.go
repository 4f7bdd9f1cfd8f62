package theme_test

import (
	"fmt"
	"math"
	"reflect"
	"strings"
	"testing"

	"github.com/charmbracelet/x/ansi"

	"polewright/ui/theme"
)

func TestInksDifferWhereThereIsColour(t *testing.T) {
	for _, depth := range []theme.Depth{theme.Sixteen, theme.Many, theme.True} {
		for _, dark := range []bool{true, false} {
			th := theme.New(theme.Options{Depth: depth, Dark: dark})
			seen := map[string]theme.Ink{}
			for ink := theme.Text; ink <= theme.Trouble; ink++ {
				open := th.Open(ink)
				if other, ok := seen[open]; ok {
					t.Errorf("depth %d, dark %v: inks %d and %d look the same", depth, dark, ink, other)
				}
				if !strings.HasPrefix(open, "\x1b[") || !strings.HasSuffix(open, "m") || ansi.StringWidth(open) != 0 {
					t.Errorf("ink %d opens with %q", ink, open)
				}
				seen[open] = ink
			}
		}
	}
}

func TestNoColourHasNone(t *testing.T) {
	th := theme.New(theme.Options{})
	for ink := theme.Text; ink <= theme.Trouble; ink++ {
		if open := th.Open(ink); open != "\x1b[m" && open != "\x1b[0;1m" {
			t.Errorf("ink %d opens with %q", ink, open)
		}
	}
}

// grey is the luminance, by the rule of WCAG 2.1, of a grey of the 256-colour
// palette, that a sequence sets.
func grey(t *testing.T, sequence string) float64 {
	t.Helper()
	var n int
	at := strings.LastIndex(sequence, "8;5;")
	if _, err := fmt.Sscanf(sequence[at+4:], "%dm", &n); at < 0 || err != nil || n < 232 {
		t.Fatalf("%q sets no grey", sequence)
	}
	v := float64(8+10*(n-232)) / 255
	return math.Pow((v+0.055)/1.055, 2.4)
}

// Labels can be read on every shade, lines seen, and the steps go one way.
func TestShadesKeepTheirContrast(t *testing.T) {
	contrast := func(a, b float64) float64 { return (max(a, b) + 0.05) / (min(a, b) + 0.05) }
	for _, dark := range []bool{true, false} {
		th := theme.New(theme.Options{Depth: theme.True, Dark: dark})
		before, own := 0.0, 0.53 // black, and the light grey that terminals write with
		if !dark {
			before, own = 1, 0
		}
		for level := uint8(1); level < theme.Shades; level++ {
			shade := grey(t, th.Shade(level))
			if dark == (shade <= before) || contrast(shade, before) < 1.1 {
				t.Errorf("dark %v: step %d is no step", dark, level)
			}
			if c := contrast(shade, grey(t, th.OpenOn(theme.Faint))); c < 4.5 {
				t.Errorf("dark %v: a label on step %d has a contrast of %.1f", dark, level, c)
			}
			if c := contrast(shade, own); c < 3 {
				t.Errorf("dark %v: text on step %d has a contrast of %.1f", dark, level, c)
			}
			if c := contrast(shade, grey(t, th.OpenOn(theme.Grid))); c < 1.6 {
				t.Errorf("dark %v: a line on step %d has a contrast of %.1f", dark, level, c)
			}
			before = shade
		}
	}
	if th := theme.New(theme.Options{Depth: theme.Sixteen}); th.Backed || th.Shade(2) != "" {
		t.Error("sixteen colours have no greys to spare")
	}
}

// Marks can be told apart by shape alone, and each is one cell wide.
func TestMarksDifferInShape(t *testing.T) {
	for _, ascii := range []bool{false, true} {
		g := theme.New(theme.Options{ASCII: ascii}).Glyphs
		seen := map[rune]bool{}
		for _, r := range []rune{g.Target, g.Selected, g.Fixed, g.Plant, g.Controller, g.Floor, g.Up, g.Down, g.Left, g.Right, g.Event, g.Hatch, g.Dot} {
			if seen[r] {
				t.Errorf("ascii %v: %q stands for two marks", ascii, r)
			}
			seen[r] = true
		}
		ink := -1 // of a shade, in cells of eight
		for level, rows := range g.Grain {
			n := 0
			for _, row := range rows {
				for _, r := range row {
					if ansi.StringWidth(string(r)) != 1 || ascii && r > '~' || seen[r] {
						t.Errorf("ascii %v: grain of %q", ascii, r)
					}
					n += map[rune]int{' ': 0, ',': 1, '░': 1, ':': 2, '▒': 2}[r]
				}
			}
			if n <= ink {
				t.Errorf("ascii %v: shade %d is no denser than the one before", ascii, level)
			}
			ink = n
		}
		v := reflect.ValueOf(g)
		for i := range v.NumField() {
			if f := v.Field(i); f.Kind() == reflect.Int32 {
				r := rune(f.Int())
				if ansi.StringWidth(string(r)) != 1 || ascii && r > '~' {
					t.Errorf("ascii %v: %s is %q", ascii, v.Type().Field(i).Name, r)
				}
			}
		}
	}
}
