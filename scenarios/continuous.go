package scenarios

import (
	"fmt"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
)

// holding runs a continuous estimator together with its plant. Over one step h
// both obey, exactly,
//
//	x' = A x + B u + c                    the real plant
//	x̂' = Â x̂ + B̂ u + L (C x + D u + η − Ĉ x̂ − D̂ u)
//	u  = r − K x̂
//
// where r, η and c are held. r is chosen so that u begins at what the actuators
// do, η so that the innovation begins at what the sensors give: without
// saturation, quantisation and faults nothing but drives and noise is held. One
// matrix exponential per set of lost sensors gives the step.
type holding struct {
	n, m, p, nt int
	// steps has the matrix of [x; x̂] and its held inputs [r; η; c] per set of
	// lost sensors; v holds what it multiplies.
	steps   map[uint32]*packed
	v, to   []float64
	nothing []float64
}

// take sets up the steps for a gain.
func (h *holding) take(r *Runner, l *mat.Dense) error {
	h.n, h.m, h.p, h.nt = r.n, r.m, r.p, r.nt
	size := h.nt + h.n + h.m + h.p + h.nt
	if h.v == nil {
		h.v, h.to, h.nothing = make([]float64, size), make([]float64, h.nt+h.n), make([]float64, h.nt+h.n)
	}
	h.steps = map[uint32]*packed{}
	for _, lost := range r.faults.lostSets() {
		step, err := h.exponential(r, l, lost)
		if err != nil {
			return err
		}
		h.steps[lost] = new(packed)
		h.steps[lost].pack(step)
	}
	return nil
}

// exponential computes one step while the sensors in lost give nothing.
func (h *holding) exponential(r *Runner, gain *mat.Dense, lost uint32) (flat, error) {
	l := mat.DenseCopyOf(gain)
	for j := range h.p {
		if lost>>j&1 == 1 {
			for i := range h.n {
				l.Set(i, j, 0)
			}
		}
	}
	z, size := h.nt+h.n, len(h.v)
	big := mat.NewDense(size, size, nil)
	slice := func(i, j, rows, cols int) *mat.Dense { return big.Slice(i, i+rows, j, j+cols).(*mat.Dense) }
	t, m := r.real, r.model
	slice(0, 0, h.nt, h.nt).Copy(t.a)
	slice(h.nt, 0, h.n, h.nt).Mul(l, t.c)
	own := slice(h.nt, h.nt, h.n, h.n)
	own.Mul(l, m.C)
	own.Sub(m.A, own)
	slice(h.nt, z+h.m, h.n, h.p).Copy(l)
	for i := range h.nt {
		big.Set(i, z+h.m+h.p+i, 1)
	}
	if h.m > 0 {
		slice(0, z, h.nt, h.m).Copy(t.b)
		in := slice(h.nt, z, h.n, h.m)
		in.Copy(m.B)
		var through mat.Dense
		for _, d := range []struct {
			d    *mat.Dense
			sign float64
		}{{t.d, 1}, {m.D, -1}} {
			if d.d != nil {
				through.Mul(l, d.d)
				through.Scale(d.sign, &through)
				in.Add(in, &through)
				through.Reset()
			}
		}
		if r.closed {
			var back mat.Dense
			back.Mul(slice(0, z, z, h.m), m.K)
			all := slice(0, h.nt, z, h.n)
			all.Sub(all, &back)
		}
	}
	big.Scale(r.step, big)
	if !finite(big.RawMatrix().Data) {
		return flat{}, fmt.Errorf("plant and estimator over one step of %g s: %w", r.step, estimator.ErrNotFinite)
	}
	var e mat.Dense
	e.Exp(big)
	step := newFlat(z, size)
	for i := range z {
		copy(step.row(i), e.RawRowView(i))
	}
	if !finite(step.a) {
		return flat{}, fmt.Errorf("plant and estimator over one step of %g s: %w", r.step, estimator.ErrNotFinite)
	}
	return step, nil
}

// continuous runs some steps.
func (r *Runner) continuous(w window, k0, count int) {
	h := &r.hold
	z := h.nt + h.n
	held := h.v[z:]
	for i := range count {
		x, v := r.row(i)
		r.control(w.d[i*r.m:], v)
		copy(x[r.nt:], v[r.n:r.n+r.m])
		g := w.g[i*r.p : (i+1)*r.p]
		r.innovate(g, k0+i, i, x, v)

		copy(h.v, x[:h.nt])
		copy(h.v[h.nt:], v[:h.n])
		for j, u := range v[r.n : r.n+r.m] {
			held[j] = u
			if r.closed {
				held[j] += r.command[j]
			}
		}
		for j, e := range v[r.n+r.m:] {
			held[r.m+j] = e + r.want[j] - (r.y[j] - g[j])
		}
		copy(held[r.m+r.p:], w.c[i*r.nt:(i+1)*r.nt])
		h.steps[r.faults.lost(k0+i)].mulAdd(h.to, h.v, h.nothing)
		nextX, nextV := r.row(i + 1)
		for j := range r.nt {
			nextX[j] = h.to[j] + w.f[i*r.nt+j]
		}
		copy(nextV, h.to[h.nt:])
	}
}
