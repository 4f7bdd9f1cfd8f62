package estimator

import (
	"errors"
	"math"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator/internal/schur"
)

// solveNoise solves for the covariance P that a noise q leaves, F P + P Fᵀ + q = 0 or
// P = F P Fᵀ + q, with the Schur form of f at hand. Where that form hides the answer
// under entries of very unlike size, it balances f first.
func (d *Designer) solveNoise(f, q *mat.Dense) (*mat.Dense, error) {
	p := mat.NewDense(d.n, d.n, nil)
	err := steady(&d.form, p, q, d.model.Discrete())
	if !errors.Is(err, schur.ErrSingular) {
		return p, err
	}
	scale := balance(f)
	b, s := mat.NewDense(d.n, d.n, nil), mat.NewDense(d.n, d.n, nil)
	b.Apply(func(i, j int, v float64) float64 { return v / scale[i] * scale[j] }, f)
	s.Apply(func(i, j int, v float64) float64 { return v / scale[i] / scale[j] }, q)
	var form schur.Form
	if form.Factor(raw(b)) != nil || steady(&form, p, s, d.model.Discrete()) != nil {
		return nil, err
	}
	p.Apply(func(i, j int, v float64) float64 { return v * scale[i] * scale[j] }, p)
	for i := range d.n {
		if !(p.At(i, i) >= 0) || math.IsInf(p.At(i, i), 0) {
			return nil, err
		}
	}
	return p, nil
}

func steady(form *schur.Form, p, q *mat.Dense, discrete bool) error {
	if discrete {
		return form.Stein(raw(p), raw(q))
	}
	return form.Lyapunov(raw(p), raw(q))
}

// balance returns powers of two s for which the rows and columns of fᵢⱼ sⱼ/sᵢ, without
// the diagonal, are of one size (Osborne 1960).
func balance(f *mat.Dense) []float64 {
	n, _ := f.Dims()
	s := ones(nil, n)
	for range 50 {
		moved := false
		for i := range n {
			var row, col float64
			for j := range n {
				if j != i {
					row = max(row, math.Abs(f.At(i, j))*s[j]/s[i])
					col = max(col, math.Abs(f.At(j, i))*s[i]/s[j])
				}
			}
			if row == 0 || col == 0 || math.IsInf(row, 0) || math.IsInf(col, 0) {
				continue
			}
			by := math.Exp2(math.Round(math.Log2(row/col) / 2))
			if by != 1 && s[i]*by < 1e60 && s[i]*by > 1e-60 {
				s[i] *= by
				moved = true
			}
		}
		if !moved {
			break
		}
	}
	return s
}
