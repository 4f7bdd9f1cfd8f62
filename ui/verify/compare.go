package verify

import (
	"fmt"
	"math"
	"math/cmplx"
	"slices"
	"strings"

	"polewright/estimator"
	"polewright/estimator/poles"
	"polewright/ui/measures"
)

// A number may differ by relative of its size, by matrixFloor of the largest
// entry where it stands in a matrix, and by safety times what the neighbours do
// to it.
const (
	relative    = 1e-9
	matrixFloor = 1e-13
	safety      = 8
	flat        = 3e-5 // relative, of where a peak is: the root of how well its height is known
	deadbeat    = 1e-4 // poles this near z = 0 are all dead in a sample or two, wherever they are
	still       = 1e-8 // of a state's scale: a standard deviation that is none, the root of rounding
	border      = 1e-3 // relative, of a figure that a neighbour has and the design has not
)

// order is that of the differences: causes before consequences.
var order = []string{"format", "plant", "model", "form", "method", "poles", "gain", "gain_current", "gain_norm",
	"eigenvector_condition", "stable", "observability", "noise", "transient", "loop", "rounding", "sensor_sets"}

// sets are lists of complex numbers without an order of their own.
var sets = []string{"poles.reached", "poles.eigenvalues", "noise.floor_poles", "loop.poles", "observability.fixed"}

// comparison walks the stored tree beside the recomputed one and its neighbours.
type comparison struct {
	names       *estimator.Model
	strict      bool
	compared    int
	differences []Difference
}

func (c *comparison) documents(stored map[string]any, list []*verdict) {
	now := list[0].tree
	around := make([]any, len(list)-1)
	for i, v := range list[1:] {
		around[i] = v.tree
	}
	for _, key := range order {
		c.member(key, key, stored, now, around)
	}
	c.limits(stored["limits"], now["limits"], around)
}

// member compares one key of objects.
func (c *comparison) member(path, key string, stored, now map[string]any, around []any) {
	want, known := now[key]
	have, given := stored[key]
	if !known {
		return
	}
	if !given {
		if c.strict {
			c.differ(path, "not stored", nil, want, math.NaN())
		}
		return
	}
	near := make([]any, 0, len(around))
	for _, a := range around {
		if m, ok := a.(map[string]any); ok {
			near = append(near, m[key])
		}
	}
	c.value(path, "", have, want, near, 0)
}

// value compares what stands at a path. floor is what rounding may do in any
// case.
func (c *comparison) value(path, at string, have, want any, near []any, floor float64) {
	switch w := want.(type) {
	case map[string]any:
		h, ok := have.(map[string]any)
		if !ok {
			c.leaf(path, at, have, want, near, floor)
			return
		}
		for _, key := range sortedKeys(w) {
			c.member(path+"."+key, key, h, w, near)
		}
	case []any:
		c.list(path, at, have, w, near, floor)
	default:
		c.leaf(path, at, have, want, near, floor)
	}
}

func (c *comparison) list(path, at string, have any, want []any, near []any, floor float64) {
	h, ok := have.([]any)
	switch {
	case !ok:
		c.leaf(path, at, have, want, near, floor)
		return
	case slices.Contains(sets, path):
		c.set(path, h, want, near)
		return
	case path == "observability.modes":
		c.modes(path, h, want, near)
		return
	case len(h) != len(want):
		c.differ(path, join(at, "number of entries"), float64(len(h)), float64(len(want)), math.NaN())
		return
	}
	if isMatrix(want) {
		floor = matrixFloor * largest(want)
	}
	for i := range want {
		var beside []any
		for _, a := range near {
			if l, ok := a.([]any); ok && len(l) == len(want) {
				beside = append(beside, l[i])
			}
		}
		if (path == "noise.std" || path == "noise.floor_std") && i < len(c.names.StateScale) {
			floor = 0
			if none := still * c.names.StateScale[i]; largest(want[i]) <= none {
				floor = none
			}
		}
		c.value(path, join(at, c.place(path, at, i, want[i])), h[i], want[i], beside, floor)
	}
}

