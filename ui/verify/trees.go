package verify

import (
	"maps"
	"math"
	"math/cmplx"
	"slices"

	"polewright/estimator/poles"
)

// modes compares the modes of the plant: matched by eigenvalue, the rest of each
// as any other figures.
func (c *comparison) modes(path string, have, want []any, near []any) {
	h, w := eigenvalues(have), eigenvalues(want)
	if len(h) != len(have) || len(h) != len(w) {
		c.differ(path, "number of entries", float64(len(have)), float64(len(want)), math.NaN())
		return
	}
	samples := make([][]any, len(w))
	spread := make([]float64, len(w))
	for _, a := range near {
		l, _ := a.([]any)
		n := eigenvalues(l)
		if len(n) != len(w) {
			continue
		}
		for i, k := range poles.Match(w, n) {
			samples[i] = append(samples[i], l[k])
			spread[i] = max(spread[i], cmplx.Abs(n[k]-w[i]))
		}
	}
	for i, k := range poles.Match(w, h) {
		c.compared++
		at := poles.Format(w[i])
		if tolerance := relative*cmplx.Abs(w[i]) + safety*spread[i]; !(cmplx.Abs(h[k]-w[i]) <= tolerance) {
			c.differ(path, "", poles.Format(h[k]), at, tolerance)
			continue
		}
		mine, now := have[k].(map[string]any), want[i].(map[string]any)
		for _, key := range []string{"sigma", "observable"} {
			var beside []any
			for _, s := range samples[i] {
				if m, ok := s.(map[string]any); ok {
					beside = append(beside, m[key])
				}
			}
			c.value(path+"."+key, at, mine[key], now[key], beside, 0)
		}
	}
}

// missed is how far the reached poles are from the wanted ones, over the largest
// of these, and how far they may be.
func missed(list []*verdict) (miss, allowed float64) {
	d := list[0].design
	size, spread := 0.0, 0.0
	for i, v := range d.Wanted {
		size = max(size, cmplx.Abs(v))
		miss = max(miss, cmplx.Abs(d.Reached[i]-v))
	}
	for _, n := range list[1:] {
		for i, v := range n.design.Reached {
			spread = max(spread, cmplx.Abs(v-d.Reached[i]))
		}
	}
	if size == 0 {
		size = 1
	}
	return miss / size, reachTolerance + safety*spread/size
}

func eigenvalues(list []any) []complex128 {
	var out []complex128
	for _, v := range list {
		m, _ := v.(map[string]any)
		if z, ok := complexOf(m["eigenvalue"]); ok {
			out = append(out, z)
		}
	}
	return out
}

// complexes returns those entries that are complex numbers: a z of 0 has no place in
// the s-plane and is null.
func complexes(list []any) []complex128 {
	var out []complex128
	for _, v := range list {
		if z, ok := complexOf(v); ok {
			out = append(out, z)
		}
	}
	return out
}

func complexOf(v any) (complex128, bool) {
	l, ok := v.([]any)
	if !ok || len(l) != 2 {
		return 0, false
	}
	re, ok1 := l[0].(float64)
	im, ok2 := l[1].(float64)
	return complex(re, im), ok1 && ok2
}

func isMatrix(list []any) bool {
	if len(list) == 0 {
		return false
	}
	_, ok := list[0].([]any)
	return ok
}

func largest(v any) float64 {
	switch v := v.(type) {
	case float64:
		return math.Abs(v)
	case []any:
		size := 0.0
		for _, e := range v {
			size = max(size, largest(e))
		}
		return size
	}
	return 0
}

func join(a, b string) string {
	if a == "" {
		return b
	}
	return a + ", " + b
}

func sortedKeys[V any](m map[string]V) []string { return slices.Sorted(maps.Keys(m)) }
