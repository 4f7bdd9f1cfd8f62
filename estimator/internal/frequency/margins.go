package frequency

import (
	"math"
	"math/cmplx"
)

// Result holds the margins of a loop.
type Result struct {
	// GainBelowDB and GainAboveDB are the nearest gain factors below and above 1
	// that bring the loop to the stability limit, in dB (below < 0 < above);
	// infinite where there is none.
	GainBelowDB, GainAboveDB float64
	// PhaseDeg is the least angle between L and −1 over all frequencies with
	// |L| = 1, lead or lag, in degrees; +Inf without such a frequency.
	PhaseDeg float64
	// DelayS is the least delay in seconds that destabilises, +Inf where none.
	DelayS float64
	// SensitivityPeak is the largest |1/(1 + L)|, at SensitivityFrequency in
	// rad/s (+Inf: in the limit).
	SensitivityPeak, SensitivityFrequency float64
}

// factors beyond these count as no limit: they are rounding of a loop gain of
// zero or of infinity.
const (
	leastFactor = 1e-9
	mostFactor  = 1e9
)

// Margins returns the classical margins of a loop transfer L(s) or L(z) with one
// input and one output, closed by u = −w. It fails where the closed loop is not
// asymptotically stable.
//
// All of it is read off the stable T = L/(1 + L): |L| = 1 where Re T = 1/2, and L
// is real where Im T = 0. The crossings are the imaginary eigenvalues of
// Hamiltonian-like matrices of twice the size; these and a grid around all poles
// divide the frequencies into intervals, in each of which a change of sign is
// followed down to rounding.
func Margins(loop System) (Result, error) {
	nan := math.NaN()
	none := Result{nan, nan, nan, nan, nan, nan}
	m, err := read(loop)
	if err != nil {
		return none, err
	}
	if m.b.c != 1 || m.c.r != 1 {
		return none, ErrShape
	}
	t, err := m.closed()
	if err != nil {
		return none, err
	}
	if err := t.toContinuous(); err != nil {
		return none, err
	}
	r, err := newResponse(t)
	if err != nil {
		return none, err
	}
	var res Result
	if res.SensitivityPeak, res.SensitivityFrequency, err = r.peak(t.sensitivity(), true); err != nil {
		return none, err
	}
	turns, err := t.realAxis()
	if err != nil {
		return none, err
	}
	unit, err := t.unitGain()
	if err != nil {
		return none, err
	}
	turns, unit = r.roots(append(turns, unit...))
	r.gainMargins(turns, &res)
	r.phaseMargins(t, unit, &res)
	return res, nil
}

// gainMargins looks at all frequencies where L is real.
func (r *response) gainMargins(turns []float64, res *Result) {
	below, above := 0.0, math.Inf(1)
	consider := func(nu float64) {
		v := r.at(nu)[0]
		if !(cmplx.Abs(v) > 1e-13*r.noise) {
			return // L is zero
		}
		// 1 + k L = 0 with L = T/(1 − T)
		k := (real(v) - 1) / real(v)
		switch {
		case k > leastFactor && k < 1:
			below = max(below, k)
		case k > 1 && k < mostFactor:
			above = min(above, k)
		}
	}
	consider(0)
	consider(math.Inf(1))
	for _, nu := range turns {
		consider(nu)
	}
	res.GainBelowDB, res.GainAboveDB = 20*math.Log10(below), 20*math.Log10(above)
}

// phaseMargins looks at all frequencies where |L| = 1.
func (r *response) phaseMargins(t *model, unit []float64, res *Result) {
	res.PhaseDeg, res.DelayS = math.Inf(1), math.Inf(1)
	for _, nu := range unit {
		v := r.at(nu)[0]
		angle := cmplx.Phase(v / (v - 1)) // of −L
		res.PhaseDeg = min(res.PhaseDeg, math.Abs(angle)*180/math.Pi)
		if angle <= 0 {
			angle += 2 * math.Pi
		}
		if w := t.rad(nu); w > 0 {
			res.DelayS = min(res.DelayS, angle/w)
		}
	}
}

// unitGain returns candidates for Re T = 1/2: the |Im| of the eigenvalues of the
// Hamiltonian matrix of T(s) + T(−s) − 1, the positive-real one.
func (t *model) unitGain() ([]float64, error) {
	n := t.n
	q := 2*t.d.v[0] - 1
	if math.Abs(q) < 1e-12 {
		return nil, nil // |L| = 1 at infinite frequency: the grid has to do
	}
	// zeros of q + C (sI − A)⁻¹ B + Bᵀ (−sI − Aᵀ)⁻¹ Cᵀ
	h := newDense(2*n, 2*n)
	for i := range n {
		for k := range n {
			b, c, bk, ck := t.b.v[i], t.c.v[i], t.b.v[k], t.c.v[k]
			h.row(i)[k] = t.a.v[i*n+k] - b*ck/q
			h.row(i)[n+k] = -b * bk / q
			h.row(n + i)[k] = c * ck / q
			h.row(n + i)[n+k] = -t.a.v[k*n+i] + c*bk/q
		}
	}
	_, im, err := eigenvalues(h)
	if err != nil {
		return nil, err
	}
	return upper(im), nil
}

// realAxis returns candidates for Im T = 0: the finite zeros of T(s) − T(−s), a
// system of twice the size without feedthrough. Its pencil is turned into an
// eigenvalue problem about a point on the real axis, where infinite zeros become 0.
func (t *model) realAxis() ([]float64, error) {
	n := t.n
	size := 2*n + 1
	// the size of the poles, off them
	shift := 0.737 * math.Max(t.a.largest(), 1e-100)
	lhs, e := newDense(size, size), newDense(size, size)
	for i := range n {
		for k := range n {
			lhs.row(i)[k] = t.a.v[i*n+k]
			lhs.row(n + i)[n+k] = -t.a.v[i*n+k]
		}
		lhs.row(i)[i] -= shift
		lhs.row(n + i)[n+i] -= shift
		lhs.row(i)[2*n] = t.b.v[i]
		lhs.row(n + i)[2*n] = t.b.v[i]
		// T(s) − T(−s) = C (sI − A)⁻¹ B + C (sI + A)⁻¹ B
		lhs.row(2 * n)[i] = t.c.v[i]
		lhs.row(2 * n)[n+i] = t.c.v[i]
		e.row(i)[i], e.row(n + i)[n+i] = 1, 1
	}
	if !solve(lhs, e) {
		return nil, nil
	}
	re, im, err := eigenvalues(e)
	if err != nil {
		return nil, err
	}
	var list []float64
	for i := range re {
		if mu := complex(re[i], im[i]); cmplx.Abs(mu)*shift > 1e-12 {
			list = append(list, imag(complex(shift, 0)+1/mu))
		}
	}
	return upper(list), nil
}
