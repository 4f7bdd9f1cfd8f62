package schur

import (
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/lapack"
)

// condition is the workspace of the questions about eigenvectors. All of them
// are answered in Schur coordinates: Z is orthogonal and changes no angle.
type condition struct {
	left, right blas64.General // Dtrevc3's packing: real column, or real and imaginary
	radius      []float64      // see Uncertainty
	group       []int          // index of a group's first eigenvalue
	v           blas64.General // its rows are the vectors whose singular values decide
	work        []float64

	diagonal, above, tauQ, tauP, one []float64 // of the bidiagonal form

	// For a repeated eigenvalue, 2n×2n where it is complex, else n×n.
	wide, wideVT, wideS []float64
	basis               [][]complex128
}

// Uncertainty returns, for every eigenvalue, how far rounding of the entries
// of A can be expected to move it: 10 n ε ‖A‖F / s, where s is the cosine
// between its left and right eigenvectors (Wilkinson, "The Algebraic
// Eigenvalue Problem", 1965, chapter 2). It is +Inf where s vanishes. The
// slice is a view.
func (f *Form) Uncertainty() ([]float64, error) {
	if !f.valid {
		return nil, ErrEmpty
	}
	c := &f.cond
	c.prepare(f.n)
	if f.n == 0 {
		return nil, nil
	}
	c.vectors(f)
	unit := 10 * float64(f.n) * eps * frobenius(f.t)
	for j := 0; j < f.n; j++ {
		x, y := column(c.right, j, f.values[j]), column(c.left, j, f.values[j])
		var inner complex128
		var nx, ny float64
		for i := range f.n {
			u, v := x(i), y(i)
			inner += cmplx.Conj(v) * u
			nx = math.Hypot(nx, cmplx.Abs(u))
			ny = math.Hypot(ny, cmplx.Abs(v))
		}
		c.radius[j] = unit * (nx * ny / cmplx.Abs(inner))
		if imag(f.values[j]) != 0 {
			c.radius[j+1] = c.radius[j]
			j++
		}
	}
	return c.radius, nil
}

// column reads the eigenvector of value, packed from column j of m on.
func column(m blas64.General, j int, value complex128) func(i int) complex128 {
	return func(i int) complex128 {
		if imag(value) == 0 {
			return complex(m.Data[i*m.Stride+j], 0)
		}
		return complex(m.Data[i*m.Stride+j], m.Data[i*m.Stride+j+1])
	}
}

// VectorCondition returns the 2-norm condition number of the matrix of
// unit-length left eigenvectors of A, the eigenvectors of Aᵀ.
//
// Eigenvalues count as one repeated eigenvalue where they lie within 1e-8 of
// the larger's size, or within their own Uncertainty, of each other: the
// second is what tells the split copies of a defective eigenvalue, about
// ε^(1/k) apart, from distinct ones. A repeated eigenvalue contributes an
// orthonormal basis of its eigenspace; where that has fewer dimensions than
// the eigenvalue has copies, A is defective and the answer is +Inf. The
// dimension is the number of singular values of A − λI, at the mean λ, that
// are below 1e-6 of |λ| and of the spread of the copies, or of the rounding
// of A. For n = 0 the answer is 1.
func (f *Form) VectorCondition() (float64, error) {
	if _, err := f.Uncertainty(); err != nil {
		return math.NaN(), err
	}
	if f.n == 0 {
		return 1, nil
	}
	c := &f.cond
	c.collect(f)
	for j, filled := 0, 0; j < f.n; j++ {
		if c.group[j] != j {
			continue
		}
		size, partner := c.membership(f, j)
		switch {
		case partner < j:
			continue // the conjugate group has been dealt with
		case size == 1:
			filled += c.simple(f, j, filled)
		default:
			added, err := c.repeated(f, j, size, partner == j, filled)
			if err != nil {
				return math.NaN(), err
			}
			if added == 0 {
				return math.Inf(1), nil
			}
			filled += added
		}
	}
	return c.ratio(f.n)
}

