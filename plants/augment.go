package plants

import (
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
)

// augment writes the plant with the states of its lags and unknowns into the
// assembly, in the time of the plant's matrices.
//
// With the signals that reach the plant, U = Ux x + Uu u (lagged inputs are
// states, unknowns add to them), the plant's rows are [A 0] + B Ux and B Uu, and
// the sensors' are [C 0] + D Ux and D Uu before their own lags.
func (b *assembly) augment(values map[string]float64) *Error {
	p := b.p
	n, m := len(p.States), len(p.Inputs)
	for _, s := range p.States {
		b.add(s.Name, s.Scale, estimator.PlantState)
	}
	inputLag := map[int]int{}
	for j, u := range p.Inputs {
		if u.Lag > 0 {
			inputLag[j] = b.add(u.Name+" lag", u.Scale, estimator.LagState)
		}
	}
	sensorLag := map[int]int{}
	for _, i := range b.used {
		if s := p.Sensors[i]; s.Lag > 0 {
			sensorLag[i] = b.add(s.Name+" lag", s.Scale, estimator.LagState)
		}
	}
	unknowns := b.addUnknowns()
	total := len(b.names)

	// The signals that reach the plant.
	ux := mat.NewDense(max(m, 1), total, nil)
	uu := mat.NewDense(max(m, 1), max(m, 1), nil)
	for j := range m {
		if s, lagged := inputLag[j]; lagged {
			ux.Set(j, s, 1)
		} else {
			uu.Set(j, j, 1)
		}
	}
	for _, u := range unknowns {
		if u.Kind != SensorOffset {
			ux.Set(u.Index, u.state, 1)
		}
	}
	if err := b.plantRows(values, ux, uu); err != nil {
		return err
	}
	for j, s := range inputLag {
		keep, take := b.lagFactors(p.Inputs[j].Lag)
		b.a.Set(s, s, keep)
		b.b.Set(s, j, take)
	}
	for row, i := range b.used {
		s, lagged := sensorLag[i]
		if !lagged {
			continue
		}
		keep, take := b.lagFactors(p.Sensors[i].Lag)
		for k := range total {
			b.a.Set(s, k, take*b.c.At(row, k))
			b.c.Set(row, k, 0)
		}
		for j := range m {
			b.b.Set(s, j, take*b.d.At(row, j))
			b.d.Set(row, j, 0)
		}
		b.a.Set(s, s, keep)
		b.c.Set(row, s, 1)
	}
	for _, u := range unknowns {
		b.fillUnknown(u)
	}
	return b.processNoise(values, n, total, unknowns)
}

// plantRows evaluates A, B, C and D and spreads them over the assembly.
func (b *assembly) plantRows(values map[string]float64, ux, uu *mat.Dense) *Error {
	p := b.p
	n, m, total := len(p.States), len(p.Inputs), len(b.names)
	a, err := evaluate("model, A", p.a, n, n, values)
	if err != nil {
		return err
	}
	c, err := evaluate("model, C", p.c, len(p.Sensors), n, values)
	if err != nil {
		return err
	}
	b.a = mat.NewDense(total, total, nil)
	b.c = mat.NewDense(len(b.used), total, nil)
	b.a.Slice(0, n, 0, n).(*mat.Dense).Copy(a)
	for row, i := range b.used {
		for k := range n {
			b.c.Set(row, k, c.At(i, k))
		}
	}
	if m == 0 {
		return nil
	}
	in, err := evaluate("model, B", p.b, n, m, values)
	if err != nil {
		return err
	}
	through := mat.NewDense(len(p.Sensors), m, nil)
	if p.d != nil {
		if through, err = evaluate("model, D", p.d, len(p.Sensors), m, values); err != nil {
			return err
		}
	}
	var bx, bu, dx, du mat.Dense
	bx.Mul(in, ux)
	bu.Mul(in, uu)
	dx.Mul(through, ux)
	du.Mul(through, uu)
	rows := b.a.Slice(0, n, 0, total).(*mat.Dense)
	rows.Add(rows, &bx)
	b.b = mat.NewDense(total, m, nil)
	b.b.Slice(0, n, 0, m).(*mat.Dense).Copy(&bu)
	b.d = mat.NewDense(len(b.used), m, nil)
	for row, i := range b.used {
		for k := range total {
			b.c.Set(row, k, b.c.At(row, k)+dx.At(i, k))
		}
		for j := range m {
			b.d.Set(row, j, du.At(i, j))
		}
	}
	return nil
}

