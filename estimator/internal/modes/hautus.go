package modes

import (
	"math/cmplx"
	"slices"

	"gonum.org/v1/gonum/mat"
)

func eigenvalues(a *mat.Dense) ([]complex128, error) {
	var eig mat.Eigen
	if !eig.Factorize(a, mat.EigenNone) {
		return nil, ErrNoConvergence
	}
	return eig.Values(nil), nil
}

// hautus returns the smallest singular value of [A − λI; C]. For complex λ = α + iβ
// the real matrix [A−αI, βI; −βI, A−αI; C, 0; 0, C] has the same singular values,
// each twice.
func hautus(a, c *mat.Dense, lambda complex128) (float64, error) {
	n, _ := a.Dims()
	p, _ := c.Dims()
	re, im := real(lambda), imag(lambda)
	copies := 1
	if im != 0 {
		copies = 2
	}
	m := mat.NewDense(copies*(n+p), copies*n, nil)
	for k := range copies {
		m.Slice(k*n, (k+1)*n, k*n, (k+1)*n).(*mat.Dense).Copy(a)
		row := copies*n + k*p
		m.Slice(row, row+p, k*n, (k+1)*n).(*mat.Dense).Copy(c)
	}
	for i := range copies * n {
		m.Set(i, i, m.At(i, i)-re)
	}
	if copies == 2 {
		for i := range n {
			m.Set(i, n+i, im)
			m.Set(n+i, i, -im)
		}
	}
	var svd mat.SVD
	if !svd.Factorize(m, mat.SVDNone) {
		return 0, ErrNoConvergence
	}
	values := svd.Values(nil)
	return values[len(values)-1], nil
}

// visible marks the eigenvalues that are left when every fixed one has been
// matched, closest pairs first.
func visible(values, fixed []complex128) []bool {
	seen := make([]bool, len(values))
	for i := range seen {
		seen[i] = true
	}
	type match struct {
		value, fixed int
		distance     float64
	}
	var all []match
	for j, f := range fixed {
		for i, v := range values {
			all = append(all, match{i, j, cmplx.Abs(v - f)})
		}
	}
	slices.SortStableFunc(all, func(a, b match) int {
		switch {
		case a.distance < b.distance:
			return -1
		case a.distance > b.distance:
			return 1
		}
		return 0
	})
	done := make([]bool, len(fixed))
	for _, m := range all {
		if seen[m.value] && !done[m.fixed] {
			seen[m.value], done[m.fixed] = false, true
		}
	}
	return seen
}
