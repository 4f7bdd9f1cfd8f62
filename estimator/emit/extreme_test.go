package emit_test

import (
	"bytes"
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"
	"pgregory.net/rapid"

	"polewright/estimator"
	"polewright/estimator/emit"
)

// A gain and a model whose F overflows must not keep the eigenvalues busy.
func TestOverflowingErrorMatrixEnds(t *testing.T) {
	src := gate()
	src.Model.C.Set(0, 0, 1e300)
	src.L.Set(0, 0, 1e300)
	if files, err := emit.Emit(src, emit.JSON); err != nil || !bytes.Contains(files[0].Text, []byte("could not be computed")) {
		t.Errorf("%v", err)
	}
}

// Whatever the numbers, there is an error or a text without NaN and infinity
// whose structured text passes its own check.
func TestExtremeNumbers(t *testing.T) {
	tame := []float64{0, 1, -1, 0.5, -0.3, 1e-3, 12}
	wild := []float64{1e12, 1e-12, 1e30, 1e300, -1e300, 1e-300, 5e-324, math.MaxFloat64, math.NaN(), math.Inf(1)}
	emitted, refused := 0, 0
	rapid.Check(t, func(t *rapid.T) {
		values := rapid.SampledFrom(tame)
		if rapid.Bool().Draw(t, "wild") {
			many := append([]float64{}, wild...)
			for range rapid.IntRange(0, 8).Draw(t, "tame values") {
				many = append(many, tame...)
			}
			values = rapid.SampledFrom(many)
		}
		n, m, p := rapid.IntRange(1, 4).Draw(t, "n"), rapid.IntRange(0, 2).Draw(t, "m"), rapid.IntRange(1, 3).Draw(t, "p")
		matrix := func(r, c int) *mat.Dense {
			if c == 0 {
				return nil
			}
			return mat.NewDense(r, c, rapid.SliceOfN(values, r*c, r*c).Draw(t, "entries"))
		}
		src := emit.Source{
			Model: &estimator.Model{Period: 1, A: matrix(n, n), B: matrix(n, m), C: matrix(p, n), D: matrix(p, m)},
			Form:  estimator.Form(rapid.IntRange(0, 1).Draw(t, "form")), L: matrix(n, p), Lf: matrix(n, p),
			Arithmetic: emit.Arithmetic(rapid.IntRange(0, 1).Draw(t, "arithmetic")),
		}
		for range p {
			s := emit.Signal{Offset: values.Draw(t, "offset"), Wrap: values.Draw(t, "wrap")}
			if rapid.Bool().Draw(t, "ranged") {
				s.Range = []float64{values.Draw(t, "low"), values.Draw(t, "high")}
			}
			src.Sensors = append(src.Sensors, s)
		}
		for target := emit.C99; target <= emit.CSV; target++ {
			files, err := emit.Emit(src, target)
			if err != nil {
				refused++
				continue
			}
			emitted++
			for _, f := range files {
				if bytes.Contains(f.Text, []byte("NaN,")) || bytes.Contains(f.Text, []byte("Inf")) {
					t.Fatalf("%s holds a number that is none", f.Name)
				}
			}
			if target == emit.StructuredText {
				if _, err := parseST(string(files[0].Text), nil); err != nil {
					t.Fatal(err)
				}
			}
		}
	})
	if !testing.Short() && (emitted < 10 || refused < 10) {
		t.Errorf("%d emitted, %d refused: too one-sided to say much", emitted, refused)
	}
}
