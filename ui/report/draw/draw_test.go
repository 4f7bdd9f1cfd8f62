package draw_test

import (
	"math"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"

	"polewright/ui/report/draw"
)

func TestEscape(t *testing.T) {
	for in, want := range map[string]string{
		`<a href="x">`:       "&lt;a href=&#34;x&#34;&gt;",
		"it's & more":        "it&#39;s &amp; more",
		"a\u202eb\u200fc":    `a\u202eb\u200fc`,
		"bell\x07 esc\x1b[m": `bell\a esc\x1b[m`,
		"two\nlines\tapart":  "two lines apart",
		"broken \xff":        `broken \ufffd`,
		"größe, 大きさ, x̂":     "größe, 大きさ, x̂",
	} {
		if got := draw.Escape(in); got != want {
			t.Errorf("%q: got %s, expected %s", in, got, want)
		}
	}
}

func TestTicks(t *testing.T) {
	for _, c := range []struct {
		axis  draw.Axis
		about int
		want  []float64
	}{
		{draw.Axis{Low: -1.2, High: 2.1}, 4, []float64{-1, 0, 1, 2}},
		{draw.Axis{Low: 0, High: 10}, 5, []float64{0, 2, 4, 6, 8, 10}},
		{draw.Axis{Low: 1, High: 30, Log: true}, 5, []float64{1, 2, 5, 10, 20}},
		{draw.Axis{Low: 0.5, High: 2000, Log: true}, 5, []float64{1, 10, 100, 1000}},
		{draw.Axis{Low: 3, High: 4, Log: true}, 5, []float64{3, 3.5, 4}},
	} {
		if diff := cmp.Diff(c.want, c.axis.Ticks(c.about), cmp.Comparer(func(a, b float64) bool { return math.Abs(a-b) < 1e-9 })); diff != "" {
			t.Errorf("%+v: %s", c.axis, diff)
		}
	}
}

// Whatever the values, an axis holds them, and no coordinate is not a number.
func TestAnyValues(t *testing.T) {
	for _, list := range [][]float64{
		{0, 0}, {1, 1}, {1e300, -1e300}, {math.MaxFloat64, -math.MaxFloat64}, {math.NaN(), math.Inf(1)}, {5e-324, 0}, {1e15, 1e15 + 1}, {},
	} {
		a, ok := draw.Around("", list)
		finite := 0
		for _, v := range list {
			if math.Abs(v) <= 1e300 {
				finite++
			}
		}
		if ok != (finite > 0) || !(a.Low < a.High) {
			t.Errorf("%v: %+v, %v", list, a, ok)
		}
		if n := len(a.Ticks(4)); n > 50 {
			t.Errorf("%v: %d ticks", list, n)
		}
		c := draw.New(100, 100)
		p := &draw.Plot{C: c, X: a, Y: a, Left: 10, Top: 10, Wide: 80, High: 80}
		p.Axes(4, 4)
		x, y := p.Map(list, list)
		c.Curve(x, y, draw.Pen{})
		if s := c.SVG("x"); strings.Contains(s, "NaN") || strings.Contains(s, "Inf") {
			t.Errorf("%v: a coordinate that is no number", list)
		}
	}
}
