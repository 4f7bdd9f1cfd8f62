package traces_test

import (
	"math"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"polewright/scenarios"
	"polewright/ui/canvas"
	"polewright/ui/theme"
	"polewright/ui/traces"
)

var nan, inf = math.NaN(), math.Inf(1)

func draw(p traces.Panel, w, h int) []string {
	th := theme.New(theme.Options{})
	var c canvas.Canvas
	c.Reset(w, h)
	traces.Draw(&c, 0, 0, w, h, p, th)
	lines := c.Lines(th, true)
	for i := range lines {
		lines[i] = strings.NewReplacer("\x1b[m", "", "\x1b[0;1m", "").Replace(lines[i])
	}
	return lines
}

func ramp(n int) []float64 {
	out := make([]float64, n)
	for i := range out {
		out[i] = float64(i) / float64(n-1)
	}
	return out
}

func TestBothCurvesAreSeen(t *testing.T) {
	truth, estimate := ramp(100), ramp(100)
	for i := range estimate {
		estimate[i] = 0.5
	}
	lines := draw(traces.Panel{Title: "height", Unit: "m", Curves: [][]float64{truth, estimate}, Axis: traces.Axis{Low: 0, High: 1}, End: 2}, 50, 9)
	text := strings.Join(lines, "\n")
	if !strings.Contains(text, "╯") || !strings.Contains(lines[4], "•••") {
		t.Errorf("not both curves:\n%s", text)
	}
	if !strings.Contains(lines[1], "1.00 │") || !strings.Contains(lines[7], "0.00 │") || !strings.HasSuffix(lines[8], "2 s") {
		t.Errorf("axes:\n%s", text)
	}
}

// A value off the axis leaves the picture; it is not drawn at its edge.
func TestOffTheAxisIsAGap(t *testing.T) {
	v := []float64{0, 0, 0, 0, 0, 50, 50, 50, 50, 50}
	lines := draw(traces.Panel{Curves: [][]float64{nil, v}, Axis: traces.Axis{Low: -1, High: 1}, End: 1}, 40, 7)
	if k := strings.LastIndex(lines[3], "•"); k < 0 || strings.Count(lines[3], "•") > 16 || strings.Contains(lines[1], "•") {
		t.Errorf("%s", strings.Join(lines, "\n"))
	}
}

func TestAxes(t *testing.T) {
	for _, c := range []struct {
		v    []float64
		want traces.Axis
	}{
		{[]float64{0.1, 3.9}, traces.Axis{Low: 0, High: 4}},
		{[]float64{-0.2, nan, inf, 0.2}, traces.Axis{Low: -0.2, High: 0.2}},
		{[]float64{nan}, traces.Axis{Low: -1, High: 1}},
		{nil, traces.Axis{Low: -1, High: 1}},
	} {
		got := traces.Axes([][]float64{c.v})
		if math.Abs(got.Low-c.want.Low) > 1e-12 || math.Abs(got.High-c.want.High) > 1e-12 {
			t.Errorf("%v: %v, expected %v", c.v, got, c.want)
		}
	}
	constant := traces.Axes([][]float64{{5, 5}})
	if !(constant.Low < 5 && constant.High > 5) {
		t.Errorf("a constant lies on the edge of %v", constant)
	}
}

func TestCurves(t *testing.T) {
	run := &scenarios.Run{True: [][]float64{{1, 2}}, Estimate: [][]float64{{0, 2}, {7, 7}}, Innovations: [][]float64{{3, 4}}}
	if e := traces.Curves(run, traces.Error, 0); len(e) != 1 || e[0][0] != 1 || e[0][1] != 0 {
		t.Errorf("error %v", e)
	}
	if e := traces.Curves(run, traces.Error, 1); e != nil {
		t.Errorf("a state without truth has the error %v", e)
	}
	if b := traces.Curves(run, traces.Both, 1); len(b) != 2 || b[0] != nil || b[1][0] != 7 {
		t.Errorf("both %v", b)
	}
	if traces.Curves(run, traces.Innovation, 1) != nil || traces.Curves(nil, traces.Both, 0) != nil {
		t.Error("curves out of nothing")
	}
}