func (c *condition) prepare(n int) {
	if c.radius != nil && len(c.radius) == n {
		return
	}
	c.left, c.right, c.v = square(n), square(n), square(n)
	c.radius = make([]float64, n)
	c.group = make([]int, n)
	for _, s := range []*[]float64{&c.diagonal, &c.above, &c.tauQ, &c.tauP, &c.one} {
		*s = make([]float64, n)
	}
	c.work = make([]float64, 10*n) // the least for Dgesvd of 2n×2n; Dtrevc3 needs 3n
}

// vectors fills left and right with the eigenvectors of T.
func (c *condition) vectors(f *Form) {
	n := f.n
	impl.Dtrevc3(lapack.EVBoth, lapack.EVAll, nil, n, f.t.Data, n, c.left.Data, n, c.right.Data, n, n, c.work, len(c.work))
}

// collect gives every eigenvalue the index of the first one of its group.
func (c *condition) collect(f *Form) {
	for i := range c.group {
		c.group[i] = i
	}
	for i, a := range f.values {
		for j := range i {
			near := max(1e-8*max(cmplx.Abs(a), cmplx.Abs(f.values[j])), c.radius[i], c.radius[j])
			gi, gj := c.group[i], c.group[j]
			if gi == gj || cmplx.Abs(a-f.values[j]) > near {
				continue
			}
			low, high := min(gi, gj), max(gi, gj)
			for k := range c.group {
				if c.group[k] == high {
					c.group[k] = low
				}
			}
		}
	}
}

// membership returns the size of group g and the group of the conjugates of
// its members: g itself for a real eigenvalue.
func (c *condition) membership(f *Form, g int) (size, partner int) {
	for _, k := range c.group {
		if k == g {
			size++
		}
	}
	switch im := imag(f.values[g]); {
	case im > 0:
		return size, c.group[g+1]
	case im < 0:
		return size, c.group[g-1]
	}
	return size, g
}

// simple writes the left eigenvector of one simple eigenvalue, or of a simple
// pair, to the rows of v from filled on, and returns how many. A pair v, v̄
// becomes √2 Re v, √2 Im v: [v v̄] times a unitary matrix.
func (c *condition) simple(f *Form, j, filled int) int {
	n := f.n
	y := column(c.left, j, f.values[j])
	norm := 0.0
	for i := range n {
		norm = math.Hypot(norm, cmplx.Abs(y(i)))
	}
	if imag(f.values[j]) == 0 {
		for i := range n {
			c.v.Data[filled*n+i] = real(y(i)) / norm
		}
		return 1
	}
	for i := range n {
		c.v.Data[filled*n+i] = math.Sqrt2 * real(y(i)) / norm
		c.v.Data[(filled+1)*n+i] = math.Sqrt2 * imag(y(i)) / norm
	}
	return 2
}

// ratio returns the largest over the least singular value of v, which it
// overwrites: bidiagonal form, then the QR iteration. Asking for one column of
// singular vectors keeps Dbdsqr from a path that allocates.
func (c *condition) ratio(n int) (float64, error) {
	impl.Dgebrd(n, n, c.v.Data, n, c.diagonal, c.above, c.tauQ, c.tauP, c.work, len(c.work))
	clear(c.one)
	if !impl.Dbdsqr(blas.Upper, n, 1, 0, 0, c.diagonal, c.above, c.one, 1, nil, 1, nil, 1, c.work) {
		return math.NaN(), ErrNoConvergence
	}
	return c.diagonal[0] / c.diagonal[n-1], nil
}

func frobenius(m blas64.General) float64 {
	sum := 0.0
	for i := range m.Rows {
		for _, v := range m.Data[i*m.Stride : i*m.Stride+m.Cols] {
			sum = math.Hypot(sum, v)
		}
	}
	return sum
}
