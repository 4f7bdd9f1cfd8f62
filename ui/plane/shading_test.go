package plane_test

import (
	"math"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"polewright/ui/canvas"
	"polewright/ui/plane"
	"polewright/ui/plane/targets"
	"polewright/ui/theme"
)

func TestLevels(t *testing.T) {
	for v, want := range map[float64]uint8{1: 0, 1.1: 0, 1.11: 1, 1.5: 1, 2: 2, 2.5: 3, 3.01: 4, 1e9: 4, math.Inf(1): 4} {
		if got := plane.Level(v); got != want {
			t.Errorf("%g has level %d, expected %d", v, got, want)
		}
	}
	if plane.Level(math.NaN()) != theme.Shades-1 {
		t.Error("what has no noise looks quiet")
	}
}

// The lattice has one place for every cell, in it, and moves by whole cells lead
// from the held pole to these places.
func TestLatticeIsWhereMovesLead(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		held := complex(rapid.Float64Range(-30, -1).Draw(t, "re"), rapid.Float64Range(0.5, 20).Draw(t, "im"))
		win := plane.Fit([]complex128{held, -40 + 25i}, targets.S, 0, 60, 21)
		cells, w, h := win.Lattice(held, true)
		if len(cells) != w*h || w != win.W || h != win.H/2+1 {
			t.Fatalf("%d cells, %d by %d", len(cells), w, h)
		}
		for i, c := range cells {
			if win.Column(real(c)) != i%w || win.Row(imag(c)) != i/w {
				t.Fatalf("the place %v of cell %d, %d lies in %d, %d", c, i%w, i/w, win.Column(real(c)), win.Row(imag(c)))
			}
		}
		set := targets.Set{List: []targets.Target{{At: held, Pair: true}}}
		dx, dy := rapid.IntRange(-8, 8).Draw(t, "dx"), rapid.IntRange(-20, 8).Draw(t, "dy")
		moved, _, event, err := set.Move(0, dx, dy, win.Grid)
		if err != nil {
			t.Fatal(err)
		}
		if event != targets.Moved { // parted: another map
			return
		}
		at := moved.List[0].At
		if !win.Inside(at) {
			return
		}
		want := cells[win.Row(imag(at))*w+win.Column(real(at))]
		if math.Abs(real(want)-real(at)) > 1e-9*win.DX || math.Abs(imag(want)-imag(at)) > 1e-9*win.DY {
			t.Fatalf("%d, %d cells on it is at %v, the lattice has %v", dx, dy, at, want)
		}
	})
}

// Shades mirror at the axis and leave everything that is drawn in its place.
func TestShadeCoversNothing(t *testing.T) {
	for _, o := range []theme.Options{{}, {ASCII: true}, {Depth: theme.True, Dark: true}} {
		th := theme.New(o)
		win := plane.Fit([]complex128{-40 + 25i}, targets.S, 0.05, 60, 21)
		marks := []plane.Mark{{At: -20 + 10i, Place: true, Kind: plane.Selected}, {At: -20 - 10i, Place: true, Kind: plane.Selected}, {At: -5, Place: true, Kind: plane.Plant}}
		var bare, c canvas.Canvas
		bare.Reset(60, 21)
		c.Reset(60, 21)
		plane.Draw(&bare, 0, 0, win, marks, th)
		plane.Draw(&c, 0, 0, win, marks, th)
		tones := make([]plane.Tone, 60*11)
		for i := range tones {
			tones[i] = plane.Tone{Level: uint8(i % 60 / 12), Hatched: i%60 < 20}
		}
		plane.Shade(&c, 0, 0, win, tones, th)
		changed := 0
		for y := range 21 {
			for x := range 60 {
				if r := bare.At(x, y); r != ' ' && c.At(x, y) != r {
					t.Errorf("%+v: %q became %q", o, r, c.At(x, y))
				}
				if c.At(x, y) != bare.At(x, y) {
					changed++
				}
			}
		}
		if changed < 100 && !th.Backed || changed < 30 {
			t.Errorf("%+v: only %d cells show it", o, changed)
		}
		if th.Backed && !strings.Contains(strings.Join(c.Lines(th, false), ""), th.Shade(4)) {
			t.Error("no deepest shade")
		}
		text := strings.Join(c.Lines(th, false), "\n")
		for _, label := range []string{"-40", "20", "0.7", " sampling limit "} {
			if strings.Contains(strings.Join(bare.Lines(th, false), "\n"), label) && !strings.Contains(text, label) {
				t.Errorf("%+v: %q cannot be read any more:\n%s", o, label, text)
			}
		}
	}
}

