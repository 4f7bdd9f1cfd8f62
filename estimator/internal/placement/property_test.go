package placement_test

import (
	"errors"
	"math"
	"math/cmplx"
	"testing"

	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/mat"
	"pgregory.net/rapid"

	"polewright/estimator/internal/placement"
)

// drawPlant makes a random plant with p sensors whose lower neighbours are coupled,
// so that it is observable, though not always well.
func drawPlant(t *rapid.T, n, p int) (a, c blas64.General) {
	entry := rapid.Float64Range(-2, 2)
	a, c = zeros(n, n), zeros(p, n)
	for i := range a.Data {
		a.Data[i] = entry.Draw(t, "a")
	}
	for i := range n - 1 {
		a.Data[i*n+i+1] = rapid.Float64Range(0.5, 2).Draw(t, "link")
		for j := i + 2; j < n; j++ {
			a.Data[i*n+j] = 0
		}
	}
	for k := range p {
		c.Data[k*n+k*n/p] = 1
	}
	return a, c
}

// drawPoles makes n poles, complex ones in pairs, no two closer than 0.2.
func drawPoles(t *rapid.T, n int) []complex128 {
	var list []complex128
	for len(list) < n {
		k := float64(len(list))
		re := -0.5 - 0.4*k - rapid.Float64Range(0, 0.2).Draw(t, "re")
		if len(list)+1 < n && rapid.Bool().Draw(t, "pair") {
			im := rapid.Float64Range(0.2, 3).Draw(t, "im")
			list = append(list, complex(re, im), complex(re, -im))
			continue
		}
		list = append(list, complex(re, 0))
	}
	return list
}

// The poles are reached to 1e-8 of the largest, or to what rounding of a matrix with
// this gain and these eigenvectors allows: ε ‖F‖ κ(X).
func TestRobustReachesPoles(t *testing.T) {
	var s placement.Solver
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(1, 8).Draw(t, "n")
		p := rapid.IntRange(1, n).Draw(t, "p")
		a, c := drawPlant(t, n, p)
		poles := drawPoles(t, n)
		l := zeros(n, p)
		info, err := s.Robust(l, a, c, poles, nil)
		if err != nil && errors.Is(err, placement.ErrNotReached) && p == 1 {
			t.Skip("one sensor, gain unique and out of reach")
		}
		if err != nil {
			t.Fatal(err)
		}
		f := closed(a, c, l)
		limit := math.Max(1e-8, 0x1p-45*mat.Norm(f, 2)*info.Condition)
		if miss := poleError(f, poles); !(miss <= limit) {
			t.Fatalf("poles off by %g, allowed %g, condition %g", miss, limit, info.Condition)
		}
	})
}

// With one sensor Robust and Single agree, and eigenvectors do not move with the
// units of the sensor.
func TestRobustOfOneSensorIsSingle(t *testing.T) {
	var s placement.Solver
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(2, 5).Draw(t, "n")
		a, c := drawPlant(t, n, 1)
		poles := drawPoles(t, n)
		one, two, three := zeros(n, 1), zeros(n, 1), zeros(n, 1)
		if err := s.Single(one, a, c, poles); err != nil {
			t.Fatal(err)
		}
		if _, err := s.Robust(two, a, c, poles, nil); err != nil {
			t.Fatal(err)
		}
		micro := blas64.General{Rows: 1, Cols: n, Stride: n, Data: make([]float64, n)}
		for i, v := range c.Data {
			micro.Data[i] = 1e6 * v
		}
		if err := s.Single(three, a, micro, poles); err != nil {
			t.Fatal(err)
		}
		size := mat.Norm(wrap(one), 2)
		for i := range n {
			if one.Data[i] != two.Data[i] {
				t.Fatalf("Single %v, Robust %v", one.Data, two.Data)
			}
			if math.Abs(one.Data[i]-1e6*three.Data[i]) > 1e-9*size {
				t.Fatalf("gain %v does not scale with the sensor: %v", one.Data, three.Data)
			}
		}
	})
}

