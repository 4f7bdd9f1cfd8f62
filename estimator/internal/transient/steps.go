package transient

import (
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
)

// multiply sets c = a·b + add·c for matrices of the form of F, without padding.
func (s *Solver) multiply(c, a, b []float64, add float64) {
	n := s.n
	if n > 8 && s.first[n-1] == 0 {
		blas64.Gemm(blas.NoTrans, blas.NoTrans, 1, general(n, a), general(n, b), add, general(n, c))
		return
	}
	for i := range n {
		row := c[i*n : i*n+n]
		if add == 0 {
			clear(row)
		} else if add != 1 {
			for k := range row {
				row[k] *= add
			}
		}
		for l := s.first[i]; l < n; l++ {
			v, from := a[i*n+l], s.first[l]
			other, part := b[l*n+from:l*n+n], row[from:]
			part = part[:len(other)]
			for k, w := range other {
				part[k] += v * w
			}
		}
	}
}

func general(n int, data []float64) blas64.General {
	return blas64.General{Rows: n, Cols: n, Stride: n, Data: data}
}

// advance sets dst = x + E_j x.
func (s *Solver) advance(dst, x []float64, j int) {
	copy(dst, x)
	s.multiply(dst, s.steps[j], x, 1)
}

func frobenius(x []float64) float64 {
	var sum float64
	for _, v := range x {
		sum += v * v
	}
	return math.Sqrt(sum)
}

// prepare chooses h and fills the steps up to one that leaves less than 1e-3.
// It fails with ErrUnstable where no step is that long.
func (s *Solver) prepare(f blas64.General, period float64) (h float64, err error) {
	n := s.n
	e := s.step(0)
	for i := range n {
		copy(e[i*n:i*n+n], f.Data[i*f.Stride:i*f.Stride+n])
	}
	size := frobenius(e)
	switch {
	case math.IsInf(size, 0):
		return 0, ErrNotFinite
	case s.discrete:
		h = period
		for i := range n {
			e[i*n+i]--
		}
	case size == 0:
		return 0, ErrUnstable
	default:
		h = 1 / (128 * size)
		if h == 0 || math.IsInf(h, 0) {
			return 0, ErrNotFinite
		}
		s.exponential(h)
	}
	for j := 0; j < levels; j++ {
		e := s.step(j)
		left := s.identityPlus(e)
		if left < 1e-3 {
			return h, nil
		}
		if !(left < 1e100) {
			return 0, ErrUnstable
		}
		next := s.step(j + 1)
		for i, v := range e {
			next[i] = 2 * v
		}
		s.multiply(next, e, e, 1)
	}
	return 0, ErrUnstable
}

// identityPlus returns the Frobenius norm of I + E.
func (s *Solver) identityPlus(e []float64) float64 {
	var sum float64
	for i := range s.n {
		for j, v := range e[i*s.n : i*s.n+s.n] {
			if i == j {
				v++
			}
			sum += v * v
		}
	}
	return math.Sqrt(sum)
}

// exponential replaces E_0 = F by exp(F·h) − I. The norm of F·h is 1/128, so
// that the terms up to the eighth reach full precision.
func (s *Solver) exponential(h float64) {
	f, sum := s.at, s.step(0)
	for i, v := range sum {
		f[i] = v * h
	}
	// F (I + F/2 (I + F/3 (…)))
	copy(sum, f)
	for k := 8; k >= 2; k-- {
		for i := range sum {
			sum[i] /= float64(k)
		}
		copy(s.next, f)
		s.multiply(s.next, f, sum, 1)
		copy(sum, s.next)
	}
}