// A real pole has answers along the axis only.
func TestShadeOfARealPole(t *testing.T) {
	th := theme.New(theme.Options{})
	win := plane.Fit([]complex128{-40 + 25i}, targets.S, 0, 60, 21)
	cells, w, h := win.Lattice(-12, false)
	if w != 60 || h != 1 || imag(cells[7]) != 0 {
		t.Fatalf("%d by %d cells", w, h)
	}
	var c canvas.Canvas
	c.Reset(60, 21)
	plane.Shade(&c, 0, 0, win, make([]plane.Tone, 60), th)
	tones := make([]plane.Tone, 60)
	for i := range tones {
		tones[i].Level = 4
	}
	plane.Shade(&c, 0, 0, win, tones, th)
	for y := range 21 {
		if got, want := c.At(30, y) != ' ', y >= 9 && y <= 11; got != want {
			t.Errorf("row %d is shaded: %v", y, got)
		}
	}
}

func TestLegendFitsOrIsNotThere(t *testing.T) {
	for _, o := range []theme.Options{{}, {ASCII: true}} {
		th := theme.New(o)
		for room := range 100 {
			var c canvas.Canvas
			c.Reset(110, 1)
			plane.Legend(&c, 110, 0, room, th)
			text := c.Lines(th, true)[0]
			if c.At(110-room-1, 0) != ' ' || room > 90 && !strings.Contains(text, "noise x floor") || room > 70 && !strings.Contains(text, " limit") {
				t.Errorf("%d cells: %q", room, text)
			}
		}
	}
}

func TestPolesInOneCellAreCounted(t *testing.T) {
	th := theme.New(theme.Options{})
	win := plane.Fit([]complex128{-40 + 25i}, targets.S, 0, 60, 21)
	var c canvas.Canvas
	c.Reset(60, 21)
	plane.Draw(&c, 0, 0, win, []plane.Mark{
		{At: -20, Place: true, Kind: plane.Target}, {At: -20, Place: true, Kind: plane.Selected}, {At: -20, Place: true, Kind: plane.Fixed},
		{At: -20, Place: true, Kind: plane.Floor}, {At: -10, Place: true, Kind: plane.Target}, {At: -10, Place: true, Kind: plane.Floor},
	}, th)
	if got := c.At(win.Column(-20)+1, win.Row(0)); got != '3' {
		t.Errorf("three poles are shown as %q", got)
	}
	if got := c.At(win.Column(-10)+1, win.Row(0)); got != th.Glyphs.Rule {
		t.Errorf("%q beside a single pole", got)
	}
}

// A label that a mark would cut is elsewhere or not at all, never in pieces.
func TestLabelsAreWholeOrNotThere(t *testing.T) {
	th := theme.New(theme.Options{})
	rapid.Check(t, func(t *rapid.T) {
		win := plane.Fit([]complex128{-70 + 66i}, targets.S, 0.05, 70, 21)
		var marks []plane.Mark
		for range 12 {
			marks = append(marks, plane.Mark{At: complex(rapid.Float64Range(-230, 5).Draw(t, "re"), rapid.SampledFrom([]float64{-win.DY, 62.8, 20, 40, -20}).Draw(t, "im")),
				Place: true, Kind: plane.Kind(rapid.IntRange(0, 5).Draw(t, "kind"))})
		}
		var c canvas.Canvas
		c.Reset(70, 21)
		plane.Draw(&c, 0, 0, win, marks, th)
		text := strings.NewReplacer("\x1b[m", "", "\x1b[0;1m", "").Replace(strings.Join(c.Lines(th, false), "\n"))
		if n := strings.Count(text, "limit"); n > 1 || strings.Contains(text, "samp") != strings.Contains(text, " sampling limit ") || strings.Contains(text, "mit") != (n == 1) {
			t.Fatalf("the sampling limit is cut:\n%s", text)
		}
		for _, word := range strings.FieldsFunc(text, func(r rune) bool { return !(r >= '0' && r <= '9' || r == '-' || r == '.') }) {
			if strings.Trim(word, "-.") != "" && !strings.Contains("-200 -150 -100 -50 50 0.7 0.3 2 3 4 5 6 7 8 9", word) {
				t.Fatalf("%q is a piece of a label:\n%s", word, text)
			}
		}
	})
}

// Slow poles crowd at z = 1: a fit shows them close up, with a piece of the circle.
func TestCloseUpOfTheZPlane(t *testing.T) {
	points := []complex128{0.9 + 0.05i, 0.9 - 0.05i, 0.97, 0.85}
	win := plane.Fit(points, targets.Z, 0.01, 46, 13)
	for _, p := range append(points, 1) {
		if !win.Inside(p) {
			t.Errorf("%v is out of sight", p)
		}
	}
	if wide := win.DX * float64(win.W); wide > 0.6 {
		t.Errorf("%g wide for poles within 0.15 of z = 1", wide)
	}
	if far := plane.Fit(append(points, 0.1+0.7i), targets.Z, 0.01, 46, 13); !far.Inside(-1) {
		t.Error("with a pole far from it the whole circle belongs in the picture")
	}
}
