package poles

import "math"

// usable says whether a pattern of n poles at w rad/s means anything.
func usable(n int, w float64) bool { return n > 0 && w > 0 && !math.IsInf(w, 0) }

// EqualAt returns n poles at −w. It returns nil unless n and w are above zero.
func EqualAt(n int, w float64) []complex128 {
	if !usable(n, w) {
		return nil
	}
	list := make([]complex128, n)
	for i := range list {
		list[i] = complex(-w, 0)
	}
	return list
}

// ButterworthAt returns the n poles of the maximally flat magnitude, −3 dB at w
// rad/s (Butterworth 1930): evenly spread over the left half of the circle of
// radius w. Conjugates are adjacent, a real pole comes last. It returns nil
// unless n and w are above zero.
func ButterworthAt(n int, w float64) []complex128 {
	if !usable(n, w) {
		return nil
	}
	list := make([]complex128, 0, n)
	for k := n % 2; k < n; k += 2 {
		// angle from the negative real axis: half steps for even, whole for odd n
		angle := math.Pi * float64(k+1) / float64(2*n)
		if k < n-1 {
			s, c := math.Sincos(angle)
			list = append(list, complex(-w*c, w*s), complex(-w*c, -w*s))
		}
	}
	if n%2 == 1 {
		list = append(list, complex(-w, 0))
	}
	return list[:n]
}
