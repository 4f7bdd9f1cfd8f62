package frequency

import (
	"fmt"
	"math"
	"math/cmplx"
	"sort"
)

// PeakGain returns the largest gain (2-norm from inputs to outputs) of a stable
// system over all frequencies, up to π/period in discrete time, and where it is;
// +Inf stands for a peak that is only reached in the limit. The value is
// accurate to about 1e-9.
//
// It follows Bruinsma & Steinbuch 1990: a level above the best gain known is
// crossed at the imaginary eigenvalues of a Hamiltonian matrix, where the search
// goes on, until a level has none. Sampled systems are mapped to continuous ones
// first.
func PeakGain(sys System) (value, rad float64, err error) {
	m, err := read(sys)
	if err != nil {
		return math.NaN(), math.NaN(), err
	}
	if err := m.toContinuous(); err != nil {
		return math.NaN(), math.NaN(), err
	}
	return peak(m)
}

// PeakGains is PeakGain for each output alone: element i belongs to row i of C.
// One Hessenberg form serves all of them. Beyond 8 states the peaks come from a
// grid around the poles and are not checked by a Hamiltonian matrix each.
func PeakGains(sys System) (values, rads []float64, err error) {
	m, err := read(sys)
	if err != nil {
		return nil, nil, err
	}
	if err := m.toContinuous(); err != nil {
		return nil, nil, err
	}
	r, err := newResponse(m)
	if err != nil {
		return nil, nil, err
	}
	if !r.stable() {
		return nil, nil, ErrUnstable
	}
	values, rads = make([]float64, r.out), make([]float64, r.out)
	r.scan(values, rads)
	for i := range values {
		p := search{gain: r.row(i).gain, best: values[i], where: rads[i]}
		if m.n > certified {
			rads[i] = m.rad(rads[i])
			if math.IsNaN(p.best) || math.IsInf(p.best, 0) {
				return nil, nil, ErrNotFinite
			}
			continue
		}
		one := &model{n: m.n, period: m.period, a: m.a, b: m.b, c: dense{1, m.n, m.c.row(i)}, d: dense{1, m.b.c, m.d.row(i)}}
		values[i], rads[i], err = p.certify(one)
		if err != nil {
			return nil, nil, fmt.Errorf("output %d: %w", i+1, err)
		}
	}
	return values, rads, nil
}

// SensitivityPeakMIMO returns sup σmax((I + L)⁻¹) of a loop with as many inputs
// as outputs, closed by u = −w. It fails where the closed loop is not stable.
func SensitivityPeakMIMO(loop System) (float64, error) {
	m, err := read(loop)
	if err != nil {
		return math.NaN(), err
	}
	t, err := m.closed()
	if err != nil {
		return math.NaN(), err
	}
	if err := t.toContinuous(); err != nil {
		return math.NaN(), err
	}
	v, _, err := peak(t.sensitivity())
	return v, err
}

// peak is PeakGain for a continuous model.
func peak(m *model) (value, rad float64, err error) {
	r, err := newResponse(m)
	if err != nil {
		return math.NaN(), math.NaN(), err
	}
	return r.peak(m, false)
}

// peak finds the largest gain of m, whose response r is; or, with complement,
// whose response is 1 less r, for one input and output.
func (r *response) peak(m *model, complement bool) (value, rad float64, err error) {
	if !r.stable() {
		return math.NaN(), math.NaN(), ErrUnstable
	}
	gain := r.gain
	if complement {
		gain = func(nu float64) float64 { return cmplx.Abs(1 - r.at(nu)[0]) }
	}
	p := search{gain: gain, best: gain(0)}
	for _, nu := range r.poleGrid() {
		p.try(nu)
	}
	p.climb()
	return p.certify(m)
}

// certify looks for gains of m above the best known, until a level just above
// it has no crossing.
func (p *search) certify(m *model) (value, rad float64, err error) {
	for range 40 {
		nus, err := m.crossings(p.best * (1 + 1e-9))
		if err != nil {
			return math.NaN(), math.NaN(), err
		}
		before := p.best
		for i, nu := range nus {
			p.try(nu)
			if i > 0 {
				p.try((nu + nus[i-1]) / 2)
				p.try(math.Sqrt(nu * nus[i-1]))
			}
		}
		if !(p.best > before*(1+1e-9)) {
			break
		}
		p.climb()
	}
	if math.IsNaN(p.best) || math.IsInf(p.best, 0) {
		return math.NaN(), math.NaN(), ErrNotFinite
	}
	return p.best, m.rad(p.where), nil
}