// lagFactors gives a lag's own coefficient and that of its signal.
func (b *assembly) lagFactors(lag float64) (keep, take float64) {
	if b.discrete {
		return math.Exp(-b.period / lag), -math.Expm1(-b.period / lag)
	}
	return -1 / lag, 1 / lag
}

// placedUnknown is an unknown with the index of its first state.
type placedUnknown struct {
	Unknown
	state int
}

func (b *assembly) addUnknowns() []placedUnknown {
	if b.withoutUnknowns {
		return nil
	}
	inUse := map[int]bool{}
	for _, i := range b.used {
		inUse[i] = true
	}
	b.cancel = map[int]string{}
	var placed []placedUnknown
	for _, u := range b.p.Unknowns {
		if u.Kind == SensorOffset && !inUse[u.Index] {
			continue // nothing would show it
		}
		at := placedUnknown{Unknown: u}
		switch u.Kind {
		case InputRamp:
			at.state = b.add(u.On+" ramp", u.Scale, estimator.UnknownState)
			b.add(u.On+" ramp slope", u.Scale, estimator.UnknownState)
		case InputSine:
			name := fmt.Sprintf("%s sine %g Hz", u.On, u.Frequency)
			at.state = b.add(name, u.Scale, estimator.UnknownState)
			b.add(name+" quadrature", u.Scale, estimator.UnknownState)
		default:
			at.state = b.add(u.On+" offset", u.Scale, estimator.UnknownState)
		}
		if u.Kind == InputOffset && slices.Contains(b.p.Cancel, u.On) {
			b.cancel[u.Index] = b.names[at.state]
		}
		placed = append(placed, at)
	}
	return placed
}

// fillUnknown writes the dynamics of an unknown, and a sensor offset's way to
// its sensor.
func (b *assembly) fillUnknown(u placedUnknown) {
	s := u.state
	if b.discrete {
		b.a.Set(s, s, 1)
	}
	switch u.Kind {
	case SensorOffset:
		for row, i := range b.used {
			if i == u.Index {
				b.c.Set(row, s, 1)
			}
		}
	case InputRamp:
		if b.discrete {
			b.a.Set(s, s+1, b.period)
			b.a.Set(s+1, s+1, 1)
		} else {
			b.a.Set(s, s+1, 1)
		}
	case InputSine:
		w := 2 * math.Pi * u.Frequency
		if b.discrete {
			sin, cos := math.Sincos(w * b.period)
			b.a.Set(s, s, cos)
			b.a.Set(s, s+1, sin)
			b.a.Set(s+1, s, -sin)
			b.a.Set(s+1, s+1, cos)
		} else {
			b.a.Set(s, s+1, w)
			b.a.Set(s+1, s, -w)
		}
	}
}

// processNoise writes G and Q: the plant's own, then one column per driven
// state of an unknown.
func (b *assembly) processNoise(values map[string]float64, n, total int, unknowns []placedUnknown) *Error {
	p := b.p
	own := p.process.SymmetricDim()
	var driven []int
	var drift []float64
	for _, u := range unknowns {
		d := u.Drift
		if b.discrete {
			d *= b.period
		}
		switch u.Kind {
		case InputRamp:
			driven, drift = append(driven, u.state+1), append(drift, d)
		case InputSine:
			driven, drift = append(driven, u.state, u.state+1), append(drift, d, d)
		default:
			driven, drift = append(driven, u.state), append(drift, d)
		}
	}
	g := identity(n)
	if p.g != nil {
		var err *Error
		if g, err = evaluate("model, G", p.g, n, own, values); err != nil {
			return err
		}
	}
	b.g = mat.NewDense(total, own+len(driven), nil)
	b.g.Slice(0, n, 0, own).(*mat.Dense).Copy(g)
	b.q = mat.NewSymDense(own+len(driven), nil)
	for i := range own {
		for j := i; j < own; j++ {
			b.q.SetSym(i, j, p.process.At(i, j))
		}
	}
	for k, s := range driven {
		b.g.Set(s, own+k, 1)
		b.q.SetSym(own+k, own+k, drift[k])
	}
	return nil
}
