// Package frequency finds the figures of a linear system over all frequencies:
// largest gains and the margins of a control loop. Frequencies are in rad/s.
package frequency

import (
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/blas/blas64"
)

// System is a state-space model: x' = A x + B u, w = C x + D u in continuous
// time (Period 0), else with the next sample in place of the derivative. A is
// n×n, B n×m, C p×n, D p×m; a D without rows is zero.
type System struct {
	A, B, C, D blas64.General
	Period     float64
}

var (
	// ErrShape is returned where the matrices do not fit each other.
	ErrShape = errors.New("frequency: the matrices do not fit each other")
	// ErrNotFinite is returned for NaN, infinities, a bad period, and where
	// numbers beyond 1e120 come up.
	ErrNotFinite = errors.New("frequency: a value is not finite")
	// ErrUnstable is returned where the system (or the closed loop) has an
	// eigenvalue on or beyond the stability limit.
	ErrUnstable = errors.New("frequency: not asymptotically stable")
	// ErrSingular is returned where an algebraic loop has no solution.
	ErrSingular = errors.New("frequency: the direct feedthrough closes an algebraic loop that has no answer")
	// ErrNoConvergence is returned where an eigenvalue iteration gives up.
	ErrNoConvergence = errors.New("frequency: the eigenvalue iteration did not converge")
)

// dense is a matrix without padding.
type dense struct {
	r, c int
	v    []float64
}

func newDense(r, c int) dense { return dense{r, c, make([]float64, r*c)} }

func (m dense) row(i int) []float64 { return m.v[i*m.c : (i+1)*m.c] }

func (m dense) clone() dense {
	return dense{m.r, m.c, append([]float64(nil), m.v...)}
}

// addProduct adds factor·a·b to m.
func (m dense) addProduct(factor float64, a, b dense) {
	for i := range a.r {
		row := m.row(i)
		for l, v := range a.row(i) {
			if v *= factor; v != 0 {
				for k, w := range b.row(l) {
					row[k] += v * w
				}
			}
		}
	}
}

func (m dense) largest() (most float64) {
	for _, v := range m.v {
		most = max(most, math.Abs(v))
	}
	return most
}

// model is a System in continuous time. For a sampled one it is its image under
// s = (z − 1)/(z + 1), which has the same response at ν = tan(ω·period/2).
type model struct {
	n          int
	a, b, c, d dense
	period     float64
}

// rad turns a frequency of the model into rad/s.
func (m *model) rad(nu float64) float64 {
	if m.period > 0 {
		return 2 * math.Atan(nu) / m.period
	}
	return nu
}

// read checks a System and copies it.
func read(sys System) (*model, error) {
	n, in, out := sys.A.Rows, sys.B.Cols, sys.C.Rows
	if sys.D.Rows == 0 {
		sys.D = blas64.General{Rows: out, Cols: in, Stride: max(1, in), Data: make([]float64, out*in)}
	}
	if n == 0 || in == 0 || out == 0 {
		return nil, fmt.Errorf("%w: %d states, %d inputs, %d outputs", ErrShape, n, in, out)
	}
	if !(sys.Period >= 0) || math.IsInf(sys.Period, 0) {
		return nil, fmt.Errorf("%w: period %v", ErrNotFinite, sys.Period)
	}
	m := &model{n: n, period: sys.Period}
	for _, part := range []struct {
		dst        *dense
		src        blas64.General
		rows, cols int
		name       string
	}{{&m.a, sys.A, n, n, "A"}, {&m.b, sys.B, n, in, "B"}, {&m.c, sys.C, out, n, "C"}, {&m.d, sys.D, out, in, "D"}} {
		s := part.src
		if s.Rows != part.rows || s.Cols != part.cols || s.Stride < s.Cols || len(s.Data) < (s.Rows-1)*s.Stride+s.Cols {
			return nil, fmt.Errorf("%w: %s is %d×%d, expected %d×%d", ErrShape, part.name, s.Rows, s.Cols, part.rows, part.cols)
		}
		*part.dst = newDense(s.Rows, s.Cols)
		for i := range s.Rows {
			copy(part.dst.row(i), s.Data[i*s.Stride:i*s.Stride+s.Cols])
		}
		for _, v := range part.dst.v {
			if math.IsNaN(v) || math.IsInf(v, 0) {
				return nil, fmt.Errorf("%w: in %s", ErrNotFinite, part.name)
			}
		}
	}
	return m, nil
}

