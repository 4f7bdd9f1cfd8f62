package views

import (
	"testing"

	"pgregory.net/rapid"
)

// Ticks lie on the axis, in order and apart, and every value of the axis is in
// its cells.
func TestLogAxis(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		values := rapid.SliceOfN(rapid.Float64Range(1e-6, 1e9), 1, 5).Draw(t, "values")
		cells, apart := rapid.IntRange(2, 200).Draw(t, "cells"), rapid.IntRange(1, 12).Draw(t, "apart")
		a, ok := newLogAxis(values, cells)
		if !ok {
			t.Fatal("no axis")
		}
		for _, v := range values {
			if c, ok := a.cell(v); !ok || c < 0 || c > float64(cells-1) {
				t.Fatalf("%v is in cell %v of %d", v, c, cells)
			}
		}
		before := -1e9
		for _, v := range a.ticks(apart) {
			c, _ := a.cell(v)
			if c < 0 || c > float64(cells-1) || c-before < float64(apart) {
				t.Fatalf("tick %v at %v after %v", v, c, before)
			}
			before = c
		}
	})
	for _, bad := range [][]float64{nil, {0}, {-1, 0}} {
		if _, ok := newLogAxis(bad, 10); ok {
			t.Errorf("an axis for %v", bad)
		}
	}
}
