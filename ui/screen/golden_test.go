package screen_test

import (
	"flag"
	"fmt"
	"os"
	"path/filepath"
	"regexp"
	"strings"
	"testing"

	tea "github.com/charmbracelet/bubbletea"
	"github.com/charmbracelet/x/ansi"
	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"

	"polewright/ui/desk"
	"polewright/ui/screen"
	"polewright/ui/survey"
)

var update = flag.Bool("update", false, "write the golden frames anew")

var codes = regexp.MustCompile("\x1b\\[[0-9;]*m")

func strip(s string) string { return codes.ReplaceAllString(s, "") }

func TestFrames(t *testing.T) {
	for _, c := range []struct {
		name string
		w, h int
		opt  option
		keys []string
	}{
		{"80x24", 80, 24, plain, nil},
		{"120x36", 120, 36, plain, []string{"left", "up", "a"}},
		{"200x50", 200, 50, plain, []string{"tab", "shift+left", "e"}},
		{"60x18", 60, 18, plain, nil},
		{"60x18-broken", 60, 18, plain, []string{"<", "<", "<", "<", "<"}},
		{"60x18-readings", 60, 18, plain, []string{"r", " "}},
		{"80x24-colour", 80, 24, colour, []string{"left"}},
		{"80x24-ascii", 80, 24, seven, []string{"left"}},
		{"80x24-z", 80, 24, plain, []string{"z"}},
		{"80x24-help", 80, 24, plain, []string{"?"}},
		{"80x24-compare", 80, 24, plain, []string{"a", "left", "v"}},
		{"80x24-readings", 80, 24, plain, []string{"r"}},
		{"80x24-prompt", 80, 24, plain, []string{"=", "-4+"}},
		{"120x36-far", 120, 36, plain, []string{"-", "-", "-", "-", "-", "-", "-", "-"}},
	} {
		t.Run(c.name, func(t *testing.T) {
			r := start(t, c.opt)
			r.send(tea.WindowSizeMsg{Width: c.w, Height: c.h})
			for _, k := range c.keys {
				r.press(k)
				r.reply(desk.Traced)
			}
			got := r.m.View()
			fits(t, got, c.w, c.h)
			if c.name == "80x24-ascii" {
				for _, b := range got {
					if b > '~' {
						t.Fatalf("%q is not ASCII", b)
					}
				}
			}
			if c.name == "80x24" && strings.Contains(got, "\x1b[3") {
				t.Error("colour without colours")
			}
			file := filepath.Join("testdata", c.name+".golden")
			visible := strings.ReplaceAll(got, "\x1b", "^") + "\n"
			if *update {
				if err := os.WriteFile(file, []byte(visible), 0o644); err != nil {
					t.Fatal(err)
				}
			}
			want, err := os.ReadFile(file)
			if err != nil {
				t.Fatal(err)
			}
			if diff := cmp.Diff(string(want), visible); diff != "" {
				t.Error(diff)
			}
		})
	}
}

// fits checks that a frame has so many lines, none too wide.
func fits(t interface{ Fatalf(string, ...any) }, frame string, w, h int) {
	lines := strings.Split(frame, "\n")
	if len(lines) != h {
		t.Fatalf("%d lines, expected %d", len(lines), h)
	}
	for i, l := range lines {
		if n := ansi.StringWidth(l); n > w {
			t.Fatalf("line %d is %d cells wide, the terminal %d:\n%s", i+1, n, w, l)
		}
	}
}

// While poles move, every title keeps its place.
func TestNothingJumpsWhileDragging(t *testing.T) {
	r := start(t)
	where := func() string {
		var out []string
		for i, l := range strings.Split(strip(r.m.View()), "\n") {
			for _, word := range []string{"s-plane", "start-up", "noise", "limits", "margins of", "height, m", "settle", "climb speed"} {
				if k := strings.Index(l, word); k >= 0 {
					out = append(out, fmt.Sprint(word, i, ansi.StringWidth(l[:k])))
				}
			}
		}
		return strings.Join(out, ";")
	}
	before := where()
	for i := range 40 {
		r.hold("left", 1)
		if i%3 == 0 {
			r.reply(desk.Judged)
		}
		if i%7 == 0 {
			r.reply(desk.Traced)
		}
		if now := where(); now != before {
			t.Fatalf("after %d steps:\n%s\nbefore:\n%s", i+1, now, before)
		}
	}
}

// Whatever is typed, the screen stands, fits, and holds three poles.
func TestAnyKeys(t *testing.T) {
	names := []string{"tab", "shift+tab", "left", "right", "up", "down", "shift+left", "enter", "esc", "backspace", "ctrl+r", "ctrl+s",
		"h", "j", "k", "l", "H", "J", "K", "L", "n", "N", "=", "p", "f", "<", ">", "u", "U", "z", "+", "-", "0", "c", ".", ",", "e", "a", "1", "2", "v", "r", "s", "?", "q", "x", "y", "i", "M", "T", "b", "P", "5", "[", "O", "A", "~", " ", "é", "漢"}
	rapid.Check(t, func(t *rapid.T) {
		var maps []survey.Request
		r := newRig(bare{t: t}, []complex128{z(-8 + 6i), z(-8 - 6i), z(-12)}, func(c *screen.Config) {
			c.Map = func(q survey.Request) { maps = append(maps, q) }
		})
		w, h := rapid.SampledFrom([]int{60, 80, 121}).Draw(t, "w"), rapid.SampledFrom([]int{18, 24, 37}).Draw(t, "h")
		r.send(tea.WindowSizeMsg{Width: w, Height: h})
		for range rapid.IntRange(1, 40).Draw(t, "n") {
			r.press(rapid.SampledFrom(names).Draw(t, "key"))
			if k := rapid.IntRange(0, 3).Draw(t, "reply"); k < 2 {
				r.reply(desk.Stage(k))
			}
			switch k := rapid.IntRange(0, 5).Draw(t, "map"); {
			case k == 0:
				r.send(screen.MapTick)
			case k < 3 && len(maps) > 0:
				r.send(chart(maps[rapid.IntRange(0, len(maps)-1).Draw(t, "which")], k == 1))
			case k == 3:
				x, y := rapid.IntRange(0, w).Draw(t, "x"), rapid.IntRange(0, h).Draw(t, "y")
				r.mouse(tea.MouseAction(rapid.IntRange(0, 2).Draw(t, "mouse")), x, y)
			}
			fits(t, r.m.View(), w, h)
			list := r.work().Poles
			if len(list) != 3 {
				t.Fatalf("%d poles", len(list))
			}
			var sum complex128
			for _, p := range list {
				sum += p
			}
			if !(imag(sum) < 1e-12 && imag(sum) > -1e-12) {
				t.Fatalf("not closed under conjugation, or not finite: %v", list)
			}
		}
	})
}

// bare lets a rig live inside a property: it passes on what a rig uses.
type bare struct {
	testing.TB
	t *rapid.T
}

func (b bare) Helper()                   { b.t.Helper() }
func (b bare) Fatal(a ...any)            { b.t.Fatal(a...) }
func (b bare) Fatalf(f string, a ...any) { b.t.Fatalf(f, a...) }
func (b bare) Errorf(f string, a ...any) { b.t.Errorf(f, a...) }
