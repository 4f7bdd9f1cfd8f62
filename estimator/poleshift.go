package estimator

import (
	"fmt"
	"math/cmplx"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator/internal/schur"
	"polewright/estimator/poles"
)

// PoleShift is what rounding does to one pole.
type PoleShift struct {
	From, To complex128
	// Distance is |To − From|; Relative is that over |From|, or the distance
	// itself where the pole is 0, or within 0.01 of z = 0.
	Distance, Relative float64
}

// farthest is the largest relative movement of a pole that does not stay within
// near of 0, its size being at least near.
func farthest(list []PoleShift, near float64) float64 {
	worst := 0.0
	for _, s := range list {
		if from := cmplx.Abs(s.From); max(from, cmplx.Abs(s.To)) > near {
			worst = max(worst, s.Distance/max(from, near))
		}
	}
	return worst
}

// Float32Poles returns where the poles go when A, L and C are rounded to float32,
// in the order of the design's Reached, and the index of the one that moves most,
// relatively.
func Float32Poles(m *Model, d *Design) (shifts []PoleShift, worst int, err error) {
	if err := designFits(m, d); err != nil {
		return nil, 0, err
	}
	single := func(a *mat.Dense) *mat.Dense {
		out := mat.DenseCopyOf(a)
		out.Apply(func(_, _ int, v float64) float64 { return float64(float32(v)) }, out)
		return out
	}
	f := closedError(single(m.A), single(d.Gain), single(m.C))
	return shiftsOf(m, d, f)
}

// designFits holds a design against the model it is said to be for.
func designFits(m *Model, d *Design) error {
	if err := m.Check(); err != nil {
		return err
	}
	n, _, p := m.Dims()
	if d == nil || d.Gain == nil || len(d.Reached) != n || d.Form == Current && d.GainCurrent == nil {
		return fmt.Errorf("no design of this model: %w", ErrMethod)
	}
	for _, l := range []*mat.Dense{d.Gain, d.GainCurrent} {
		if l == nil {
			continue
		}
		if r, c := l.Dims(); r != n || c != p {
			return fmt.Errorf("the gain is %d×%d, expected %d×%d: %w", r, c, n, p, ErrShape)
		}
		if !finite(l) {
			return fmt.Errorf("the gain: %w", ErrNotFinite)
		}
	}
	return nil
}

// closedError returns A − L C.
func closedError(a, l, c *mat.Dense) *mat.Dense {
	f := new(mat.Dense)
	f.Mul(l, c)
	f.Sub(a, f)
	return f
}

// scaled returns S⁻¹ F S.
func scaled(m *Model, f *mat.Dense) *mat.Dense {
	n, _ := f.Dims()
	s := ones(m.StateScale, n)
	out := mat.DenseCopyOf(f)
	out.Apply(func(i, j int, v float64) float64 { return v * s[j] / s[i] }, out)
	return out
}

// nearZero is the size below which a pole of z dies out within a few samples,
// whatever becomes of it: such a pole is as good as zero, and a movement relative to
// its own size would mean nothing.
const nearZero = 0.01

// poleSize is what the movement of a pole is relative to.
func (m *Model) poleSize(v complex128) float64 {
	size := cmplx.Abs(v)
	if size == 0 || m.Discrete() && size < nearZero {
		return 1
	}
	return size
}

// shiftsOf matches the eigenvalues of f, in the user's units, with the design's.
func shiftsOf(m *Model, d *Design, f *mat.Dense) (shifts []PoleShift, worst int, err error) {
	if !finite(f) {
		return nil, 0, fmt.Errorf("the rounded A − LC: %w", ErrNotFinite)
	}
	var form schur.Form
	if err := form.Factor(raw(scaled(m, f))); err != nil {
		return nil, 0, fmt.Errorf("eigenvalues of the rounded A − LC: %w", err)
	}
	have := form.Eigenvalues()
	index := poles.Match(d.Reached, have)
	shifts = make([]PoleShift, len(d.Reached))
	for i, from := range d.Reached {
		s := PoleShift{From: from, To: have[index[i]]}
		s.Distance = cmplx.Abs(s.To - from)
		s.Relative = s.Distance / m.poleSize(from)
		shifts[i] = s
		if s.Relative > shifts[worst].Relative {
			worst = i
		}
	}
	return shifts, worst, nil
}
