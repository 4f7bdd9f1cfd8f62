package views

import (
	"fmt"
	"math"
	"strings"

	"polewright/estimator/sweep"
	"polewright/ui/canvas"
	"polewright/ui/readings"
	"polewright/ui/theme"
)

// words spell the point under the cursor out.
func (p *tradePlot) words(w, h int) {
	point, ok := p.f.Point()
	if !ok {
		text := "no point of this curve has a place here"
		if p.f.Running {
			text = "this curve is on its way"
		}
		p.c.Text(0, h-2, text, theme.Faint)
		return
	}
	what, narrow := "all speeds x ", w < 76
	switch {
	case p.f.Curve == Floors && narrow:
		what = "process noise x "
	case p.f.Curve == Floors:
		what = "best for process noise x "
	}
	x := 0
	say := func(text string, ink theme.Ink, gap int) { x = p.c.Text(x, h-2, text, ink) + gap }
	say(fmt.Sprintf("%s%-7s", what, tick(point.Factor)), theme.Hold, 2)
	if !narrow {
		say("settles in", theme.Faint, 1)
	}
	say(fmt.Sprintf("%6s", readings.Figure(point.Settle(), p.ax.low*3, p.g)), theme.Text, 1)
	say("s", theme.Faint, 3)
	if !narrow {
		say("noise", theme.Faint, 1)
	}
	say(fmt.Sprintf("%5s", readings.Fixed(point.OverFloor(), 2, p.g)), theme.Text, 1)
	say("x floor", theme.Faint, 3)
	if w-x >= 14 {
		say("peak", theme.Faint, 1)
		say(readings.Fixed(point.Design.Transient.Peak, 2, p.g), theme.Text, 1)
		say("x", theme.Faint, 0)
	}
	x = 0
	if d := p.f.Design; d != nil && d.Noise.Std != nil {
		said := "against the design in hand: "
		if narrow {
			said = ""
		}
		said += compared(point.Settle(), d.Transient.Settle, "slower", "faster", "as fast") + ", " +
			compared(point.OverFloor(), d.Noise.OverFloorRMS, "noisier", "quieter", "as quiet")
		x = p.c.Text(0, h-1, canvas.Cut(said, w, p.g.Ellipsis), theme.Faint) + 3
	}
	if broken := p.broken(point); broken != "" {
		p.c.Text(x, h-1, canvas.Cut(broken, w-x, p.g.Ellipsis), theme.Trouble)
	}
}

// compared says by how much a is more or less than b.
func compared(a, b float64, more, less, even string) string {
	change := (a/b - 1) * 100
	switch {
	case math.IsNaN(change) || math.IsInf(change, 0):
		return "not to be compared"
	case math.Abs(change) < 0.5:
		return even
	case change > 300:
		return fmt.Sprintf("%.3g times %s", a/b, more)
	case change < 0:
		more = less
	}
	return fmt.Sprintf("%.0f %% %s", math.Abs(change), more)
}

// broken names the limits of the plot that a point does not keep.
func (p *tradePlot) broken(point sweep.Point) string {
	var names []string
	if v := p.f.Settle; v != nil && !(point.Settle() <= *v*(1+1e-9)) {
		names = append(names, "settle")
	}
	if v := p.f.Over; v != nil && !(point.OverFloor() <= *v*(1+1e-9)) {
		names = append(names, "noise")
	}
	if names == nil {
		return ""
	}
	return "over the limit: " + strings.Join(names, ", ")
}