// repeated lists plants and lists with copies; attainable tells whether every copy
// can have an eigenvector of its own.
func TestRepeatedPoles(t *testing.T) {
	chain := general([][]float64{ // two masses, springs to the walls and between
		{0, 1, 0, 0}, {-2, -0.1, 1, 0.05}, {0, 0, 0, 1}, {1, 0.05, -2, -0.1}})
	both := general([][]float64{{1, 0, 0, 0}, {0, 0, 1, 0}})
	uneven := general([][]float64{{0, 1, 0, 0}, {0, 0, 1, 0}, {0, 0, 0, 0}, {0, 0, 0, 0}}) // indices 3 and 1
	ends := general([][]float64{{1, 0, 0, 0}, {0, 0, 0, 1}})
	six := general([][]float64{
		{0, 1, 0, 0, 0, 0}, {0, 0, 1, 0, 0, 0}, {0, 0, 0, 0, 0.3, 0},
		{0, 0, 0, 0, 1, 0}, {0, 0.2, 0, 0, 0, 1}, {0.1, 0, 0, 0, 0, 0}})
	sixC := general([][]float64{{1, 0, 0, 0, 0, 0}, {0, 0, 0, 1, 0, 0}})
	cases := []struct {
		name       string
		a, c       blas64.General
		poles      []complex128
		chain      int // longest Jordan chain to expect
		attainable bool
	}{
		{"two double poles", chain, both, []complex128{-3, -3, -5, -5}, 1, true},
		{"double complex pair", chain, both, []complex128{-3 + 2i, -3 - 2i, -3 + 2i, -3 - 2i}, 1, true},
		{"triple pole", chain, both, []complex128{-3, -3, -3, -5}, 2, false},
		{"all equal", chain, both, []complex128{-4, -4, -4, -4}, 2, false},
		{"deadbeat", chain, both, []complex128{0, 0, 0, 0}, 2, false},
		{"indices 3 and 1, two double poles", uneven, ends, []complex128{-1, -1, -2, -2}, 2, false},
		{"indices 3 and 1, all equal", uneven, ends, []complex128{-1, -1, -1, -1}, 3, false},
		{"three copies of a pair", six, sixC, []complex128{-1 + 1i, -1 - 1i, -1 + 1i, -1 - 1i, -1 + 1i, -1 - 1i}, 2, false},
		{"six copies", six, sixC, []complex128{-2, -2, -2, -2, -2, -2}, 4, false},
		{"nearly equal", chain, both, []complex128{-4, -4 - 1e-7, -4 + 1e-7, -4 - 2e-7}, 3, false},
		{"poles of the plant", uneven, ends, []complex128{0, 0, -1, -2}, 1, true},
	}
	for _, c := range cases {
		t.Run(c.name, func(t *testing.T) {
			var s placement.Solver
			n := c.a.Rows
			l := zeros(n, 2)
			info, err := s.Robust(l, c.a, c.c, c.poles, nil)
			if err != nil {
				t.Fatal(err)
			}
			if c.attainable == math.IsNaN(info.Condition) {
				t.Errorf("condition %g", info.Condition)
			}
			f := closed(c.a, c.c, l)
			limit := 20 * math.Pow(float64(n)*0x1p-52*math.Max(1, mat.Norm(f, 2)), 1/float64(c.chain))
			miss := poleError(f, c.poles)
			t.Logf("poles off by %.1e of %.1e, gain %.3g, condition %.3g", miss, limit, mat.Norm(wrap(l), 2), info.Condition)
			if !(miss <= limit) {
				t.Errorf("poles off by %g, allowed %g", miss, limit)
			}
			if size := mat.Norm(wrap(l), 2); size > 300 {
				t.Errorf("gain %g is not sensible", size)
			}
		})
	}
}

// As many sensors as states: A − L C is normal, whatever the list.
func TestFullMeasurement(t *testing.T) {
	var s placement.Solver
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(1, 5).Draw(t, "n")
		a, _ := drawPlant(t, n, 1)
		c := zeros(n, n)
		for i := range n {
			for j := range i + 1 {
				c.Data[i*n+j] = rapid.Float64Range(-1, 1).Draw(t, "c")
			}
			c.Data[i*n+i] = 1
		}
		poles := drawPoles(t, n)
		if n > 2 && rapid.Bool().Draw(t, "repeat") {
			poles = append(poles[:0], make([]complex128, n)...)
			for i := range poles {
				poles[i] = -1
			}
		}
		l := zeros(n, n)
		var w placement.Warm
		for range 2 {
			info, err := s.Robust(l, a, c, poles, &w)
			if err != nil {
				t.Fatal(err)
			}
			if math.Abs(info.Condition-1) > 1e-12 {
				t.Fatalf("condition %g", info.Condition)
			}
			if miss := poleError(closed(a, c, l), poles); miss > 1e-9 {
				t.Fatalf("poles off by %g", miss)
			}
		}
	})
}