// closed returns the complementary sensitivity T = L (I + L)⁻¹ of a square loop:
// with E = (I + D)⁻¹ it is (A − B E C, B E, E C, D E).
func (m *model) closed() (*model, error) {
	k := m.b.c
	if m.c.r != k {
		return nil, fmt.Errorf("%w: a loop with %d inputs and %d outputs", ErrShape, k, m.c.r)
	}
	one := m.d.clone()
	for i := range k {
		one.v[i*k+i]++
	}
	e := newDense(k, k)
	for i := range k {
		e.v[i*k+i] = 1
	}
	if !solve(one, e) {
		return nil, ErrSingular
	}
	t := &model{n: m.n, period: m.period, a: m.a.clone(), b: newDense(m.n, k), c: newDense(k, m.n), d: newDense(k, k)}
	t.b.addProduct(1, m.b, e)
	t.c.addProduct(1, e, m.c)
	t.d.addProduct(1, m.d, e)
	t.a.addProduct(-1, t.b, m.c)
	return t, nil
}

// sensitivity turns T into S = I − T.
func (m *model) sensitivity() *model {
	s := &model{n: m.n, period: m.period, a: m.a, b: m.b, c: m.c.clone(), d: m.d.clone()}
	for i := range s.c.v {
		s.c.v[i] = -s.c.v[i]
	}
	for i := range s.d.v {
		s.d.v[i] = -s.d.v[i]
	}
	for i := range s.d.r {
		s.d.v[i*s.d.c+i]++
	}
	return s
}

// toContinuous replaces a sampled model by its image under s = (z − 1)/(z + 1):
// with W = (A + I)⁻¹ it is (W (A − I), √2 W B, √2 C W, D − C W B).
func (m *model) toContinuous() error {
	if m.period == 0 {
		return nil
	}
	n := m.n
	plus := m.a.clone()
	for i := range n {
		plus.v[i*n+i]++
	}
	w := newDense(n, n)
	for i := range n {
		w.v[i*n+i] = 1
	}
	if !solve(plus, w) {
		return ErrUnstable // an eigenvalue at −1
	}
	wb, cw := newDense(n, m.b.c), newDense(m.c.r, n)
	wb.addProduct(1, w, m.b)
	cw.addProduct(1, m.c, w)
	m.d.addProduct(-1, m.c, wb)
	for i := range w.v { // W (A − I) = I − 2 W
		w.v[i] *= -2
	}
	for i := range n {
		w.v[i*n+i]++
	}
	for _, x := range []dense{wb, cw} {
		for i := range x.v {
			x.v[i] *= math.Sqrt2
		}
	}
	m.a, m.b, m.c = w, wb, cw
	return nil
}

// solve replaces x by a⁻¹ x, by elimination with row pivots; a is overwritten.
// It returns false where a is singular to working precision.
func solve(a, x dense) bool {
	n := a.r
	tiny := 1e-300 + 1e-15*a.largest()
	for k := range n {
		p := k
		for i := k + 1; i < n; i++ {
			if math.Abs(a.v[i*n+k]) > math.Abs(a.v[p*n+k]) {
				p = i
			}
		}
		if math.Abs(a.v[p*n+k]) <= tiny {
			return false
		}
		if p != k {
			swap(a.row(p), a.row(k))
			swap(x.row(p), x.row(k))
		}
		for i := k + 1; i < n; i++ {
			f := a.v[i*n+k] / a.v[k*n+k]
			if f == 0 {
				continue
			}
			for j := k + 1; j < n; j++ {
				a.v[i*n+j] -= f * a.v[k*n+j]
			}
			for j, v := range x.row(k) {
				x.row(i)[j] -= f * v
			}
		}
	}
	for k := n - 1; k >= 0; k-- {
		row := x.row(k)
		for j := range row {
			row[j] /= a.v[k*n+k]
		}
		for i := range k {
			f := a.v[i*n+k]
			for j, v := range row {
				x.row(i)[j] -= f * v
			}
		}
	}
	return true
}

func swap(a, b []float64) {
	for i := range a {
		a[i], b[i] = b[i], a[i]
	}
}
