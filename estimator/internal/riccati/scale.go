package riccati

import (
	"math"

	"gonum.org/v1/gonum/mat"
)

// scale sets the powers of two by which sensors, states and noise are divided:
// sensors to noise of about one, states by balancing, W and R so that W is
// about as large as Cᵀ R⁻¹ C. It makes the answer depend little on the units
// in which states and sensors are counted.
func (p *problem) scale() {
	p.e = make([]float64, p.p)
	for j := range p.e {
		p.e[j] = powerOfTwo(math.Sqrt(p.r.At(j, j)))
		if !(p.r.At(j, j) > 0) {
			p.e[j] = powerOfTwo(mat.Norm(p.c.RowView(j), 2))
		}
	}
	p.c.Apply(func(i, _ int, v float64) float64 { return v / p.e[i] }, p.c)
	p.r.Apply(func(i, j int, v float64) float64 { return v / p.e[i] / p.e[j] }, p.r)
	p.balance()
	p.a.Apply(func(i, j int, v float64) float64 { return v / p.d[i] * p.d[j] }, p.a)
	p.c.Apply(func(_, j int, v float64) float64 { return v * p.d[j] }, p.c)
	p.w.Apply(func(i, j int, v float64) float64 { return v / p.d[i] / p.d[j] }, p.w)
	g := mat.Norm(p.c, 2)
	p.unit = powerOfTwo(mat.Norm(p.a, 2) / g / g)
	if w := mat.Norm(p.w, 2); w > 0 {
		p.unit = powerOfTwo(math.Sqrt(w) / g)
	}
	p.w.Scale(1/p.unit, p.w)
	p.r.Scale(1/p.unit, p.r)
}

// balance finds the scale of every state: the one at which what drives it (its
// row of A, its noise) is as large as what it drives (its column of A, the
// sensors). This is the iteration of Osborne, "On pre-conditioning of
// matrices", J. ACM 7 (1960), with noise and sensors as further rows and
// columns.
func (p *problem) balance() {
	p.d = make([]float64, p.n)
	for i := range p.d {
		p.d[i] = 1
	}
	for range 50 {
		settled := true
		for i := range p.n {
			in, out := math.Sqrt(math.Max(p.w.At(i, i), 0))/p.d[i], 0.0
			for k := range p.p {
				out = math.Hypot(out, p.c.At(k, i)*p.d[i])
			}
			for j := range p.n {
				if j != i {
					in = math.Hypot(in, p.a.At(i, j)/p.d[i]*p.d[j])
					out = math.Hypot(out, p.a.At(j, i)/p.d[j]*p.d[i])
				}
			}
			if !(in > 0) || !(out > 0) || math.IsInf(in, 0) || math.IsInf(out, 0) {
				continue
			}
			f := powerOfTwo(math.Sqrt(in) / math.Sqrt(out) / math.Sqrt2)
			next := p.d[i] * f
			if f != 1 && next > 0x1p-300 && next < 0x1p300 {
				p.d[i] = next
				settled = false
			}
		}
		if settled {
			return
		}
	}
}

// powerOfTwo returns the power of two in (v, 2v]; 1 where v is not positive.
func powerOfTwo(v float64) float64 {
	if !(v > 0) || math.IsInf(v, 0) {
		return 1
	}
	_, e := math.Frexp(v)
	return math.Ldexp(1, max(-500, min(500, e)))
}
