package scenarios

import (
	"math"

	"gonum.org/v1/gonum/mat"
)

// flat is a matrix in one row-major slice.
type flat struct {
	rows, cols int
	a          []float64
}

func newFlat(rows, cols int) flat { return flat{rows, cols, make([]float64, rows*cols)} }

func (f flat) at(i, j int) float64     { return f.a[i*f.cols+j] }
func (f flat) set(i, j int, v float64) { f.a[i*f.cols+j] = v }
func (f flat) row(i int) []float64     { return f.a[i*f.cols : (i+1)*f.cols] }

// put copies a matrix into f with its corner at (i, j); nil is zero.
func (f flat) put(i, j int, m *mat.Dense) {
	if m == nil {
		return
	}
	rows, cols := m.Dims()
	for r := range rows {
		for c := range cols {
			f.set(i+r, j+c, m.At(r, c))
		}
	}
}

// without leaves out the columns from cols on where all of them are zero.
func (f flat) without(cols int) flat {
	for i := range f.rows {
		for _, v := range f.row(i)[cols:] {
			if v != 0 {
				return f
			}
		}
	}
	return subFlat(f, 0, cols)
}

// subFlat copies some columns.
func subFlat(f flat, from, count int) flat {
	out := newFlat(f.rows, count)
	for i := range f.rows {
		copy(out.row(i), f.row(i)[from:])
	}
	return out
}

// root is a lower triangular matrix with root·rootᵀ = s for a covariance s, by
// Cholesky's method. Directions without variance, to 1e-14 of their row's own,
// give a zero column.
func root(s mat.Symmetric) flat {
	n := s.SymmetricDim()
	r := newFlat(n, n)
	for j := range n {
		d := s.At(j, j)
		for k := range j {
			d -= float64(r.at(j, k) * r.at(j, k))
		}
		if d <= 1e-14*s.At(j, j) {
			continue
		}
		d = math.Sqrt(d)
		r.set(j, j, d)
		for i := j + 1; i < n; i++ {
			v := s.At(i, j)
			for k := range j {
				v -= float64(r.at(i, k) * r.at(j, k))
			}
			r.set(i, j, v/d)
		}
	}
	return r
}

// rates returns the smallest and largest size of the eigenvalues of a, those at
// zero left out; zeros where there are none.
func rates(a *mat.Dense) (slow, fast float64) {
	var e mat.Eigen
	if !e.Factorize(a, mat.EigenNone) {
		return 0, 0
	}
	values := e.Values(nil)
	for _, l := range values {
		fast = math.Max(fast, math.Hypot(real(l), imag(l)))
	}
	slow = fast
	for _, l := range values {
		if size := math.Hypot(real(l), imag(l)); size > 1e-9*fast {
			slow = math.Min(slow, size)
		}
	}
	return slow, fast
}
