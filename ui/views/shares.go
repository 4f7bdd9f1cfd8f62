package views

import (
	"math"

	"polewright/estimator"
	"polewright/ui/canvas"
	"polewright/ui/readings"
	"polewright/ui/theme"
)

// shares shows which sensor each state's noise comes from, for the design in
// hand.
func (p *sensorPage) shares() {
	d := p.f.Design
	if d == nil || d.Noise.SensorToState == nil || d.Noise.Std == nil {
		return
	}
	m := p.f.Bench.Model
	n, _, sensors := m.Dims()
	p.title("where the noise of the design in hand comes from, std")
	name := min(max(p.w-(sensors+2)*13, 20), 40)
	width := min(max((p.w-name)/(sensors+2), 13), 20)
	fit := max((p.w-name)/width, 1)
	from := max(p.f.Cursor-fit+3, 0) // the sensor under the cursor is in sight, and two columns more
	to := min(from+max(fit-2, 1), sensors)
	head := []span{}
	column := func(k int) int { return name + (k+1)*width }
	for j := from; j < to; j++ {
		ink := theme.Faint
		if j == p.f.Cursor {
			ink = theme.Hold
		}
		head = append(head, span{x: column(j - from), text: canvas.Cut(p.names()[j], width-1, p.g.Ellipsis), ink: ink, right: true})
	}
	head = append(head, span{x: column(to - from), text: "process", ink: theme.Faint, right: true}, span{x: column(to - from + 1), text: "together", ink: theme.Faint, right: true})
	p.row(head...)
	for i := range n {
		if role(m, i) == estimator.DelayRegister {
			continue
		}
		label := readings.StateName(p.f.Bench, i)
		if u := readings.StateUnit(p.f.Bench, i); u != "" {
			label += ", " + u
		}
		row := []span{{x: 2, text: canvas.Cut(label, name-3, p.g.Ellipsis), ink: theme.Faint}}
		share, rest := Shares(m, d, i)
		ref := d.Noise.Std[i]
		for j := from; j < to; j++ {
			row = append(row, span{x: column(j - from), text: readings.Figure(share[j], ref, p.g), right: true})
		}
		row = append(row, span{x: column(to - from), text: readings.Figure(rest, ref, p.g), right: true},
			span{x: column(to - from + 1), text: readings.Figure(ref, ref, p.g), right: true})
		p.row(row...)
	}
}

// Shares splits the noise of state i of a design: the standard deviation that
// each sensor alone would leave, and the process noise alone. The latter is NaN
// where the sensors' noises are correlated, which leaves no share to each.
func Shares(m *estimator.Model, d *estimator.Design, i int) (sensor []float64, process float64) {
	_, _, p := m.Dims()
	sensor = make([]float64, p)
	total := d.Noise.Std[i] * d.Noise.Std[i]
	process = total
	correlated := false
	for j := range p {
		v := m.R.At(j, j)
		sensor[j] = d.Noise.SensorToState.At(i, j) * math.Sqrt(v)
		process -= sensor[j] * sensor[j]
		for k := range j {
			correlated = correlated || m.R.At(j, k) != 0
		}
	}
	switch {
	case correlated:
		return sensor, math.NaN()
	case process < total*1e-9: // nothing but rounding
		return sensor, 0
	}
	return sensor, math.Sqrt(process)
}
