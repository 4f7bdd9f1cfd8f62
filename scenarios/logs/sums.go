package logs

import "math"

// lags is how many lags of autocorrelation are kept.
const lags = 20

// blockSize bounds how many terms one plain sum takes before it goes into a
// compensated total: the error of a sum stays below blockSize·ε of the sum of
// sizes, however long the log.
const blockSize = 4096

// total is a compensated sum (Neumaier 1974).
type total struct{ sum, rest float64 }

func (t *total) add(v float64) {
	s := t.sum + v
	if math.Abs(t.sum) >= math.Abs(v) {
		t.rest += (t.sum - s) + v
	} else {
		t.rest += (v - s) + t.sum
	}
	t.sum = s
}

func (t *total) value() float64 { return t.sum + t.rest }

// sum adds many terms: plainly in blocks, the blocks compensated.
type sum struct {
	part  float64
	terms int
	whole total
}

func (s *sum) add(v float64) {
	s.part += v
	if s.terms++; s.terms == blockSize {
		s.whole.add(s.part)
		s.part, s.terms = 0, 0
	}
}

func (s *sum) value() float64 {
	s.whole.add(s.part)
	s.part, s.terms = 0, 0
	return s.whole.value()
}

// series collects the mean, the variance and the autocovariances of one signal
// without keeping it. A sample that is left out breaks the signal: pairs are
// counted within unbroken runs only.
//
// It works on z = value − shift, the shift being the first value, so that a large
// mean costs no digits. With d = mean of z, the sum over pairs of
// (z[k]−d)(z[k−j]−d) is Σ z[k]z[k−j] − d (Σ z[k] + Σ z[k−j]) + pairs·d². The sums
// of one factor are those over all samples less the ends of the runs.
type series struct {
	shift float64
	begun bool
	count int64

	block   int
	partial [lags + 2]float64 // Σ z, then Σ z[k] z[k−j] for j = 0..lags
	whole   [lags + 2]total

	run         int               // samples in the unbroken run, up to lags
	ring        [2 * lags]float64 // the last lags values, twice: [at, at+lags) from new to old
	at          int
	first, last [lags + 1]total // sums of what has no partner at lag j: before it, behind it
	pairs       [lags + 1]int64 // samples without a partner at lag j; pairs = count − this
}

// add takes the next value.
func (s *series) add(value float64) {
	if !s.begun {
		s.begun, s.shift = true, value
	}
	z := value - s.shift
	s.count++
	s.partial[0] += z
	s.partial[1] += z * z
	past := s.ring[s.at : s.at+lags]
	if s.run == lags {
		sums := s.partial[2:]
		for j := 0; j < lags; j++ {
			sums[j] += z * past[j]
		}
	} else {
		s.early(z, past)
	}
	s.at--
	if s.at < 0 {
		s.at = lags - 1
	}
	s.ring[s.at], s.ring[s.at+lags] = z, z
	if s.block++; s.block == blockSize {
		s.flush()
	}
}

// early is for the first values of a run.
func (s *series) early(z float64, past []float64) {
	for j := 1; j <= s.run; j++ {
		s.partial[1+j] += z * past[j-1]
	}
	for j := s.run + 1; j <= lags; j++ {
		s.first[j].add(z)
		s.pairs[j]++
	}
	s.run++
}

// stop ends a run: the next value has no partner before it.
func (s *series) stop() {
	past := s.ring[s.at : s.at+lags]
	for i := 0; i < s.run; i++ {
		for j := i + 1; j <= lags; j++ {
			s.last[j].add(past[i])
		}
	}
	s.run = 0
}

func (s *series) flush() {
	for i, v := range s.partial {
		s.whole[i].add(v)
		s.partial[i] = 0
	}
	s.block = 0
}

// moments are what a series comes to. Autocovariance is per sample pair and with
// the mean removed; index 0 is the variance (divided by the count). Pairs[j] is how
// many pairs there were.
type moments struct {
	count          int64
	mean, variance float64
	covariance     [lags + 1]float64
	pairs          [lags + 1]int64
}

// finish ends the series. Without samples all figures are NaN.
func (s *series) finish() moments {
	s.stop()
	s.flush()
	n := float64(s.count)
	m := moments{count: s.count, mean: math.NaN(), variance: math.NaN()}
	for j := range m.covariance {
		m.covariance[j] = math.NaN()
	}
	if s.count == 0 {
		return m
	}
	sum := s.whole[0].value()
	d := sum / n
	m.mean = s.shift + d
	for j := range m.covariance {
		m.pairs[j] = s.count - s.pairs[j]
		if m.pairs[j] == 0 {
			continue
		}
		pairs := float64(m.pairs[j])
		heads, tails := sum-s.first[j].value(), sum-s.last[j].value()
		m.covariance[j] = (s.whole[1+j].value() - d*(heads+tails) + pairs*d*d) / pairs
	}
	m.variance = math.Max(m.covariance[0], 0)
	m.covariance[0] = m.variance
	return m
}

// autocorrelation at lags 1..20 in the usual biased form: for an unbroken signal
// of N samples Σ (e[k]−ē)(e[k−j]−ē) / Σ (e[k]−ē)². In a broken one the mean product
// of the pairs there are takes the place of those that there are not.
func (m *moments) autocorrelation() []float64 {
	out := make([]float64, lags)
	n := float64(m.count)
	for j := range out {
		out[j] = math.NaN()
		if m.variance > 0 {
			out[j] = m.covariance[j+1] / m.variance * (n - float64(j+1)) / n
		}
	}
	return out
}