// leaf compares numbers, words, truths and null.
func (c *comparison) leaf(path, at string, have, want any, near []any, floor float64) {
	c.compared++
	h, isNumber := have.(float64)
	w, wantNumber := want.(float64)
	if isNumber && wantNumber {
		tolerance := floor + relative*math.Abs(w)
		if strings.HasSuffix(path, ".rad_per_s") {
			tolerance = flat * math.Abs(w)
		}
		if exact(path) {
			tolerance = 0
		} else {
			for _, a := range near {
				if v, ok := a.(float64); ok {
					tolerance = max(tolerance, floor+relative*math.Abs(w)+safety*math.Abs(v-w))
				}
			}
		}
		if !(math.Abs(h-w) <= tolerance) {
			c.differ(path, at, have, want, tolerance)
		}
		return
	}
	if plain(have) && plain(want) && have == want {
		return
	}
	for _, a := range near { // on the border: a neighbour says the same
		if list, ok := have.([]any); ok && want == nil {
			if l, ok := a.([]any); ok && len(l) == len(list) {
				return // such as a Gramian: undefined just here
			}
		}
		v, number := a.(float64)
		if number && isNumber && math.Abs(h-v) <= border*math.Abs(v) || !isNumber && plain(a) && plain(have) && a == have {
			return
		}
	}
	c.differ(path, at, have, want, math.NaN())
}

// exact tells figures that are copies: nothing rounds them.
func exact(path string) bool { return path == "gain" || path == "format" }

func plain(v any) bool {
	switch v.(type) {
	case map[string]any, []any:
		return false
	}
	return true
}

// set compares complex numbers one to one by nearness.
func (c *comparison) set(path string, have, want []any, near []any) {
	c.compared += len(want)
	h, w := complexes(have), complexes(want)
	if len(h) != len(w) || len(have) != len(want) {
		c.differ(path, "number of entries", float64(len(have)), float64(len(want)), math.NaN())
		return
	}
	spread := make([]float64, len(w))
	for _, a := range near {
		if l, ok := a.([]any); ok {
			if n := complexes(l); len(n) == len(w) {
				for i, k := range poles.Match(w, n) {
					spread[i] = max(spread[i], cmplx.Abs(n[k]-w[i]))
				}
			}
		}
	}
	for i, k := range poles.Match(w, h) {
		tolerance := relative*cmplx.Abs(w[i]) + safety*spread[i]
		if c.names.Discrete() && cmplx.Abs(w[i]) < deadbeat {
			tolerance = max(tolerance, deadbeat)
		}
		if !(cmplx.Abs(h[k]-w[i]) <= tolerance) {
			c.differ(path, "", poles.Format(h[k]), poles.Format(w[i]), tolerance)
		}
	}
}

// limits compares those that both have; limits of a run may not have been judged
// when the session was saved.
func (c *comparison) limits(have, want any, around []any) {
	byName := func(v any) map[string]map[string]any {
		out := map[string]map[string]any{}
		list, _ := v.([]any)
		for _, l := range list {
			if m, ok := l.(map[string]any); ok {
				name, _ := m["name"].(string)
				out[name] = m
			}
		}
		return out
	}
	h, w := byName(have), byName(want)
	for _, name := range sortedKeys(w) {
		if h[name] == nil {
			if !strings.HasPrefix(name, "error ") {
				c.differ("limits", name, nil, "a limit of the scenario", math.NaN())
			}
			continue
		}
		var near []any
		for _, a := range around {
			if m, ok := a.(map[string]any); ok {
				if l := byName(m["limits"])[name]; l != nil {
					near = append(near, map[string]any(l))
				}
			}
		}
		for _, key := range []string{"limit", "value", "met"} {
			var beside []any
			for _, n := range near {
				beside = append(beside, n.(map[string]any)[key])
			}
			c.value("limits."+key, name, h[name][key], w[name][key], beside, 0)
		}
	}
	for _, name := range sortedKeys(h) {
		if w[name] == nil {
			c.differ("limits", name, "a limit", nil, math.NaN())
		}
	}
}

func (c *comparison) differ(path, at string, have, want any, tolerance float64) {
	c.differences = append(c.differences, Difference{Key: path, At: at, Stored: have, Recomputed: want, Tolerance: measures.Number(tolerance)})
}

// place names entry i of a list: a state, a sensor, an input, else its number.
func (c *comparison) place(path, at string, i int, entry any) string {
	name := func(list []string) string {
		if i < len(list) {
			return list[i]
		}
		return fmt.Sprint(i + 1)
	}
	m := c.names
	switch path {
	case "noise.std", "noise.floor_std", "noise.over_floor", "noise.peak_gain":
		return name(m.StateNames)
	case "loop.input_std":
		return name(m.InputNames)
	case "gain", "gain_current", "noise.floor_gain", "noise.sensor_to_state":
		if at == "" {
			return name(m.StateNames)
		}
		return name(m.SensorNames)
	}
	if o, ok := entry.(map[string]any); ok {
		if s, ok := o["name"].(string); ok {
			return s
		}
	}
	if at == "" && plain(entry) {
		return fmt.Sprintf("entry %d", i+1)
	}
	if at == "" {
		return fmt.Sprintf("row %d", i+1)
	}
	return fmt.Sprintf("column %d", i+1)
}
