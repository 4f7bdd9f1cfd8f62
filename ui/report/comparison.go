package report

import (
	"context"
	"fmt"
	"math"
	"math/cmplx"

	"polewright/estimator"
	"polewright/estimator/poles"
	"polewright/ui/measures"
	"polewright/ui/report/draw"
)

// comparison puts the candidates side by side, a few per table.
func (m *maker) comparison() {
	m.heading(1, "The candidates side by side")
	const most = 5
	for from := 0; from < len(m.list); from += most {
		m.compare(m.list[from:min(from+most, len(m.list))])
	}
}

func (m *maker) compare(list []*shown) {
	t := &Table{Head: []string{""}}
	for _, s := range list {
		t.Head = append(t.Head, s.name)
	}
	row := func(name string, of func(s *shown) Cell) {
		cells := []Cell{words(name)}
		for _, s := range list {
			c := of(s)
			if c.Key != "" {
				c.Key = s.name + "/" + c.Key
			}
			cells = append(cells, c)
		}
		t.Rows = append(t.Rows, cells)
	}
	if m.bench.Model.Discrete() {
		row("form", func(s *shown) Cell { return words(s.doc.Form) })
	}
	row("settles to 2 % in, s", func(s *shown) Cell { return number(s.doc.Transient.Settle, "transient.settle_s") })
	row("start-up peak, times", func(s *shown) Cell { return number(s.doc.Transient.Peak, "transient.peak") })
	row("gain norm", func(s *shown) Cell { return number(s.doc.GainNorm, "gain_norm") })
	row("eigenvector condition", func(s *shown) Cell { return number(s.doc.EigenvectorCondition, "eigenvector_condition") })
	row("noise over the floor, all states", func(s *shown) Cell { return number(s.doc.Noise.OverFloorRMS, "noise.over_floor_rms") })
	for i, name := range m.bench.Model.StateNames {
		row("noise on "+withUnit(name, m.units[i]), func(s *shown) Cell {
			if i >= len(s.doc.Noise.Std) {
				return words("–")
			}
			return number(s.doc.Noise.Std[i], "noise.std", i)
		})
	}
	if m.bench.Model.K != nil {
		margin := func(name, key string, of func(l *estimator.Loop) float64) {
			row(name, func(s *shown) Cell {
				l := s.design.Loop
				if l == nil || !l.Stable {
					return words("–")
				}
				return Cell{Text: Digits(of(l)), Key: key}
			})
		}
		margin("phase margin, deg", "loop.phase_margin_deg", func(l *estimator.Loop) float64 { return l.PhaseMargin })
		margin("delay margin, s", "loop.delay_margin_s", func(l *estimator.Loop) float64 { return l.DelayMargin })
		margin("sensitivity peak", "loop.sensitivity_peak", func(l *estimator.Loop) float64 { return l.SensitivityPeak })
	}
	row("stable", func(s *shown) Cell {
		if s.design.Stable {
			return words("yes")
		}
		return Cell{Text: "NO", Strong: true}
	})
	row("limits", limitCount)
	m.table(t)
}

func limitCount(s *shown) Cell {
	broken := 0
	for _, l := range s.limits {
		if !l.Met {
			broken++
		}
	}
	switch {
	case len(s.limits) == 0:
		return words("none set")
	case broken > 0:
		return Cell{Text: fmt.Sprintf("%d of %d NOT MET", broken, len(s.limits)), Strong: true}
	}
	return words(fmt.Sprintf("all %d met", len(s.limits)))
}

// tradeOff draws settle time against noise: the candidates, the best linear
// estimator, and what making the last candidate's poles slower and faster gives.
func (m *maker) tradeOff(ctx context.Context) {
	var settle, over []float64
	for _, s := range m.list {
		if s.design.Stable && finite(s.design.Transient.Settle) && finite(s.design.Noise.OverFloorRMS) {
			settle, over = append(settle, s.design.Transient.Settle), append(over, s.design.Noise.OverFloorRMS)
		} else {
			settle, over = append(settle, math.NaN()), append(over, math.NaN())
		}
	}
	of := m.list[len(m.list)-1]
	curve := speeds(ctx, of, m.bench.Model)
	best, floor := floorPoint(of)
	x, ok := draw.AroundLog("settle time, s", settle, best, curve[0])
	y, ok2 := draw.AroundLog("noise over the floor", over, floor, curve[1])
	if !ok || !ok2 {
		return
	}
	c := draw.New(480, 260)
	p := &draw.Plot{C: c, X: x, Y: y, Left: 46, Top: 20, Wide: 420, High: 205}
	p.Axes(6, 5)
	px, py := p.Map(curve[0], curve[1])
	c.Curve(px, py, draw.Pen{Ink: draw.Grey, Dash: "4 3"})
	if len(best) > 0 {
		bx, by := p.At(best[0], floor[0])
		c.Mark(bx, by, draw.Diamond, draw.Dark)
		c.Text(bx-8, by-6, draw.End, draw.Dark, "floor")
	}
	m.named(p, settle, over)
	caption := "Settle time against noise: quick and quiet is down to the left."
	if len(curve[0]) > 0 {
		caption += " Dashed: candidate " + of.name + " with all its poles made slower and faster."
	}
	if len(best) > 0 {
		caption += " Open diamond: the best linear estimator."
	}
	m.figure(caption, c.SVG("settle time against noise"))
}

