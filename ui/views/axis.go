package views

import (
	"math"
	"strconv"
)

// logAxis maps positive values to cells, evenly in their logarithm.
type logAxis struct {
	low, high float64
	cells     int
}

// newLogAxis holds all values, with some room around them. It is false where no
// value is positive and finite.
func newLogAxis(values []float64, cells int) (logAxis, bool) {
	low, high := math.Inf(1), 0.0
	for _, v := range values {
		if v > 0 && !math.IsInf(v, 0) {
			low, high = min(low, v), max(high, v)
		}
	}
	if high == 0 || cells < 2 {
		return logAxis{}, false
	}
	room := max(math.Pow(high/low, 0.06), 1.05)
	return logAxis{low / room, high * room, cells}, true
}

// cell returns where a value is, which may be outside; false where it has no
// logarithm.
func (a logAxis) cell(v float64) (float64, bool) {
	if !(v > 0) || math.IsInf(v, 0) {
		return 0, false
	}
	return math.Log(v/a.low) / math.Log(a.high/a.low) * float64(a.cells-1), true
}

// mantissas are the steps of ticks within a decade, coarse to fine.
var mantissas = [][]float64{
	{1}, {1, 3}, {1, 2, 5}, {1, 1.5, 2, 3, 5, 7}, {1, 1.2, 1.4, 1.6, 1.8, 2, 2.5, 3, 3.5, 4, 5, 6, 7, 8, 9},
	{1, 1.1, 1.2, 1.3, 1.4, 1.5, 1.6, 1.7, 1.8, 1.9, 2, 2.2, 2.4, 2.6, 2.8, 3, 3.2, 3.4, 3.6, 3.8, 4, 4.5, 5, 5.5, 6, 6.5, 7, 7.5, 8, 8.5, 9, 9.5},
}

// ticks returns round values on the axis, as many as keep the wanted distance.
func (a logAxis) ticks(apart int) []float64 {
	var best []float64
	for _, steps := range mantissas {
		var list []float64
		closest := math.Inf(1)
		from, to := int(math.Floor(math.Log10(a.low))), int(math.Ceil(math.Log10(a.high)))
		for decade := from; decade <= to; decade++ {
			for _, m := range steps {
				v := m * math.Pow10(decade)
				if v < a.low || v > a.high {
					continue
				}
				if n := len(list); n > 0 {
					before, _ := a.cell(list[n-1])
					here, _ := a.cell(v)
					closest = min(closest, here-before)
				}
				list = append(list, v)
			}
		}
		if closest < float64(apart) {
			break
		}
		best = list
	}
	return best
}

// tick prints a value with three figures, in full where that is short.
func tick(v float64) string {
	short := strconv.FormatFloat(v, 'g', 3, 64)
	if size := math.Abs(v); size >= 1e-3 && size < 1e6 {
		if r, err := strconv.ParseFloat(short, 64); err == nil {
			return strconv.FormatFloat(r, 'f', -1, 64)
		}
	}
	return short
}
