// Package schur holds the real Schur form of a square matrix and what follows
// from it: eigenvalues, the solutions of Lyapunov and Stein equations, and the
// conditioning of the eigenvectors.
//
// The equations are solved as in Bartels & Stewart, "Solution of the matrix
// equation AX + XB = C", Comm. ACM 15 (1972), and Kitagawa, "An algorithm for
// solving the matrix equation X = FXF' + S", Int. J. Control 25 (1977): turn to
// the Schur coordinates, where A is triangular but for 2×2 blocks, and take the
// unknown block column by block column.
package schur

import (
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/lapack/gonum"
)

var (
	// ErrSingular tells that two eigenvalues meet in the way that leaves the
	// equation without a unique solution.
	ErrSingular = errors.New("the equation has no unique solution")
	// ErrNoConvergence tells that the QR iteration gave up.
	ErrNoConvergence = errors.New("the eigenvalue iteration did not converge")
	// ErrNotFinite tells that the matrix holds a NaN or an infinity.
	ErrNotFinite = errors.New("the matrix is not finite")
	// ErrShape tells that a matrix does not have the wanted size.
	ErrShape = errors.New("the matrix has the wrong shape")
	// ErrEmpty tells that nothing has been factored yet.
	ErrEmpty = errors.New("no matrix has been factored")
)

const eps = 0x1p-52

var impl gonum.Implementation

// Form is the real Schur form A = Z T Zᵀ of an n×n matrix: Z orthogonal, T
// upper triangular but for standardised 2×2 blocks (equal diagonal entries,
// off-diagonal entries of opposite sign) that hold the complex pairs.
//
// The zero value is ready for use. A Form owns its workspace and keeps it from
// one matrix of a size to the next; what its methods return is overwritten by
// the next Factor. It serves one goroutine at a time.
type Form struct {
	n      int
	valid  bool
	values []complex128

	t, z   blas64.General
	wr, wi []float64
	tau    []float64
	work   []float64

	eq   equation
	cond condition
}

// Factor computes the Schur form of the n×n matrix a, which is left as it is.
// After an error the Form holds nothing.
func (f *Form) Factor(a blas64.General) error {
	f.valid = false
	if err := check(a, a.Rows); err != nil {
		return err
	}
	f.reset(a.Rows)
	n := f.n
	if n == 0 {
		f.valid = true
		return nil
	}
	size := largest(a)
	if math.IsNaN(size) || math.IsInf(size, 0) {
		return ErrNotFinite
	}
	shift := exponent(size)
	for i := range n {
		for j := range n {
			f.t.Data[i*n+j] = math.Ldexp(a.Data[i*a.Stride+j], -shift)
		}
	}
	if !f.reduce() {
		return ErrNoConvergence
	}
	if shift != 0 {
		for i := range f.t.Data {
			f.t.Data[i] = math.Ldexp(f.t.Data[i], shift)
		}
	}
	for i := range n {
		f.values[i] = complex(math.Ldexp(f.wr[i], shift), math.Ldexp(f.wi[i], shift))
	}
	f.valid = true
	return nil
}

// reduce turns the matrix in f.t to Schur form, with Z in f.z.
func (f *Form) reduce() bool {
	n := f.n
	impl.Dgehrd(n, 0, n-1, f.t.Data, n, f.tau, f.work, len(f.work))
	copy(f.z.Data, f.t.Data)
	impl.Dorghr(n, 0, n-1, f.z.Data, n, f.tau, f.work, len(f.work))
	for i := 2; i < n; i++ {
		clear(f.t.Data[i*n : i*n+i-1])
	}
	return f.francis()
}

// reset sizes the workspace.
func (f *Form) reset(n int) {
	if n == f.n && f.work != nil {
		return
	}
	f.n = n
	f.values = make([]complex128, n)
	f.t, f.z = square(n), square(n)
	f.wr, f.wi = make([]float64, n), make([]float64, n)
	f.tau = make([]float64, max(n-1, 0))
	f.eq, f.cond = equation{}, condition{}
	if n == 0 {
		f.work = make([]float64, 1)
		return
	}
	var need [1]float64
	length := n
	impl.Dgehrd(n, 0, n-1, f.t.Data, n, f.tau, need[:], -1)
	length = max(length, int(need[0]))
	impl.Dorghr(n, 0, n-1, f.z.Data, n, f.tau, need[:], -1)
	length = max(length, int(need[0]))
	f.work = make([]float64, max(length, int(need[0])))
}

// Eigenvalues returns the n eigenvalues in the order of the diagonal of T,
// complex pairs side by side with the positive imaginary part first. It is a
// view; nil where nothing is factored.
func (f *Form) Eigenvalues() []complex128 {
	if !f.valid {
		return nil
	}
	return f.values
}

// T returns a view of the n×n quasi-triangular factor.
func (f *Form) T() blas64.General {
	if !f.valid {
		return blas64.General{}
	}
	return f.t
}

// Z returns a view of the n×n orthogonal factor.
func (f *Form) Z() blas64.General {
	if !f.valid {
		return blas64.General{}
	}
	return f.z
}

func square(n int) blas64.General {
	return blas64.General{Rows: n, Cols: n, Stride: max(n, 1), Data: make([]float64, n*n)}
}

// check tells whether m is a well-formed n×n matrix.
func check(m blas64.General, n int) error {
	if m.Rows != n || m.Cols != n || n < 0 {
		return fmt.Errorf("%w: %d×%d instead of %d×%d", ErrShape, m.Rows, m.Cols, n, n)
	}
	if n > 0 && (m.Stride < n || len(m.Data) < (n-1)*m.Stride+n) {
		return fmt.Errorf("%w: its data are too short", ErrShape)
	}
	return nil
}

// largest returns the largest magnitude in m, NaN where m holds one.
func largest(m blas64.General) float64 {
	size := 0.0
	for i := range m.Rows {
		for _, v := range m.Data[i*m.Stride : i*m.Stride+m.Cols] {
			if math.IsNaN(v) {
				return v
			}
			size = max(size, math.Abs(v))
		}
	}
	return size
}

// exponent returns the power of two to divide by where the squares of size
// would overflow or vanish, else 0.
func exponent(size float64) int {
	if size == 0 || size > 1e-120 && size < 1e120 {
		return 0
	}
	_, e := math.Frexp(size)
	return e
}