// named marks the candidates; names of marks that touch stand together.
func (m *maker) named(p *draw.Plot, settle, over []float64) {
	px, py := p.Map(settle, over)
	done := make([]bool, len(px))
	for i := range px {
		if done[i] || math.IsNaN(px[i]) {
			continue
		}
		names := ""
		for k := i; k < len(px); k++ {
			if !done[k] && math.Hypot(px[k]-px[i], py[k]-py[i]) < 9 {
				done[k] = true
				names += ", " + m.list[k].name
				p.C.Mark(px[k], py[k], draw.Disc, draw.Accent)
			}
		}
		p.C.Text(px[i]+7, py[i]-6, draw.Start, draw.Accent, names[2:])
	}
}

// floorPoint judges the floor's own gain.
func floorPoint(s *shown) (settle, over []float64) {
	f := s.designer.Analysis().Floor
	if f == nil {
		return nil, nil
	}
	d, err := s.designer.QuickJudge(estimator.Given{L: f.Gain})
	if err != nil || !d.Stable || !finite(d.Transient.Settle) || !finite(d.Noise.OverFloorRMS) {
		return nil, nil
	}
	return []float64{d.Transient.Settle}, []float64{d.Noise.OverFloorRMS}
}

// speeds places the poles of a candidate slower and faster, from a third to three
// times as fast. Large models get few points, very large ones none.
func speeds(ctx context.Context, s *shown, m *estimator.Model) [2][]float64 {
	points := 17
	n, _, _ := m.Dims()
	switch {
	case n > 30:
		points = 0
	case n > 10:
		points = 7
	}
	var out [2][]float64
	base := movable(s)
	if base == nil {
		return out
	}
	for k := range points {
		factor := math.Pow(3, 2*float64(k)/float64(points-1)-1)
		wanted, ok := scaled(base, factor, m.Period)
		if !ok || ctx.Err() != nil {
			continue
		}
		d, err := s.designer.QuickPlace(wanted, nil)
		if err != nil || !finite(d.Transient.Settle) || !finite(d.Noise.OverFloorRMS) {
			continue
		}
		out[0], out[1] = append(out[0], d.Transient.Settle), append(out[1], d.Noise.OverFloorRMS)
	}
	return out
}

// movable are the wanted poles of a design that can be chosen: the fixed ones come
// last in Wanted.
func movable(s *shown) []complex128 {
	if s.design.Wanted == nil {
		return nil
	}
	count, _ := s.designer.Movable()
	return s.design.Wanted[:min(count, len(s.design.Wanted))]
}

// scaled makes poles so many times as fast in the s-plane; false where they leave
// what sampling lets through. Poles at z = 0 stay there.
func scaled(list []complex128, factor, period float64) ([]complex128, bool) {
	out := make([]complex128, len(list))
	for i, v := range list {
		switch {
		case period == 0:
			out[i] = v * complex(factor, 0)
		case cmplx.Abs(v) < 1e-9:
			out[i] = 0
		default:
			s, _ := poles.ToS(v, period)
			if s *= complex(factor, 0); math.Abs(imag(s)) >= math.Pi/period {
				return nil, false
			}
			out[i] = poles.ToZ(s, period)
		}
	}
	return out, true
}

// provenance says where everything comes from, and what to mind.
func (m *maker) provenance(program string) {
	m.page("Where this comes from")
	t := &Table{Head: []string{"", "", "SHA-256"}, Words: []bool{true, true, true}}
	t.Rows = append(t.Rows, []Cell{words("written by"), words(program), words("")},
		[]Cell{words("session saved by"), words(blank(m.kept.Program)), words(fmt.Sprintf("%x", m.kept.Sum[:]))})
	names := map[string]string{"plant": "plant file", "scenario": "scenario file", "truth_plant": "the real plant's file"}
	for _, k := range m.kept.Texts {
		t.Rows = append(t.Rows, []Cell{words(names[k.What]), words(k.File), words(k.SHA256)})
	}
	m.table(t)
	m.text(Plain, "All figures were computed from the texts inside the session and its stored gains; `polewright verify` checks the session against them. Figures are shown in five digits, gains in all.")
	m.heading(1, "Cautions")
	m.text(Caution, "%s", measures.Caution)
	for _, s := range cautions {
		m.text(Plain, "%s", s)
	}
}

var cautions = []string{
	"Try gains first at low energy, with independent limits and stops that do not depend on the estimate.",
	"Feed the estimator the input that is actually applied, after saturation and rate limits.",
	"Reject NaN and samples that are out of range.",
	"Start from the first measurement, or wait out the settle time before closing the loop.",
	"Know what losing each sensor does: setting a column of L to zero can make the estimator unstable; the table of each candidate says so.",
	"The floor, and every noise figure, is only as true as the noise figures of the plant file.",
	"Local codes and licensed practice decide.",
}
