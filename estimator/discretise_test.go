package estimator_test

import (
	"encoding/json"
	"math"
	"os"
	"testing"

	"gonum.org/v1/gonum/mat"
	"pgregory.net/rapid"

	"polewright/estimator"
)

type samplingCase struct {
	Name  string      `json:"name"`
	A     [][]float64 `json:"A"`
	B     [][]float64 `json:"B"`
	G     [][]float64 `json:"G"`
	Q     [][]float64 `json:"Q"`
	Ts    float64     `json:"Ts"`
	Ad    [][]float64 `json:"Ad"`
	Bd    [][]float64 `json:"Bd"`
	Qd    [][]float64 `json:"Qd"`
	TolAd float64     `json:"tolerance_Ad"`
	TolBd float64     `json:"tolerance_Bd"`
	TolQd float64     `json:"tolerance_Qd"`
	Each  *float64    `json:"tolerance_each_entry"`
}

// The cases were computed at 70 digits and more; each carries its source.
func TestDiscretiseReference(t *testing.T) {
	data, err := os.ReadFile("testdata/discretise.json")
	if err != nil {
		t.Fatal(err)
	}
	var file struct{ Cases []samplingCase }
	if err := json.Unmarshal(data, &file); err != nil {
		t.Fatal(err)
	}
	if len(file.Cases) < 15 {
		t.Fatalf("only %d cases", len(file.Cases))
	}
	for _, c := range file.Cases {
		q := asSymmetric(listed(c.Q))
		ad, bd, qd, err := estimator.Discretise(listed(c.A), listed(c.B), listed(c.G), q, c.Ts)
		if err != nil {
			t.Errorf("%s: %v", c.Name, err)
			continue
		}
		for _, x := range []struct {
			name string
			got  mat.Matrix
			want *mat.Dense
			tol  float64
		}{{"Ad", ad, listed(c.Ad), c.TolAd}, {"Bd", bd, listed(c.Bd), c.TolBd}, {"Qd", qd, listed(c.Qd), c.TolQd}} {
			e := apart(x.got, x.want)
			if !(e <= x.tol) {
				t.Errorf("%s: %s is off by %g, allowed %g", c.Name, x.name, e, x.tol)
			}
			t.Logf("%s: %s error %.2g of %.2g", c.Name, x.name, e, x.tol)
			if c.Each != nil {
				checkEach(t, c.Name+" "+x.name, x.got, x.want, *c.Each)
			}
		}
	}
}

func checkEach(t *testing.T, name string, got mat.Matrix, want *mat.Dense, tol float64) {
	t.Helper()
	r, c := want.Dims()
	for i := range r {
		for j := range c {
			w := want.At(i, j)
			if w != 0 && !(math.Abs(got.At(i, j)-w) <= tol*math.Abs(w)) {
				t.Errorf("%s(%d,%d) = %g, want %g within %g", name, i, j, got.At(i, j), w, tol)
			}
		}
	}
}

func listed(list [][]float64) *mat.Dense {
	m := mat.NewDense(len(list), len(list[0]), nil)
	for i, r := range list {
		m.SetRow(i, r)
	}
	return m
}

func asSymmetric(m *mat.Dense) *mat.SymDense {
	n, _ := m.Dims()
	s := mat.NewSymDense(n, nil)
	for i := range n {
		for j := i; j < n; j++ {
			s.SetSym(i, j, m.At(i, j)/2+m.At(j, i)/2)
		}
	}
	return s
}

// apart returns ‖x − y‖F / ‖y‖F.
func apart(x, y mat.Matrix) float64 {
	var d mat.Dense
	d.Sub(x, y)
	if size := mat.Norm(y, 2); size > 0 {
		return mat.Norm(&d, 2) / size
	}
	return mat.Norm(&d, 2)
}

// Two half periods are one period, for any stable or unstable plant.
func TestDiscretiseTwoHalves(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(1, 8).Draw(t, "n")
		draw := func(r, c int) *mat.Dense {
			m := mat.NewDense(r, c, nil)
			for i := range r {
				for j := range c {
					m.Set(i, j, float64(rapid.IntRange(-1000, 1000).Draw(t, "entry"))/200)
				}
			}
			return m
		}
		a, b, half := draw(n, n), draw(n, 2), draw(n, n)
		a.Scale(1/float64(n), a)
		var w mat.Dense
		w.Mul(half, half.T())
		q := asSymmetric(&w)
		period := math.Pow(10, float64(rapid.IntRange(-4, 0).Draw(t, "log period")))
		ad, bd, qd, err := estimator.Discretise(a, b, nil, q, period)
		if err != nil {
			t.Fatal(err)
		}
		ah, bh, qh, err := estimator.Discretise(a, b, nil, q, period/2)
		if err != nil {
			t.Fatal(err)
		}
		var a2, b2, q2 mat.Dense
		a2.Mul(ah, ah)
		b2.Mul(ah, bh)
		b2.Add(&b2, bh)
		q2.Mul(ah, qh)
		q2.Mul(&q2, ah.T())
		q2.Add(&q2, qh)
		for name, e := range map[string]float64{"Ad": apart(ad, &a2), "Bd": apart(bd, &b2), "Qd": apart(qd, &q2)} {
			if e > 1e-12 {
				t.Fatalf("%s: two halves differ by %g", name, e)
			}
		}
	})
}

