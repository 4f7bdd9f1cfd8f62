package theme_test

import (
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

// Marks can be told apart by shape alone, and each is one cell wide.
func TestMarksDifferInShape(t *testing.T) {
	for _, ascii := range []bool{false, true} {
		g := theme.New(theme.Options{ASCII: ascii}).Glyphs
		seen := map[rune]bool{}
		for _, r := range []rune{g.Target, g.Selected, g.Fixed, g.Plant, g.Controller, g.Floor} {
			if seen[r] {
				t.Errorf("ascii %v: %q stands for two marks", ascii, r)
			}
			seen[r] = true
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
