package views

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/ui/canvas"
	"polewright/ui/readings"
	"polewright/ui/theme"
)

// shares shows which sensor each state's noise comes from, for the design in
// hand.
func (p *sensorPage) shares() {
	d, m := p.f.Design, p.f.Bench.Model
	share, rest := Shares(m, d)
	if share == nil {
		return
	}
	n, _, sensors := m.Dims()
	name := min(max(p.w-(sensors+2)*16, 22), 40)
	width := min(max((p.w-name)/(sensors+2), 12), 20)
	fit := max((p.w-name)/width, 1)
	from := max(p.f.Cursor-fit+3, 0) // the sensor under the cursor is in sight, and two columns more
	to := min(from+max(fit-2, 1), sensors)
	title, which := "where the noise of the design in hand comes from, std", ""
	if to-from < sensors {
		which = fmt.Sprintf("%d to %d of %d sensors", from+1, to, sensors)
	}
	if len(title)+2+len(which) > p.w {
		title = "where its noise comes from, std"
	}
	p.title(title)
	last := len(p.rows) - 1
	p.rows[last] = append(p.rows[last], span{x: p.w, text: which, ink: theme.Faint, right: true})
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
		ref := d.Noise.Std[i]
		for j := from; j < to; j++ {
			row = append(row, span{x: column(j - from), text: readings.Figure(share.At(i, j), ref, p.g), right: true})
		}
		row = append(row, span{x: column(to - from), text: readings.Figure(rest[i], ref, p.g), right: true},
			span{x: column(to - from + 1), text: readings.Figure(ref, ref, p.g), right: true})
		p.row(row...)
	}
}

// Shares splits the noise of a stable, complete design: the standard deviation of
// each state that each sensor alone would leave (n×p), and the process noise alone
// (n). The latter is NaN where the sensors' noises are correlated, which leaves no
// share to each. It is nil for a design without these figures.
func Shares(m *estimator.Model, d *estimator.Design) (sensor *mat.Dense, process []float64) {
	if d == nil || d.Noise.SensorToState == nil || d.Noise.Std == nil {
		return nil, nil
	}
	n, _, p := m.Dims()
	sensor, process = mat.NewDense(n, p, nil), make([]float64, n)
	correlated := false
	for j := range p {
		unit := mat.Col(nil, j, d.Noise.SensorToState)
		if d.Form == estimator.Current {
			unit = filtered(m, d, j)
		}
		for i, v := range unit {
			sensor.Set(i, j, v*math.Sqrt(m.R.At(j, j)))
		}
		for k := range j {
			correlated = correlated || m.R.At(j, k) != 0
		}
	}
	for i, std := range d.Noise.Std {
		rest := std * std
		for j := range p {
			rest -= sensor.At(i, j) * sensor.At(i, j)
		}
		switch {
		case correlated:
			process[i] = math.NaN()
		case rest > std*std*1e-9: // else nothing but rounding
			process[i] = math.Sqrt(rest)
		}
	}
	return sensor, process
}

// filtered returns the standard deviation of each state's error for unit noise on
// sensor j alone, in current form: of (I − Lf C) e − Lf v, where e is the error of
// the prediction. Its covariance X = F X Fᵀ + l lᵀ is summed by doubling, as in
// Smith, "Matrix equation XA + BX = C", SIAM J. Applied Mathematics 16 (1968).
func filtered(m *estimator.Model, d *estimator.Design, j int) []float64 {
	n, _, _ := m.Dims()
	if d.GainCurrent == nil {
		return nil
	}
	var f, x, keep, out mat.Dense
	f.Mul(d.Gain, m.C)
	f.Sub(m.A, &f)
	l := d.Gain.ColView(j)
	x.Outer(1, l, l)
	const most = 60                                    // doublings: enough for a pole within 1e-15 of the circle
	for k := 0; k < most && mat.Norm(&f, 1) > 0; k++ { // powers of a stable F end at 0
		var step, moved mat.Dense
		moved.Mul(&f, &x)
		step.Mul(&moved, f.T())
		x.Add(&x, &step)
		moved.Mul(&f, &f)
		f.Copy(&moved)
	}
	keep.Mul(d.GainCurrent, m.C)
	keep.Scale(-1, &keep)
	for i := range n {
		keep.Set(i, i, keep.At(i, i)+1)
	}
	out.Mul(&keep, &x)
	x.Mul(&out, keep.T())
	std := make([]float64, n)
	for i := range std {
		lf := d.GainCurrent.At(i, j)
		std[i] = math.Sqrt(max(x.At(i, i)+lf*lf, 0))
	}
	return std
}
