package emit

import (
	"math"

	"polewright/estimator"
)

// runner is the emitted estimator's plain reference: the same rules in double
// precision with the design's own numbers. Only the limits of ranges are as the
// target holds them, so that both accept the same samples.
type runner struct {
	p *program

	x        []float64 // deviation of the state at the next sample
	estimate []float64 // absolute: x̂[k+1|k] in prediction, x̂[k|k] in current form
	e        []float64 // innovations of this sample, 0 where left out
	turns    []float64 // whole wraps taken off each innovation
	used     []bool
	held     []float64 // last good inputs, absolute
	du       []float64
	filtered []float64 // current form: deviation after the correction
	next     []float64
	fault    bool
}

func newRunner(p *program) *runner {
	r := &runner{
		p: p, x: make([]float64, p.n), estimate: append([]float64(nil), p.x0...),
		e: make([]float64, p.p), turns: make([]float64, p.p), used: make([]bool, p.p),
		held: append([]float64(nil), p.u0...), du: make([]float64, p.m),
		filtered: make([]float64, p.n), next: make([]float64, p.n),
	}
	return r
}

// step takes the input held from this sample on, the samples, and which of
// them are missing.
func (r *runner) step(u, y []float64, missing []bool) {
	p := r.p
	r.takeInput(u)
	r.innovations(y, missing)
	from := r.x
	if p.form == estimator.Current {
		for i := range r.filtered {
			r.filtered[i] = r.x[i] + dot(p.gain[i*p.p:(i+1)*p.p], r.e)
		}
		r.reset(r.filtered)
		from = r.filtered
	}
	for i := range r.next {
		sum := dot(p.a[i*p.n:(i+1)*p.n], from) + dot(p.b[i*p.m:(i+1)*p.m], r.du)
		if p.form == estimator.Prediction {
			sum += dot(p.gain[i*p.p:(i+1)*p.p], r.e)
		}
		r.next[i] = sum
	}
	r.reset(r.next)
	copy(r.x, r.next)
	out := r.x
	if p.form == estimator.Current {
		out = r.filtered
	}
	for i := range out {
		r.estimate[i] = p.x0[i] + out[i]
	}
}

func (r *runner) takeInput(u []float64) {
	for j := range r.du {
		if p := r.p; math.Abs(u[j]) <= p.limit() {
			r.held[j] = u[j]
		}
		r.du[j] = r.held[j] - r.p.u0[j]
	}
}

// innovations sets e, used and turns.
func (r *runner) innovations(y []float64, missing []bool) {
	p := r.p
	for s := range r.e {
		r.e[s], r.turns[s], r.used[s] = 0, 0, false
		if missing[s] || !(y[s] >= p.low[s] && y[s] <= p.high[s]) {
			continue
		}
		e := y[s] - p.y0[s] - dot(p.c[s*p.n:(s+1)*p.n], r.x) - dot(p.d[s*p.m:(s+1)*p.m], r.du)
		if p.wrap[s] > 0 {
			q := e / p.wrap[s]
			if !(math.Abs(q) < maxTurns) {
				continue
			}
			r.turns[s] = math.Round(q)
			e -= p.wrap[s] * r.turns[s]
		}
		if !(math.Abs(e) <= p.limit()) {
			continue
		}
		r.e[s], r.used[s] = e, true
	}
}

// maxTurns bounds the whole wraps in one innovation: they must fit a C long.
const maxTurns = 1e9

// reset zeroes a state that left the limit and reports the fault.
func (r *runner) reset(x []float64) {
	for _, v := range x {
		if !(math.Abs(v) <= r.p.limit()) {
			r.fault = true
			clear(x)
			return
		}
	}
}

func dot(a, b []float64) float64 {
	sum := 0.0
	for i, v := range a {
		sum += v * b[i]
	}
	return sum
}
