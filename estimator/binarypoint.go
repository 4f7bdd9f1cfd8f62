package estimator

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// Point is the binary point of a fixed-point word in two's complement: Integer
// bits before it, Fraction bits after it and a sign bit, Qm.n for short. Its
// values are the whole multiples of 2^−Fraction from −2^Integer to
// 2^Integer − 2^−Fraction. Either number may be negative: the word is then all
// above, or all below, the point.
type Point struct{ Integer, Fraction int }

// Bits is the length of the word.
func (q Point) Bits() int { return 1 + q.Integer + q.Fraction }

func (q Point) String() string { return fmt.Sprintf("Q%d.%d", q.Integer, q.Fraction) }

// Step is the distance between neighbouring values.
func (q Point) Step() float64 { return math.Ldexp(1, -q.Fraction) }

// Round returns the nearest value of the format, halves to even, and whether v is
// in its range; where it is not, the nearest end. A word of more than 53 bits
// holds values that a float64 does not: those are never asked for here, since v
// is one. NaN stays NaN and is not in range.
func (q Point) Round(v float64) (rounded float64, fits bool) {
	if math.IsNaN(v) {
		return v, false
	}
	low, end := -math.Ldexp(1, q.Integer), math.Ldexp(1, q.Integer)
	if v >= low && v < end {
		// Scaling by a power of two is exact, and so is rounding to a whole number.
		r := math.Ldexp(math.RoundToEven(math.Ldexp(v, q.Fraction)), -q.Fraction)
		if r < end {
			return r, true
		}
	}
	if v < low {
		return low, v >= low-q.Step()/2
	}
	top := end - q.Step()
	if top == end { // more bits than a float64 has
		top = math.Nextafter(end, 0)
	}
	return top, false
}

// pointFor gives a word of that many bits the fewest integer bits that hold every
// value once it is rounded. All zeros need none.
func pointFor(bits int, values ...float64) Point {
	largest := 0.0
	for _, v := range values {
		largest = max(largest, math.Abs(v))
	}
	_, exponent := math.Frexp(largest)
	if largest == 0 {
		exponent = 1
	}
	for q := (Point{exponent - 1, bits - exponent}); ; q = (Point{q.Integer + 1, q.Fraction - 1}) {
		all := true
		for _, v := range values {
			_, fits := q.Round(v)
			all = all && fits
		}
		if all || q.Integer > exponent {
			return q
		}
	}
}

// rounded returns the matrix in words with this point, and how many entries other
// than 0 became 0. A nil matrix stays nil.
func (q Point) rounded(m *mat.Dense) (out *mat.Dense, lost int) {
	if m == nil {
		return nil, 0
	}
	out = mat.DenseCopyOf(m)
	out.Apply(func(_, _ int, v float64) float64 {
		r, _ := q.Round(v)
		if r == 0 && v != 0 {
			lost++
		}
		return r
	}, out)
	return out, lost
}

// entries lists the numbers of several matrices, any of them nil.
func entries(list ...*mat.Dense) []float64 {
	var out []float64
	for _, m := range list {
		if m == nil {
			continue
		}
		rows, _ := m.Dims()
		for i := range rows {
			out = append(out, m.RawRowView(i)...)
		}
	}
	return out
}
