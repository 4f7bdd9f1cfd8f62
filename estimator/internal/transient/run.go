package transient

import "math"

// run walks from time 0 until the error can never be above Level again.
func (s *Solver) run() error {
	n := s.n
	clear(s.at)
	for i := range n {
		s.at[i*n+i] = 1
	}
	s.peak, s.last, s.fraction = 1, 0, 0
	top := len(s.steps) - 1
	var k int64
	largest := math.Sqrt(float64(n)) // of the Frobenius norm, which is submultiplicative
	j, a := 0, s.place(s.at)
	if !s.discrete { // F bends little over 8 h = 1/(16 ‖F‖)
		j = min(3, top)
	}
	for count := 0; ; count++ {
		size := frobenius(s.at)
		if math.IsNaN(size) || math.IsInf(size, 0) {
			return ErrUnstable
		}
		largest = max(largest, size)
		bound := largest
		if len(s.keep) == n { // the peak is that of the whole, which is submultiplicative too
			bound = min(bound, s.peak*(1+1e-3))
		}
		if size*bound <= Level {
			return nil
		}
		if count > most {
			return s.jump(k, j, largest)
		}
		var bend float64
		for {
			s.advanceWhole(j)
			if j == 0 {
				break
			}
			bend = s.bend(s.at, s.mids[j], s.next, nil)
			if bend <= smooth*max(size, frobenius(s.next)) {
				break
			}
			j--
		}
		b := s.place(s.next)
		s.examine(j, k, &a, &b)
		k += int64(1) << j
		s.at, s.next, a = s.next, s.at, b
		if j < top && (j == 0 || bend <= smooth/5*size) {
			j++
		}
	}
}

// advanceWhole sets next = Φ(2ʲh)·at by way of its middle, kept at level j.
func (s *Solver) advanceWhole(j int) {
	if j == 0 {
		s.advance(s.next, s.at, 0)
		return
	}
	m := s.mid(j)
	s.advance(m, s.at, j-1)
	s.advance(s.next, m, j-1)
}

// bend is the Frobenius norm of the second difference a − 2 m + b, over the kept
// rows and columns where they are given.
func (s *Solver) bend(a, m, b []float64, keep []int) float64 {
	var sum float64
	if keep == nil {
		for i, v := range m {
			d := a[i] - 2*v + b[i]
			sum += d * d
		}
		return math.Sqrt(sum)
	}
	for _, r := range keep {
		for _, c := range keep {
			i := r*s.n + c
			d := a[i] - 2*m[i] + b[i]
			sum += d * d
		}
	}
	return math.Sqrt(sum)
}

// kept is the Frobenius norm of what is kept: an upper bound of its 2-norm.
func (s *Solver) kept(x []float64) float64 {
	if len(s.keep) == s.n {
		return frobenius(x)
	}
	var sum float64
	for _, r := range s.keep {
		for _, c := range s.keep {
			v := x[r*s.n+c]
			sum += v * v
		}
	}
	return math.Sqrt(sum)
}

// place is Φ at one time, with what is known of its norm.
type place struct {
	x     []float64
	upper float64 // Frobenius norm of what is kept
	exact float64 // 2-norm, negative while unknown
}

func (s *Solver) place(x []float64) place { return place{x: x, upper: s.kept(x), exact: -1} }

func (s *Solver) norm(p *place) float64 {
	if p.exact < 0 {
		p.exact = s.gram.norm(s.n, p.x, s.keep, s.first)
		s.peak = max(s.peak, p.exact)
	}
	return p.exact
}

// examine looks at the interval of 2ʲ steps from k to the place b, with its
// middle at level j. It raises the peak and the last time above Level.
func (s *Solver) examine(j int, k int64, a, b *place) {
	end := k + int64(1)<<j
	if j == 0 {
		s.examineUnit(k, a, b)
		return
	}
	m := s.place(s.mids[j])
	bend := s.bend(a.x, m.x, b.x, s.keep)
	bound := max(a.upper, b.upper, m.upper) + bend
	if bound <= s.peak && (bound <= Level || s.surelyAbove(b.upper)) {
		if bound > Level {
			s.last, s.fraction = end, 0
		}
		return
	}
	na, nb := s.norm(a), s.norm(b)
	if nb > Level {
		s.last, s.fraction = end, 0
	}
	// the middle is at most (na + nb + bend)/2
	if above := max(na, nb) + bend; above <= s.peak*(1+tolerance) && (nb > Level || above <= Level) {
		return
	}
	nm := s.norm(&m)
	top := max(na, nm, nb)
	above := top + bend/2 // four times what a parabola would reach
	forPeak := above > s.peak*(1+tolerance)
	if forPeak && !s.discrete && bend <= fine*top {
		s.peak = max(s.peak, vertex(na, nm, nb))
		forPeak = false
	}
	forLast := nb <= Level && above > Level
	if forLast && !s.discrete && na > Level && bend <= fine*Level {
		s.cross(j, k, na, nm, nb)
		forLast = false
	}
	if !forPeak && !forLast {
		return
	}
	// the later half first: what it finds makes the earlier one needless
	s.examineHalf(j-1, k+int64(1)<<(j-1), &m, b, forPeak)
	s.examineHalf(j-1, k, a, &m, forPeak)
}

