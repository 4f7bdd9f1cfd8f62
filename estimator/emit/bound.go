package emit

import (
	"math"

	"polewright/estimator"
)

// bound follows how far the target's rounding can move each state from the
// design's own numbers. Per step it adds up what rounding the tables and every
// operation can do (Higham 2002, "Accuracy and Stability of
// Numerical Algorithms", section 3.1: γ_k = k u / (1 − k u) for a sum
// of k terms in any order, fused or not), componentwise and with the actual
// difference of each rounded table entry. An error made at step i then moves on
// by the product of the transition matrices since, so the bound at step k is
// Σ_i |F_k ⋯ F_{i+1}| δ_i: rounding that dies out is not counted for ever.
type bound struct {
	p    *program
	unit float64 // unit roundoff of the arithmetic
	tiny float64 // error of an operation that underflows
	half float64 // fixed point: error of the one rounding of each sum

	most  int // past errors followed one by one
	past  []pastError
	state []float64 // bound on |x of the target − x of the design|
	out   []float64 // bound on the same for the absolute estimate

	da, db, dc, dd, dgain []float64 // |entry − rounded entry|
	eps                   []float64 // per sensor, local error of the innovation
	off                   []float64 // per sensor, whole error of the last innovation
	local                 []float64
	f, g                  []float64
}

// pastError is the local error of one step and how it is carried on since.
type pastError struct {
	carry []float64 // n×n
	delta []float64 // n
}

func newBound(p *program) *bound {
	b := &bound{
		p: p, most: mostPast, unit: 0x1p-53, tiny: 0x1p-1022,
		state: make([]float64, p.n), out: make([]float64, p.n),
		da: p.lost(p.a), db: p.lost(p.b), dc: p.lost(p.c), dd: p.lost(p.d), dgain: p.lost(p.gain),
		eps: make([]float64, p.p), off: make([]float64, p.p), local: make([]float64, p.n),
		f: make([]float64, p.n*p.n), g: make([]float64, p.n*p.n),
	}
	switch p.arithmetic {
	case Float:
		b.unit, b.tiny = 0x1p-24, 0x1p-126
	case Fixed:
		b.unit, b.tiny, b.half = 0, 0, math.Ldexp(0.5, -p.bits)
	}
	return b
}

// lost returns what rounding takes from each entry.
func (p *program) lost(v []float64) []float64 {
	d := make([]float64, len(v))
	for i := range v {
		d[i] = math.Abs(v[i] - p.coefficient(v[i]))
	}
	return d
}

// gamma is Higham's γ_k.
func (b *bound) gamma(k int) float64 {
	ku := float64(k) * b.unit
	return ku / (1 - ku)
}

// step follows one step that r has just done from the deviations x.
func (b *bound) step(r *runner, x []float64) {
	p := b.p
	xAbs := make([]float64, p.n) // largest size of the target's state before
	for i := range xAbs {
		xAbs[i] = math.Abs(x[i]) + b.state[i]
	}
	dlt := make([]float64, p.m) // error of an input's deviation ...
	uAbs := make([]float64, p.m)
	for j := range dlt {
		dlt[j] = b.unit*math.Abs(r.du[j]) + 2*math.Abs(p.u0[j]-p.round(p.u0[j])) + b.tiny
		uAbs[j] = math.Abs(r.du[j]) + dlt[j] // ... and its largest size
	}
	eAbs := b.innovation(r, xAbs, uAbs, dlt)
	if p.form == estimator.Current {
		b.current(r, xAbs, uAbs, dlt, eAbs)
	} else {
		b.prediction(xAbs, uAbs, dlt, eAbs)
	}
	p.transition(b.f, r.used)
	b.carryOn()
	if p.form == estimator.Prediction {
		copy(b.out, b.state)
	}
	for i := range b.out {
		b.out[i] += b.unit*(math.Abs(r.estimate[i])+b.out[i]) + 2*math.Abs(p.x0[i]-p.round(p.x0[i])) + b.tiny
	}
}

// innovation sets eps, what the target's innovations err by beside −C times the
// state's error, and returns their largest sizes.
func (b *bound) innovation(r *runner, xAbs, uAbs, dlt []float64) []float64 {
	p := b.p
	eAbs := make([]float64, p.p)
	terms := b.gamma(p.n + p.m + 2)
	for s := range eAbs {
		b.eps[s] = 0
		if !r.used[s] {
			continue
		}
		c, d := row(p.c, s, p.n), row(p.d, s, p.m)
		dc, dd := row(b.dc, s, p.n), row(b.dd, s, p.m)
		// y − y0 is what the innovation and the other terms leave.
		size := math.Abs(r.e[s]) + p.wrap[s]*math.Abs(r.turns[s]) + 2*(dotAbs(c, xAbs)+dotAbs(d, uAbs)+dot(dc, xAbs)+dot(dd, uAbs))
		eps := terms*size + 2*math.Abs(p.y0[s]-p.round(p.y0[s])) + dot(dc, xAbs) + dot(dd, uAbs) + dotAbs(d, dlt)
		if p.wrap[s] > 0 {
			turned := p.wrap[s] * math.Abs(r.turns[s])
			eps += math.Abs(p.wrap[s]-p.round(p.wrap[s]))*math.Abs(r.turns[s]) + 4*b.unit*turned + 2*b.unit*math.Abs(r.e[s])
		}
		b.eps[s] = eps + float64(p.n+p.m+4)*b.tiny + b.half
		b.off[s] = dotAbs(c, b.state) + b.eps[s]
		eAbs[s] = math.Abs(r.e[s]) + b.off[s]
	}
	return eAbs
}

