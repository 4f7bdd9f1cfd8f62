package logs

import "math"

const (
	// maxGap bounds the sample periods between two rows.
	maxGap = 1000000
	// lookAhead is how many rows may arrive in a burst after a late one.
	lookAhead = 16
)

// slots tells missing rows from late time stamps. Rows stand for instants of an
// even grid, at least one period apart. A row that comes k periods late may follow
// k−1 missing rows, or it was stamped late: then the rows after it come in a burst
// and are back on the grid. So a row takes the latest instant that leaves one for
// each of the next rows, as their times have it:
// min over j of round((t[i+j] − grid)/period) − j, but at least 1.
//
// Between gaps, the grid follows the times slowly.
type slots struct {
	period  float64
	grid    float64 // instant of the last row
	begun   bool
	pending [lookAhead + 1]float64
	count   int // of pending times
}

// add takes the time of the next row. While rows are pending, drain them first.
func (s *slots) add(t float64) {
	s.pending[s.count] = t
	s.count++
}

// next gives the periods between the row that is due and the one before it, 0 for
// the very first. It reports false while it needs more rows; end tells that there
// are none.
func (s *slots) next(end bool) (periods int, ok bool) {
	if s.count == 0 {
		return 0, false
	}
	t := s.pending[0]
	if !s.begun {
		s.begun, s.grid = true, t
		s.pop()
		return 0, true
	}
	k := s.whole(t)
	if k > 1 {
		if s.count <= lookAhead && !end {
			return 0, false
		}
		for j := 1; j < s.count; j++ {
			k = min(k, s.whole(s.pending[j])-j)
		}
		k = max(k, 1)
	}
	if k > 1 {
		s.grid = t
	} else {
		s.grid += s.period
		s.grid += 0.1 * math.Max(-0.5*s.period, math.Min(t-s.grid, 0.5*s.period))
	}
	s.pop()
	return k, true
}

// whole is the periods from the last row to a time, 1 to maxGap.
func (s *slots) whole(t float64) int {
	if k := math.Round((t - s.grid) / s.period); k < maxGap {
		return int(math.Max(1, k))
	}
	return maxGap
}

func (s *slots) pop() {
	copy(s.pending[:], s.pending[1:s.count])
	s.count--
}