// crossings returns, in rising order, the |Im| of all eigenvalues of the
// Hamiltonian matrix of the level. Those on the imaginary axis are where a
// singular value crosses it; the others do no harm as places to look.
func (m *model) crossings(level float64) ([]float64, error) {
	if level == 0 {
		return nil, nil
	}
	n, in := m.n, m.b.c
	// R = level² I − DᵀD
	rr := newDense(in, in)
	dt := transpose(m.d)
	rr.addProduct(-1, dt, m.d)
	for i := range in {
		rr.v[i*in+i] += level * level
	}
	// [Dᵀ C, Bᵀ] by R⁻¹
	rhs := newDense(in, 2*n)
	dc := newDense(in, n)
	dc.addProduct(1, dt, m.c)
	for i := range in {
		copy(rhs.row(i), dc.row(i))
		for k := range n {
			rhs.row(i)[n+k] = m.b.v[k*in+i]
		}
	}
	if !solve(rr, rhs) {
		return nil, nil // the level is that of infinite frequency
	}
	// [A 0; −CᵀC −Aᵀ] + [B; −CᵀD] R⁻¹ [DᵀC Bᵀ]
	h := newDense(2*n, 2*n)
	left := newDense(2*n, in)
	ct := transpose(m.c)
	cc := newDense(n, n)
	cc.addProduct(-1, ct, m.c)
	for i := range n {
		copy(h.row(i), m.a.row(i))
		copy(h.row(n+i), cc.row(i))
		for k := range n {
			h.row(n + i)[n+k] = -m.a.v[k*n+i]
		}
		copy(left.row(i), m.b.row(i))
		for k := range in {
			left.row(n + i)[k] = -dc.v[k*n+i]
		}
	}
	h.addProduct(1, left, rhs)
	_, im, err := eigenvalues(h)
	if err != nil {
		return nil, err
	}
	return upper(im), nil
}

// upper returns the distinct non-negative values in rising order.
func upper(im []float64) []float64 {
	var list []float64
	for _, v := range im {
		if v >= 0 {
			list = append(list, v)
		}
	}
	sort.Float64s(list)
	return list
}

func transpose(m dense) dense {
	t := newDense(m.c, m.r)
	for i := range m.r {
		for k := range m.c {
			t.v[k*m.r+i] = m.v[i*m.c+k]
		}
	}
	return t
}

// search keeps the largest gain seen.
type search struct {
	gain        func(nu float64) float64
	best, where float64
}

func (p *search) try(nu float64) float64 {
	g := p.gain(nu)
	if g > p.best || math.IsNaN(g) {
		p.best, p.where = g, nu
	}
	return g
}

// climb moves to the top of the hill that the best place is on: it brackets the
// top with growing steps, then takes golden sections and parabolas.
func (p *search) climb() {
	if math.IsInf(p.where, 1) || p.where == 0 {
		return
	}
	step := 1e-3 * p.where
	for range 100 {
		centre := p.where
		a, b := centre-step, centre+step
		if a < 0 {
			a = 0
		}
		ga, gb := p.try(a), p.try(b)
		if !(ga > p.best || gb > p.best) && p.where == centre {
			p.narrow(a, centre, b, ga, gb)
			return
		}
		step *= 2
		if p.where == 0 || step > 1e6*centre {
			return
		}
	}
}

// narrow takes the top of the parabola through three places, or a golden
// section where that is no progress.
func (p *search) narrow(a, c, b, ga, gb float64) {
	gc := p.best
	for range 60 {
		if b-a <= 1e-9*b {
			return
		}
		u, v := (c-a)*(gc-gb), (c-b)*(gc-ga)
		nu := c
		if d := u - v; d != 0 {
			nu = c - ((c-a)*u-(c-b)*v)/(2*d)
		}
		if !(nu > a && nu < b) || math.Abs(nu-c) < 1e-10*c {
			if b-c > c-a {
				nu = c + 0.382*(b-c)
			} else {
				nu = c - 0.382*(c-a)
			}
		}
		g := p.try(nu)
		if math.Abs(g-gc) < 1e-13*gc {
			return
		}
		switch {
		case g > gc && nu > c:
			a, ga, c, gc = c, gc, nu, g
		case g > gc:
			b, gb, c, gc = c, gc, nu, g
		case nu > c:
			b, gb = nu, g
		default:
			a, ga = nu, g
		}
		if gc-max(ga, gb) < 1e-14*gc {
			return
		}
	}
}