// prediction sets the local error of x ← A x + B u + L e.
func (b *bound) prediction(xAbs, uAbs, dlt, eAbs []float64) {
	p := b.p
	terms := b.gamma(p.n + p.m + p.p + 1)
	for i := range b.local {
		b.local[i] = b.update(i, terms, xAbs, uAbs, dlt) + b.gained(i, terms, eAbs)
	}
}

// current sets the local error of x ← x + Lf e, x ← A x + B u, and the bound on
// the corrected state.
func (b *bound) current(r *runner, xAbs, uAbs, dlt, eAbs []float64) {
	p := b.p
	terms := b.gamma(p.p + 2)
	local := make([]float64, p.n)
	p.correction(b.g, r.used)
	fAbs := make([]float64, p.n)
	for i := range local {
		local[i] = terms*xAbs[i] + b.gained(i, terms, eAbs) + b.tiny + b.half
		b.out[i] = dotAbs(row(b.g, i, p.n), b.state) + local[i]
		fAbs[i] = math.Abs(r.filtered[i]) + b.out[i]
	}
	terms = b.gamma(p.n + p.m + 1)
	for i := range b.local {
		b.local[i] = b.update(i, terms, fAbs, uAbs, dlt) + dotAbs(row(p.a, i, p.n), local)
	}
}

// update is the local error of row i of A x + B u.
func (b *bound) update(i int, terms float64, xAbs, uAbs, dlt []float64) float64 {
	p := b.p
	a, bu := row(p.a, i, p.n), row(p.b, i, p.m)
	da, db := row(b.da, i, p.n), row(b.db, i, p.m)
	lost := dot(da, xAbs) + dot(db, uAbs)
	return terms*(dotAbs(a, xAbs)+dotAbs(bu, uAbs)+lost) + lost + dotAbs(bu, dlt) + float64(p.n+p.m+p.p+4)*b.tiny + b.half
}

// gained is the local error of row i of gain·e.
func (b *bound) gained(i int, terms float64, eAbs []float64) float64 {
	g, dg := row(b.p.gain, i, b.p.p), row(b.dgain, i, b.p.p)
	lost := dot(dg, eAbs)
	return terms*(dotAbs(g, eAbs)+lost) + lost + dotAbs(g, b.eps)
}

// mostPast is how many past errors are followed one by one in a long run.
const mostPast = 24

// carryOn moves all past errors one step on, adds the new one and sums up. Where
// there are many, the older half becomes one error of the size of its sum: still
// an upper bound, a close one where F has forgotten most of it by then.
func (b *bound) carryOn() {
	n := b.p.n
	fresh := pastError{carry: make([]float64, n*n), delta: append([]float64(nil), b.local...)}
	for i := range n {
		fresh.carry[i*n+i] = 1
	}
	for _, e := range b.past {
		b.advance(e.carry)
	}
	b.past = append(b.past, fresh)
	if len(b.past) > b.most {
		b.merge(b.most / 2)
	}
	clear(b.state)
	for _, e := range b.past {
		for i := range n {
			b.state[i] += dotAbs(row(e.carry, i, n), e.delta)
		}
	}
}

// advance replaces carry by F·carry.
func (b *bound) advance(carry []float64) {
	n := b.p.n
	clear(b.g)
	for i := range n {
		to := row(b.g, i, n)
		for k, f := range row(b.f, i, n) {
			for j, c := range row(carry, k, n) {
				to[j] += f * c
			}
		}
	}
	copy(carry, b.g)
}

// merge makes one error of the oldest ones.
func (b *bound) merge(count int) {
	n := b.p.n
	sum := make([]float64, n)
	for _, e := range b.past[:count] {
		for i := range n {
			sum[i] += dotAbs(row(e.carry, i, n), e.delta)
		}
	}
	one := b.past[0].carry
	clear(one)
	for i := range n {
		one[i*n+i] = 1
	}
	b.past = append([]pastError{{carry: one, delta: sum}}, b.past[count:]...)
}

func row(v []float64, i, n int) []float64 { return v[i*n : (i+1)*n] }

// dotAbs is Σ |aᵢ| bᵢ.
func dotAbs(a, b []float64) float64 {
	sum := 0.0
	for i, v := range a {
		sum += math.Abs(v) * b[i]
	}
	return sum
}
