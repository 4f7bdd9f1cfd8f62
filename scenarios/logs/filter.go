package logs

import (
	"math"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
)

// filter is an estimator as the firmware runs it, on deviations.
//
// The innovation is e = [C −D][x; u] subtracted from y, with a zero in the place
// of a lost sensor. In prediction form x⁺ = [A B L][x; u; e]; in current form
// x̂ = x + Lf e and x⁺ = [A B][x̂; u].
type filter struct {
	n, m, p int
	next    []float64 // n×width, row-major
	width   int
	seen    []float64 // p×(n+m): C, D
	correct []float64 // n×p: Lf, nil in prediction form
	wrap    []float64 // per sensor, 0 without

	v    []float64 // x, u, e: x is the prediction x̂[k|k−1]
	w    []float64 // current form: x̂[k|k], u
	x2   []float64 // the next x while it is computed
	e    []float64 // innovation, NaN where lost
	lost bool      // a sensor was lost at this step
}

func newFilter(m *estimator.Model, g Gain, wrap []float64) *filter {
	n, inputs, p := m.Dims()
	f := &filter{n: n, m: inputs, p: p, wrap: wrap, width: n + inputs}
	if g.Lf == nil {
		f.width += p
	}
	f.next = make([]float64, n*f.width)
	for i := range n {
		row := f.next[i*f.width:]
		for j := range n {
			row[j] = m.A.At(i, j)
		}
		for j := range inputs {
			row[n+j] = m.B.At(i, j)
		}
		for j := range p {
			if g.Lf == nil {
				row[n+inputs+j] = g.L.At(i, j)
			}
		}
	}
	f.seen = make([]float64, p*(n+inputs))
	for i := range p {
		row := f.seen[i*(n+inputs):]
		for j := range n {
			row[j] = m.C.At(i, j)
		}
		for j := range inputs {
			if m.D != nil {
				row[n+j] = m.D.At(i, j)
			}
		}
	}
	if g.Lf != nil {
		f.correct = append([]float64(nil), mat.DenseCopyOf(g.Lf).RawMatrix().Data...)
		f.w = make([]float64, n+inputs)
	}
	f.v = make([]float64, n+inputs+p)
	f.x2 = make([]float64, n)
	f.e = make([]float64, p)
	return f
}

// start sets the prediction for the first sample.
func (f *filter) start(x []float64) { copy(f.v[:f.n], x) }

// estimate is x̂[k|k−1] in prediction form, x̂[k|k] in current form, once measure
// was called.
func (f *filter) estimate() []float64 {
	if f.correct != nil {
		return f.w[:f.n]
	}
	return f.v[:f.n]
}

// measure takes the inputs and sensors of this step.
func (f *filter) measure(u, y []float64) {
	n, nm := f.n, f.n+f.m
	v := f.v[:nm]
	copy(v[n:], u)
	used := f.v[nm:]
	f.lost = false
	for i := range f.e {
		row := f.seen[i*nm : i*nm+nm]
		var sum float64
		for j, c := range row {
			sum += c * v[j]
		}
		e := y[i] - sum
		if f.wrap[i] > 0 {
			e = math.Remainder(e, f.wrap[i])
		}
		f.e[i], used[i] = e, e
		if e != e {
			f.lost = true
			used[i] = 0
		}
	}
	if f.correct == nil {
		return
	}
	copy(f.w, v)
	for i := range n {
		row := f.correct[i*f.p : i*f.p+f.p]
		var sum float64
		for j, c := range row {
			sum += c * used[j]
		}
		f.w[i] += sum
	}
}

// skip is a step without any sensor: the inputs of the step before still hold.
func (f *filter) skip() {
	clear(f.v[f.n+f.m:])
	if f.correct != nil {
		copy(f.w, f.v[:f.n+f.m])
	}
	f.advance()
}

// advance goes on to the next step.
func (f *filter) advance() {
	v := f.v
	if f.correct != nil {
		v = f.w
	}
	v = v[:f.width]
	for i := range f.x2 {
		row := f.next[i*f.width : i*f.width+f.width]
		var sum float64
		for j, c := range row {
			sum += c * v[j]
		}
		f.x2[i] = sum
	}
	copy(f.v, f.x2)
}

// finite reports whether the estimate is still a number.
func (f *filter) finite() bool {
	for _, x := range f.v[:f.n] {
		if math.IsNaN(x) || math.IsInf(x, 0) {
			return false
		}
	}
	return true
}