func TestBadInput(t *testing.T) {
	a := general([][]float64{{0, 1}, {-1, 0}})
	c := general([][]float64{{1, 0}})
	full := general([][]float64{{1, 0}, {0, 1}})
	nan := general([][]float64{{math.NaN(), 0}})
	good := []complex128{-1, -2}
	cases := []struct {
		name      string
		dst, a, c blas64.General
		poles     []complex128
		want      error
	}{
		{"empty", blas64.General{}, blas64.General{}, blas64.General{}, nil, placement.ErrShape},
		{"too few poles", zeros(2, 1), a, c, good[:1], placement.ErrShape},
		{"wrong gain", zeros(1, 2), a, c, good, placement.ErrShape},
		{"short data", zeros(2, 1), blas64.General{Rows: 2, Cols: 2, Stride: 2, Data: []float64{1}}, c, good, placement.ErrShape},
		{"NaN sensor", zeros(2, 1), a, nan, good, placement.ErrNotFinite},
		{"NaN pole", zeros(2, 1), a, c, []complex128{cmplx.NaN(), -1}, placement.ErrNotFinite},
		{"infinite pole", zeros(2, 1), a, c, []complex128{cmplx.Inf(), -1}, placement.ErrNotFinite},
		{"lone complex pole", zeros(2, 1), a, c, []complex128{-1 + 1i, -1}, placement.ErrPairs},
		{"no signal", zeros(2, 1), a, zeros(1, 2), good, placement.ErrUnobservable},
		{"unseen mode", zeros(2, 1), general([][]float64{{-1, 0}, {0, -2}}), c, good, placement.ErrUnobservable},
		{"dependent sensors", zeros(2, 2), a, general([][]float64{{1, 0}, {2, 0}}), good, placement.ErrSensors},
		{"huge plant", zeros(2, 2), general([][]float64{{1e300, 1e300}, {1e300, -1e300}}), full, good, placement.ErrRange},
		{"tiny plant", zeros(2, 1), general([][]float64{{0, 1e-200}, {1e-200, 0}}), c, []complex128{-1e-200, -2e-200}, placement.ErrRange},
		{"tiny sensor", zeros(2, 1), a, general([][]float64{{1e-200, 0}}), good, placement.ErrRange},
	}
	var s placement.Solver
	for _, x := range cases {
		_, err := s.Robust(x.dst, x.a, x.c, x.poles, nil)
		if !errors.Is(err, x.want) {
			t.Errorf("Robust, %s: error %v, want %v", x.name, err, x.want)
		}
		if x.dst.Cols == 1 {
			if err := s.Single(x.dst, x.a, x.c, x.poles); !errors.Is(err, x.want) {
				t.Errorf("Single, %s: error %v, want %v", x.name, err, x.want)
			}
		}
	}
	if err := s.Single(zeros(2, 2), a, full, good); !errors.Is(err, placement.ErrShape) {
		t.Errorf("Single with two sensors: %v", err)
	}
}

// Whatever the input, the answer is a finite gain or an error.
func TestNoPanicAndNoNaN(t *testing.T) {
	values := []float64{0, 0, 1, -1, 1e-8, 1e8, -1e-30, 1e30, 1e-100, 1e100, 1e200, math.Inf(1), math.NaN()}
	var s placement.Solver
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(1, 5).Draw(t, "n")
		p := rapid.IntRange(1, n).Draw(t, "p")
		some := rapid.SampledFrom(values[:rapid.IntRange(4, len(values)).Draw(t, "wildness")])
		a, c, l := zeros(n, n), zeros(p, n), zeros(n, p)
		for i := range a.Data {
			a.Data[i] = some.Draw(t, "a")
		}
		for i := range c.Data {
			c.Data[i] = some.Draw(t, "c")
		}
		var poles []complex128
		for len(poles) < n {
			re, im := some.Draw(t, "re"), some.Draw(t, "im")
			if len(poles)+1 < n && im != 0 {
				poles = append(poles, complex(re, im), complex(re, -im))
				continue
			}
			poles = append(poles, complex(re, 0))
		}
		check := func(err error) {
			for _, v := range l.Data {
				if err == nil && (math.IsNaN(v) || math.IsInf(v, 0)) {
					t.Fatalf("gain %v without an error", l.Data)
				}
			}
		}
		_, err := s.Robust(l, a, c, poles, nil)
		check(err)
		w, r, weights := zeros(n, n), zeros(p, p), make([]float64, n)
		for i := range n {
			w.Data[i*n+i], weights[i] = math.Abs(some.Draw(t, "w")), math.Abs(some.Draw(t, "weight"))
		}
		for i := range p {
			r.Data[i*p+i] = math.Abs(some.Draw(t, "r"))
		}
		for i, v := range poles {
			poles[i] = complex(-math.Abs(real(v)), imag(v))
		}
		_, err = s.LeastNoise(l, a, c, w, r, weights, poles, rapid.Bool().Draw(t, "discrete"), nil)
		check(err)
	})
}
