package plane_test

import (
	"math"
	"math/cmplx"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"polewright/ui/canvas"
	"polewright/ui/plane"
	"polewright/ui/plane/targets"
	"polewright/ui/theme"
)

// All points are in sight after a fit, in cells that are twice as high as wide
// and of a preferred size.
func TestFitShowsEverything(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		w, h := rapid.IntRange(30, 160).Draw(t, "w"), rapid.IntRange(7, 40).Draw(t, "h")
		size := math.Pow(10, rapid.Float64Range(-4, 5).Draw(t, "size"))
		var points []complex128
		for range rapid.IntRange(0, 6).Draw(t, "n") {
			points = append(points, complex(size*rapid.Float64Range(-1, 0.2).Draw(t, "re"), size*rapid.Float64Range(-1, 1).Draw(t, "im")))
		}
		win := plane.Fit(points, targets.S, 0, w, h)
		if win.DY != 2*win.DX {
			t.Fatalf("cells of %g by %g", win.DX, win.DY)
		}
		for _, p := range points {
			if !win.Inside(p) {
				t.Fatalf("%v is not in sight of %v", p, win)
			}
		}
	})
}

func TestUnitCircleIsRound(t *testing.T) {
	win := plane.Fit(nil, targets.Z, 0.01, 80, 21)
	right, top := win.Column(1)-win.Column(0), win.Row(0)-win.Row(1)
	if math.Abs(float64(right)-2*float64(top)) > 2 {
		t.Errorf("the circle reaches %d columns and %d rows", right, top)
	}
	if !win.Inside(1i) || !win.Inside(-1) || !win.Inside(1) || !win.Inside(-1i) {
		t.Error("the unit circle is cut")
	}
}

func TestZoomKeepsTheHeldPoleInSight(t *testing.T) {
	win := plane.Fit([]complex128{-40 + 5i}, targets.S, 0, 60, 15)
	for range 8 {
		win = win.Zoom(-2, -3)
		if !win.Inside(-3) {
			t.Fatalf("lost at %v", win)
		}
	}
	before := win.DX
	if win = win.Show(-40 + 5i); !win.Inside(-40+5i) || win.DX <= before {
		t.Errorf("not shown again: %v", win)
	}
}

func TestMarksCoverByKind(t *testing.T) {
	th := theme.New(theme.Options{})
	win := plane.Fit([]complex128{-4}, targets.S, 0, 40, 11)
	var c canvas.Canvas
	c.Reset(40, 11)
	plane.Draw(&c, 0, 0, win, []plane.Mark{
		{At: -4, Place: true, Kind: plane.Selected}, {At: -4, Place: true, Kind: plane.Floor}, {At: -4, Place: true, Kind: plane.Plant},
		{At: -400, Place: true, Kind: plane.Target}, {At: -400 + 3i, Place: true, Kind: plane.Plant},
	}, th)
	if got := c.At(win.Column(-4), win.Row(0)); got != th.Glyphs.Selected {
		t.Errorf("%q on top", got)
	}
	if got := c.At(0, 5); got != th.Glyphs.Left {
		t.Errorf("a target beyond the left edge shows as %q", got)
	}
}

func TestOriginOfTheZPlaneIsNamed(t *testing.T) {
	th := theme.New(theme.Options{})
	var c canvas.Canvas
	c.Reset(40, 11)
	plane.Draw(&c, 0, 0, plane.Fit([]complex128{-4}, targets.S, 0.1, 40, 11), []plane.Mark{{Kind: plane.Target}}, th)
	if text := strings.Join(c.Lines(th, true), "\n"); !strings.Contains(text, "z = 0") {
		t.Error(text)
	}
}

// Any window and any poles can be drawn.
func TestDrawAnything(t *testing.T) {
	th := theme.New(theme.Options{ASCII: true})
	rapid.Check(t, func(t *rapid.T) {
		w, h := rapid.IntRange(1, 90).Draw(t, "w"), rapid.IntRange(1, 30).Draw(t, "h")
		p := targets.S
		period := rapid.SampledFrom([]float64{0, 1e-4, 3600}).Draw(t, "period")
		if period > 0 && rapid.Bool().Draw(t, "z") {
			p = targets.Z
		}
		v := complex(rapid.Float64().Draw(t, "re"), rapid.Float64().Draw(t, "im"))
		win := plane.WithHeight(rapid.Float64().Draw(t, "half"), v, p, period, w, h).Zoom(rapid.IntRange(-60, 60).Draw(t, "zoom"), v)
		if !(win.DX > 0) || math.IsInf(win.DX, 0) {
			t.Fatalf("%v", win)
		}
		var c canvas.Canvas
		c.Reset(w, h)
		plane.Draw(&c, 0, 0, win, []plane.Mark{{At: v, Place: true, Kind: plane.Selected}, {At: cmplx.Conj(v), Place: true, Kind: plane.Floor}}, th)
	})
}