// Whatever the values, a panel draws, and inside its box.
func TestAnyValues(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		value := rapid.OneOf(rapid.Float64(), rapid.Float64Range(-1, 1), rapid.SampledFrom([]float64{nan, inf, -inf, 0, 1e308, -1e308, 5e-324}))
		series := rapid.SliceOfN(value, 0, 30)
		curves := [][]float64{series.Draw(t, "truth"), series.Draw(t, "estimate")}
		axis := traces.Axes(curves)
		if rapid.Bool().Draw(t, "other axis") {
			axis = traces.Axis{Low: -1, High: 1}
		}
		w, h := rapid.IntRange(1, 60).Draw(t, "w"), rapid.IntRange(1, 12).Draw(t, "h")
		mode := traces.Mode(rapid.IntRange(0, 2).Draw(t, "mode"))
		if mode != traces.Both {
			curves = curves[1:]
		}
		lines := draw(traces.Panel{Title: "x", Curves: curves, Mode: mode, Axis: axis, End: 1, Band: 0.1}, w, h)
		if len(lines) != h {
			t.Fatalf("%d lines, expected %d", len(lines), h)
		}
	})
}

// Events are marked where they are on the time axis, and said where there is room.
func TestEventsOnTheTimeAxis(t *testing.T) {
	p := traces.Panel{Curves: [][]float64{nil, ramp(100)}, Axis: traces.Axis{Low: 0, High: 1}, End: 10,
		Events: []traces.Event{{At: 2.5, Until: 6, Text: "gust"}, {At: 7, Until: inf, Text: "a text that is too long for what is left"}, {At: 30, Text: "later"}}}
	lines := draw(p, 60, 8)
	axis := lines[len(lines)-1]
	if !strings.Contains(axis, "!gust") || strings.Count(axis, "!") != 2 || strings.Contains(axis, "later") || strings.Contains(axis, "a text") {
		t.Errorf("%q", axis)
	}
	if k := len([]rune(axis[:strings.Index(axis, "!")])); k < 21 || k > 23 { // 10 cells of labels, then a quarter of 50
		t.Errorf("2.5 of 10 s in column %d", k)
	}
}

// The time cursor tells the values of both curves there.
func TestCursorTellsValues(t *testing.T) {
	at := 4.0
	p := traces.Panel{Title: "height", Curves: [][]float64{ramp(101), make([]float64, 101)}, Axis: traces.Axis{Low: 0, High: 1}, End: 10, Cursor: &at}
	lines := draw(p, 60, 8)
	if !strings.Contains(lines[0], "4.00 s") || !strings.Contains(lines[0], "0.4000") || !strings.Contains(lines[0], "0.0000") {
		t.Errorf("%q", lines[0])
	}
	if v := traces.At(ramp(101), 11, 10); !math.IsNaN(v) {
		t.Errorf("%g beyond the end", v)
	}
	if v := traces.At(nil, 1, 10); !math.IsNaN(v) {
		t.Errorf("%g of nothing", v)
	}
}

// The band lies around the estimate, as wide as it is predicted.
func TestBandAroundTheEstimate(t *testing.T) {
	flat := make([]float64, 100)
	p := traces.Panel{Curves: [][]float64{nil, flat}, Axis: traces.Axis{Low: -1, High: 1}, End: 1, Band: 0.4, Around: true}
	lines := draw(p, 60, 13) // 11 rows, 5 for a height of 1
	for row, want := range map[int]bool{3: false, 4: true, 5: true, 7: true, 8: true, 9: false} {
		if got := strings.Contains(lines[row], "░"); got != want {
			t.Errorf("row %d: band %v, expected %v\n%s", row, got, want, strings.Join(lines, "\n"))
		}
	}
	p.Around = false
	if strings.Contains(strings.Join(draw(p, 60, 13), ""), "░") {
		t.Error("a band without being asked for")
	}
}

// What a run is finds a place in the title or on the time axis, whole or not at
// all, and covers nothing.
func TestWhatTheRunIs(t *testing.T) {
	words := []string{"no scenario: start-up, one scale off", "start-up, one scale off", "no scenario"}
	for w, want := range map[int][2]string{90: {words[0], ""}, 60: {words[1], ""}, 46: {"", words[1]}, 29: {"", words[2]}, 22: {"", ""}} {
		p := traces.Panel{Title: "height", Unit: "m", Curves: [][]float64{ramp(50), ramp(50)}, Axis: traces.Axis{Low: 0, High: 1}, End: 2, Run: words}
		lines := draw(p, w, 8)
		got := [2]string{}
		for i, l := range []string{lines[0], lines[7]} {
			for _, s := range words {
				if strings.Contains(l, s) {
					got[i] = s
					break
				}
			}
		}
		if got != want || !strings.HasSuffix(lines[7], "2 s") || !strings.Contains(lines[0], "truth") {
			t.Errorf("%d wide: %q, expected %q\n%s", w, got, want, strings.Join(lines, "\n"))
		}
	}
}