// A fast lag with a = 1e9/s beside an integrator, sampled every second:
// exp(−A T) would overflow. Closed forms of the lag and the integrator.
func TestDiscretiseStiff(t *testing.T) {
	a := mat.NewDense(2, 2, []float64{-1e9, 0, 0, 0})
	b := mat.NewDense(2, 1, []float64{1e9, 1})
	ad, bd, qd, err := estimator.Discretise(a, b, nil, mat.NewSymDense(2, []float64{1, 0, 0, 1}), 1)
	if err != nil {
		t.Fatal(err)
	}
	checkEach(t, "Bd", bd, mat.NewDense(2, 1, []float64{1, 1}), 1e-12)
	checkEach(t, "Qd", qd, mat.NewDense(2, 2, []float64{0.5e-9, 0, 0, 1}), 1e-12)
	if ad.At(0, 0) < 0 || ad.At(0, 0) > 1e-15 || ad.At(1, 1) != 1 {
		t.Errorf("Ad = %v", mat.Formatted(ad))
	}
}

func TestDiscretiseLeavesOut(t *testing.T) {
	a := mat.NewDense(1, 1, []float64{-1})
	ad, bd, qd, err := estimator.Discretise(a, nil, nil, nil, 1)
	if err != nil || bd != nil || qd != nil || math.Abs(ad.At(0, 0)-math.Exp(-1)) > 1e-15 {
		t.Errorf("%v, %v, %v, %v", ad, bd, qd, err)
	}
	if a.At(0, 0) != -1 {
		t.Error("A was changed")
	}
}

func TestDiscretiseRefuses(t *testing.T) {
	one := mat.NewDense(1, 1, []float64{1})
	unit := mat.NewSymDense(1, []float64{1})
	for want, err := range map[string]error{
		"there is no A to discretise":                                             sampled(nil, nil, nil, nil, 1),
		"A is 1×2, it must be square":                                             sampled(mat.NewDense(1, 2, nil), nil, nil, nil, 1),
		"B is 2×1, it must have 1 rows":                                           sampled(one, mat.NewDense(2, 1, nil), nil, nil, 1),
		"G is 2×1, it must have 1 rows":                                           sampled(one, nil, mat.NewDense(2, 1, nil), unit, 1),
		"Q is 1×1, it must be 3×3":                                                sampled(one, nil, mat.NewDense(1, 3, nil), unit, 1),
		"the period must be a positive number of seconds, not 0":                  sampled(one, nil, nil, nil, 0),
		"the period must be a positive number of seconds, not NaN":                sampled(one, nil, nil, nil, math.NaN()),
		"the period must be a positive number of seconds, not +Inf":               sampled(one, nil, nil, nil, math.Inf(1)),
		"A, B, G and Q must be finite":                                            sampled(mat.NewDense(1, 1, []float64{math.NaN()}), nil, nil, nil, 1),
		"A times the period is out of the range of numbers":                       sampled(mat.NewDense(1, 1, []float64{1e300}), nil, nil, nil, 1e300),
		"the plant grows out of the range of numbers within one period of 1000 s": sampled(one, nil, nil, unit, 1000),
	} {
		if err == nil || err.Error() != want {
			t.Errorf("%v, want %s", err, want)
		}
	}
}

func sampled(a, b, g *mat.Dense, q *mat.SymDense, period float64) error {
	_, _, _, err := estimator.Discretise(a, b, g, q, period)
	return err
}

var sampledSink *mat.Dense

func BenchmarkDiscretise(b *testing.B) {
	for name, n := range map[string]int{"n=4": 4, "n=20": 20} {
		a := mat.NewDense(n, n, nil)
		for i := range n {
			a.Set(i, i, -float64(i+1))
			if i > 0 {
				a.Set(i, i-1, 1)
			}
		}
		q := mat.NewSymDense(n, nil)
		q.SetSym(0, 0, 1)
		b.Run(name, func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				sampledSink, _, _, _ = estimator.Discretise(a, a, nil, q, 0.01)
			}
		})
	}
}
