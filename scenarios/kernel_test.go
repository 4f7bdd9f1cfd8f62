package scenarios

import (
	"testing"

	"pgregory.net/rapid"
)

// The packed product is the plain one, bit for bit.
func TestPackedProductIsThePlainOne(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		f := newFlat(rapid.IntRange(0, 25).Draw(t, "rows"), rapid.IntRange(0, 9).Draw(t, "cols"))
		number := rapid.Float64Range(-10, 10)
		for i := range f.a {
			f.a[i] = number.Draw(t, "entry")
		}
		v, add := make([]float64, f.cols), make([]float64, f.rows)
		for i := range v {
			v[i] = number.Draw(t, "v")
		}
		for i := range add {
			add[i] = number.Draw(t, "add")
		}
		var p packed
		p.pack(f)
		have := make([]float64, f.rows+1)
		have[f.rows] = 77
		p.mulAdd(have, v, add)
		for i := range f.rows {
			want := add[i]
			for j, c := range f.row(i) {
				want += float64(c * v[j])
			}
			if have[i] != want {
				t.Fatalf("row %d: %v, want %v", i, have[i], want)
			}
		}
		if have[f.rows] != 77 {
			t.Fatal("written beyond the end")
		}
	})
}
