package poles

import (
	"math"
	"math/cmplx"
	"slices"
)

// Match pairs two sets of poles one to one so that the sum of the distances is
// the least possible. Element i of the result is the index in have of wanted[i].
// Of ties the lower index wins. Where there are more wanted than have, the ones
// left over get −1; where there are fewer, some of have stay unused. Poles that
// are not finite are infinitely far from all others.
func Match(wanted, have []complex128) []int {
	index := make([]int, len(wanted))
	if nearest(index, wanted, have) {
		return index
	}
	if len(wanted) <= len(have) {
		assign(index, wanted, have)
		return index
	}
	back := make([]int, len(have))
	assign(back, have, wanted)
	for i := range index {
		index[i] = -1
	}
	for k, i := range back {
		index[i] = k
	}
	return index
}

// nearest gives every wanted pole its nearest one and says whether nobody
// shares: then each distance is the least possible, and so is their sum.
func nearest(index []int, wanted, have []complex128) bool {
	if len(wanted) > len(have) {
		return false
	}
	for i, w := range wanted {
		best, least := -1, math.Inf(1)
		for k, h := range have {
			if d := distance(w, h); d < least {
				best, least = k, d
			}
		}
		if best < 0 {
			return false
		}
		for _, k := range index[:i] {
			if k == best {
				return false
			}
		}
		index[i] = best
	}
	return true
}

func distance(a, b complex128) float64 {
	d := cmplx.Abs(a - b)
	if !(d < 1e290) { // sums stay finite
		return 1e290
	}
	return d
}

// assign solves the assignment problem by shortest augmenting paths with
// potentials (Kuhn 1955; Jonker & Volgenant 1987): O(rows²·columns). There are
// no more rows than columns.
func assign(index []int, rows, columns []complex128) {
	n, m := len(rows), len(columns)
	owner := make([]int, m+1) // row (from 1) that holds the column (from 1), 0 = free
	came := make([]int, m+1)
	u, v := make([]float64, n+1), make([]float64, m+1)
	short, seen := make([]float64, m+1), make([]bool, m+1)
	for i := 1; i <= n; i++ {
		for j := range short {
			short[j], seen[j] = math.Inf(1), false
		}
		owner[0] = i
		at := 0
		for owner[at] != 0 {
			seen[at] = true
			row, next, delta := owner[at], 0, math.Inf(1)
			for j := 1; j <= m; j++ {
				if seen[j] {
					continue
				}
				if d := distance(rows[row-1], columns[j-1]) - u[row] - v[j]; d < short[j] {
					short[j], came[j] = d, at
				}
				if short[j] < delta {
					next, delta = j, short[j]
				}
			}
			for j := range short {
				if seen[j] {
					u[owner[j]] += delta
					v[j] -= delta
				} else {
					short[j] -= delta
				}
			}
			at = next
		}
		for at != 0 {
			owner[at] = owner[came[at]]
			at = came[at]
		}
	}
	for j := 1; j <= m; j++ {
		if owner[j] != 0 {
			index[owner[j]-1] = j - 1
		}
	}
}

// Without returns a copy of list without, for each of gone in turn, the entry that
// is nearest to it.
func Without(list, gone []complex128) []complex128 {
	out := slices.Clone(list)
	for _, g := range gone {
		best := -1
		for i, v := range out {
			if best < 0 || cmplx.Abs(v-g) < cmplx.Abs(out[best]-g) {
				best = i
			}
		}
		if best >= 0 {
			out = slices.Delete(out, best, best+1)
		}
	}
	return out
}