func (s *Solver) examineHalf(j int, k int64, a, b *place, forPeak bool) {
	if !forPeak && s.last > k+int64(1)<<j {
		return
	}
	last, fraction := s.last, s.fraction
	if j > 0 {
		s.advance(s.mid(j), a.x, j-1)
	}
	s.examine(j, k, a, b)
	if last > s.last || last == s.last && fraction > s.fraction {
		// an earlier interval never takes back a later one
		s.last, s.fraction = last, fraction
	}
}

// vertex is the largest value of the parabola through three equidistant places.
func vertex(a, m, b float64) float64 {
	top := max(a, m, b)
	if curve := a - 2*m + b; curve < 0 && math.Abs(a-b) <= -2*curve {
		return max(top, m-(a-b)*(a-b)/(8*curve))
	}
	return top
}

// cross places the fall to Level within an interval that bends little, by a
// parabola through the logarithms.
func (s *Solver) cross(j int, k int64, a, m, b float64) {
	const small = 1e-30
	la, lm, lb := math.Log(a/Level), math.Log(max(m, small)/Level), math.Log(max(b, small)/Level)
	slope, curve := (lb-la)/2, (lb-2*lm+la)/2
	value := func(x float64) float64 { return lm + x*(slope+x*curve) }
	low, high := -1.0, 1.0 // in halves of the interval, from its middle
	for range 50 {
		if x := (low + high) / 2; value(x) > 0 {
			low = x
		} else {
			high = x
		}
	}
	s.last, s.fraction = k, (1+low)/2*float64(int64(1)<<j)
}

// examineUnit is examine for one step.
func (s *Solver) examineUnit(k int64, a, b *place) {
	if max(a.upper, b.upper) <= min(s.peak, Level) {
		return
	}
	if b.upper <= s.peak && s.surelyAbove(b.upper) {
		s.last, s.fraction = k+1, 0
		return
	}
	nb := s.norm(b)
	if nb > Level {
		s.last, s.fraction = k+1, 0
		return
	}
	if na := s.norm(a); na > Level {
		s.last, s.fraction = k, 0
		if !s.discrete {
			s.fraction = 1
			if nb > 0 && nb < Level {
				s.fraction = math.Log(na/Level) / math.Log(na/nb)
			}
		}
	}
}

// surelyAbove says whether a Frobenius norm leaves no doubt that the 2-norm is
// above Level.
func (s *Solver) surelyAbove(f float64) bool {
	return f > Level*math.Sqrt(float64(len(s.keep)))
}

// jump finds the last time above Level by bisection on windows of 64 steps from
// k on, where walking there would take too long.
func (s *Solver) jump(k int64, j int, largest float64) error {
	width := int64(64) << j
	low, high := k, k
	for span := width; ; span *= 2 {
		if span > 1<<61 {
			return ErrUnstable
		}
		high = k + span
		s.moveTo(high)
		if frobenius(s.at)*largest <= Level {
			break
		}
	}
	for high-low > width && float64(high-low) > tolerance/4*float64(high) {
		middle := low + (high-low)/2
		before := s.last
		s.window(middle, j)
		if s.last > before {
			low = middle
		} else {
			high = middle
		}
	}
	s.window(low, j)
	return nil
}

// moveTo sets at = Φ(k·h).
func (s *Solver) moveTo(k int64) {
	n := s.n
	clear(s.at)
	for i := range n {
		s.at[i*n+i] = 1
	}
	for top := len(s.steps) - 1; k > int64(1)<<top; k -= int64(1) << top {
		if frobenius(s.at) == 0 {
			return
		}
		s.advance(s.next, s.at, top)
		s.at, s.next = s.next, s.at
	}
	for j := 0; k>>j != 0; j++ {
		if k>>j&1 == 1 {
			s.advance(s.next, s.at, j)
			s.at, s.next = s.next, s.at
		}
	}
}

// window examines 64 intervals of level j from k on.
func (s *Solver) window(k int64, j int) {
	s.moveTo(k)
	a := s.place(s.at)
	for range 64 {
		s.advanceWhole(j)
		b := s.place(s.next)
		s.examine(j, k, &a, &b)
		k += int64(1) << j
		s.at, s.next, a = s.next, s.at, b
	}
}
