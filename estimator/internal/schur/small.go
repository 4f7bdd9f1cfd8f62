package schur

import (
	"math"

	"gonum.org/v1/gonum/blas/blas64"
)

// small is the linear system of one block of the unknown, 1×1 to 2×2: at most
// four equations. Unknown (i, j) has the place 2i + j; places not used keep an
// equation of their own with the solution 0.
type small struct {
	m    [4][4]float64
	rhs  [4]float64
	list [4]int
	size int
	// tiny is the size at or below which a pivot counts as zero.
	tiny float64
}

// set adds unknown (i, j), with v on its right side.
func (s *small) set(i, j int, v float64) {
	k := 2*i + j
	s.rhs[k] = v
	s.list[s.size] = k
	s.size++
}

func (s *small) get(i, j int) float64 { return s.rhs[2*i+j] }

// symmetrise averages the off-diagonal entries of a solved diagonal block. The
// difference is rounding that the equation does not see, but that the columns
// to come would take for part of the solution.
func (s *small) symmetrise() {
	if s.size == 4 {
		v := s.rhs[1]/2 + s.rhs[2]/2
		s.rhs[1], s.rhs[2] = v, v
	}
}

// lyapunov fills in the operator X → T₁ X + X T₂ᵀ of the diagonal blocks
// T₁ = top..bottom and T₂ = first..last. A pivot counts as zero where it is
// below the rounding of the whole of t: ε size, with size n times its largest
// entry.
func (s *small) lyapunov(t blas64.General, top, bottom, first, last int, size float64) {
	n := t.Stride
	s.tiny = eps * size
	for i := top; i <= bottom; i++ {
		for j := first; j <= last; j++ {
			row := &s.m[2*(i-top)+j-first]
			for k := top; k <= bottom; k++ {
				row[2*(k-top)+j-first] += t.Data[i*n+k]
			}
			for k := first; k <= last; k++ {
				row[2*(i-top)+k-first] += t.Data[j*n+k]
			}
		}
	}
}

// stein fills in the operator X → X − T₁ X T₂ᵀ. A pivot counts as zero where
// it is below the rounding of the operator's own entries.
func (s *small) stein(t blas64.General, top, bottom, first, last int) {
	n := t.Stride
	size := 1.0
	for i := top; i <= bottom; i++ {
		for j := first; j <= last; j++ {
			here := 2*(i-top) + j - first
			row := &s.m[here]
			for k := top; k <= bottom; k++ {
				for l := first; l <= last; l++ {
					v := t.Data[i*n+k] * t.Data[j*n+l]
					row[2*(k-top)+l-first] -= v
					size = max(size, math.Abs(v))
				}
			}
			row[here]++
		}
	}
	s.tiny = 2 * eps * size
}

// solve overwrites rhs with the solution, by elimination with complete
// pivoting. A pivot at or below tiny ends it with false.
func (s *small) solve() bool {
	if s.size == 1 {
		k := s.list[0]
		if !(math.Abs(s.m[k][k]) > s.tiny) {
			return false
		}
		s.rhs[k] /= s.m[k][k]
		return true
	}
	var cols [4]int
	copy(cols[:], s.list[:])
	rows := cols
	for step := range s.size {
		p, q, best := step, step, -1.0
		for i := step; i < s.size; i++ {
			for j := step; j < s.size; j++ {
				if v := math.Abs(s.m[rows[i]][cols[j]]); v > best {
					p, q, best = i, j, v
				}
			}
		}
		if !(best > s.tiny) {
			return false
		}
		rows[step], rows[p] = rows[p], rows[step]
		cols[step], cols[q] = cols[q], cols[step]
		pivot := &s.m[rows[step]]
		for i := step + 1; i < s.size; i++ {
			row := &s.m[rows[i]]
			factor := row[cols[step]] / pivot[cols[step]]
			if factor == 0 {
				continue
			}
			for j := step + 1; j < s.size; j++ {
				row[cols[j]] -= factor * pivot[cols[j]]
			}
			s.rhs[rows[i]] -= factor * s.rhs[rows[step]]
		}
	}
	var out [4]float64
	for step := s.size - 1; step >= 0; step-- {
		row := &s.m[rows[step]]
		sum := s.rhs[rows[step]]
		for j := step + 1; j < s.size; j++ {
			sum -= row[cols[j]] * out[cols[j]]
		}
		out[cols[step]] = sum / row[cols[step]]
	}
	s.rhs = out
	return true
}
