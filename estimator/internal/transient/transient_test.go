package transient

import (
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/mat"
)

func matrix(n int, data ...float64) blas64.General {
	return blas64.General{Rows: n, Cols: n, Stride: n, Data: data}
}

func near(have, want, tol float64) bool { return math.Abs(have-want) <= tol*math.Abs(want) }

func TestClosedForms(t *testing.T) {
	inf := math.Log(50) // e^-t = 0.02
	for _, c := range []struct {
		name         string
		f            blas64.General
		period       float64
		keep         []bool
		settle, peak float64
	}{
		{"one pole", matrix(1, -2), 0, nil, inf / 2, 1},
		{"normal pair", matrix(2, -1, 30, -30, -1), 0, nil, inf, 1},
		{"stiff and normal", matrix(3, -1e6, 0, 0, 0, -1, 0, 0, 0, -1e3), 0, nil, inf, 1},
		// e^{Ft} = e^-t [1 a·t; 0 1] has the norm e^-t (b + √(b²+1)), b = a·t/2; with a = 20 the largest
		// at √(b²+1) = 10: b = √99, and at 0.02 where asinh(10 t) = t − ln 50
		{"double pole", matrix(2, -1, 20, 0, -1), 0, nil, 9.1268461838, math.Exp(-math.Sqrt(99)/10) * (math.Sqrt(99) + 10)},
		{"kept part", matrix(2, -1, 0, 0, -0.01), 0, []bool{true, false}, inf, 1},
		{"one pole, sampled", matrix(1, 0.5), 0.1, nil, 0.6, 1}, // 2^-6 < 0.02 < 2^-5
		{"alternating", matrix(1, -0.5), 0.1, nil, 0.6, 1},
		{"a million samples", matrix(1, 1-4e-6), 1, nil, math.Ceil(-math.Log(50) / math.Log1p(-4e-6)), 1},
		{"a million alternating", matrix(1, -1+4e-6), 1, nil, math.Ceil(-math.Log(50) / math.Log1p(-4e-6)), 1},
		{"gone at once", matrix(2, 0, 0, 0, 0), 0.5, nil, 0.5, 1},
		{"deadbeat", matrix(2, 0, 7, 0, 0), 0.5, nil, 1, 7},
	} {
		if c.name == "double pole" { // the root of its equation
			lo, hi := 5.0, 20.0
			for range 100 {
				if mid := (lo + hi) / 2; math.Asinh(10*mid)-mid > -math.Log(50) {
					lo = mid
				} else {
					hi = mid
				}
			}
			c.settle = lo
		}
		var s Solver
		settle, peak, err := s.Settle(c.f, c.period, c.keep)
		tol := 1e-5
		if c.period > 0 {
			tol = 1e-12
		}
		if err != nil || !near(settle, c.settle, tol) || !near(peak, c.peak, 1e-5) {
			t.Errorf("%s: settle %.9g, peak %.9g, %v; want %.9g, %.9g", c.name, settle, peak, err, c.settle, c.peak)
		}
	}
}

// stableMatrix draws a matrix whose eigenvalues have the spectral abscissa −1
// times a factor (or the radius, when discrete).
func stableMatrix(r *rand.Rand, n int, discrete bool) *mat.Dense {
	f := mat.NewDense(n, n, nil)
	f.Apply(func(_, _ int, _ float64) float64 { return r.NormFloat64() }, f)
	for range r.IntN(3) { // make it less normal
		i, k := r.IntN(n), r.IntN(n)
		if i != k {
			f.Set(i, k, f.At(i, k)*10)
		}
	}
	var e mat.Eigen
	e.Factorize(f, mat.EigenNone)
	if discrete {
		var radius float64
		for _, v := range e.Values(nil) {
			radius = max(radius, math.Hypot(real(v), imag(v)))
		}
		f.Scale((0.2+0.78*r.Float64())/radius, f)
		return f
	}
	abscissa := math.Inf(-1)
	for _, v := range e.Values(nil) {
		abscissa = max(abscissa, real(v))
	}
	shift := abscissa + 0.1 + 2*r.Float64()
	for i := range n {
		f.Set(i, i, f.At(i, i)-shift)
	}
	return f
}

// plain walks in equal small steps.
func plain(f *mat.Dense, keep []bool, step float64, total int) (last int, peak float64) {
	n, _ := f.Dims()
	x := mat.NewDense(n, n, nil)
	for i := range n {
		x.Set(i, i, 1)
	}
	var g mat.Dense
	g.CloneFrom(f)
	if step > 0 {
		g.Scale(step, f)
		g.Exp(&g)
	}
	var kept []int
	for i := range n {
		if keep == nil || keep[i] {
			kept = append(kept, i)
		}
	}
	for k := 0; k < total; k++ {
		part := mat.NewDense(len(kept), len(kept), nil)
		for i, a := range kept {
			for j, b := range kept {
				part.Set(i, j, x.At(a, b))
			}
		}
		var svd mat.SVD
		svd.Factorize(part, mat.SVDNone)
		v := svd.Values(nil)[0]
		peak = max(peak, v)
		if v > Level {
			last = k
		}
		x.Mul(&g, x)
	}
	return last, peak
}

func TestAgainstPlainSteps(t *testing.T) {
	var s Solver
	var worstSettle, worstPeak float64
	for seed := range uint64(60) {
		r := rand.New(rand.NewPCG(seed, 3))
		n := 1 + r.IntN(6)
		f := stableMatrix(r, n, true)
		var keep []bool
		if r.IntN(3) == 0 {
			keep = make([]bool, n)
			for i := range keep {
				keep[i] = i == 0 || r.IntN(2) == 0
			}
		}
		settle, peak, err := s.Settle(f.RawMatrix(), 1, keep)
		last, want := plain(f, keep, 0, 1000)
		if err != nil || settle != float64(last+1) || !near(peak, want, 1e-5) {
			t.Errorf("discrete %d, n = %d: settle %v, peak %v, %v; want %v, %v", seed, n, settle, peak, err, last+1, want)
		}

		f = stableMatrix(r, n, false)
		settle, peak, err = s.Settle(f.RawMatrix(), 0, keep)
		if err != nil {
			t.Fatal(err)
		}
		const total = 1000
		step := settle * 1.5 / total
		last, want = plain(f, keep, step, total)
		worstPeak = max(worstPeak, want/peak-1)
		worstSettle = max(worstSettle, float64(last)*step/settle-1)
		if peak < want*(1-1e-5) || peak > want*1.01 && total*step < 20 {
			t.Errorf("continuous %d, n = %d: peak %v, want %v", seed, n, peak, want)
		}
		if settle < float64(last)*step*(1-1e-6) || settle > float64(last+1)*step {
			t.Errorf("continuous %d, n = %d: settle %v, want %v to %v", seed, n, settle, float64(last)*step, float64(last+1)*step)
		}
	}
	t.Logf("short of the plain walk by %.2g in settle time, %.2g in peak", worstSettle, worstPeak)
}

// TestWeakAlternation has a slow smooth mode that lets the steps grow and a
// slow alternating one, faint in what is kept, that must not hide in them.
func TestWeakAlternation(t *testing.T) {
	var s Solver
	for seed := range uint64(20) {
		r := rand.New(rand.NewPCG(seed, 5))
		f := mat.NewDense(3, 3, []float64{
			0.9 + 0.09*r.Float64(), r.NormFloat64(), r.NormFloat64(),
			0, -0.9 - 0.09*r.Float64(), 0.05 * r.NormFloat64(),
			0, 0, 0.5 * r.Float64()})
		keep := []bool{true, false, seed%2 == 0}
		settle, peak, err := s.Settle(f.RawMatrix(), 1, keep)
		last, want := plain(f, keep, 0, 1200)
		if err != nil || settle != float64(last+1) || !near(peak, want, 1e-5) {
			t.Errorf("seed %d: settle %v, peak %v, %v; want %v, %v", seed, settle, peak, err, last+1, want)
		}
	}
}

// TestLightDamping looks at what the settle time of a faintly damped mode must
// do: grow as 1/damping, at all lengths of the search.
func TestLightDamping(t *testing.T) {
	var s Solver
	for _, z := range []float64{1e-2, 1e-3, 1e-4, 1e-5, 1e-6} {
		// normal, so that the norm is exp(−z t), with a faster mode beside it
		settle, peak, err := s.Settle(matrix(3, -z, 2, 0, -2, -z, 0, 0, 0, -3), 0, nil)
		if err != nil || !near(settle, math.Log(50)/z, 2e-5) || !near(peak, 1, 1e-5) {
			t.Errorf("damping %v: settle %v, peak %v, %v; want %v", z, settle, peak, err, math.Log(50)/z)
		}
		// a position and speed of unlike scale: the norm swings between exp(−z t) and ten times that
		settle, _, err = s.Settle(matrix(2, -z, 10, -0.1, -z), 0, nil)
		want := math.Log(500) / z // of the envelope; the last swing ends up to a quarter turn earlier
		if err != nil || settle > want*(1+2e-5) || settle < want-math.Pi {
			t.Errorf("damping %v, unlike scales: settle %v, %v; want %v", z, settle, err, want)
		}
	}
}

func TestRefuses(t *testing.T) {
	var s Solver
	nan := math.NaN()
	for _, c := range []struct {
		f      blas64.General
		period float64
		keep   []bool
		want   error
	}{
		{blas64.General{}, 0, nil, ErrShape},
		{blas64.General{Rows: 2, Cols: 1, Stride: 1, Data: []float64{1, 2}}, 0, nil, ErrShape},
		{blas64.General{Rows: 2, Cols: 2, Stride: 2, Data: []float64{1, 2}}, 0, nil, ErrShape},
		{matrix(1, -1), 0, []bool{true, false}, ErrShape},
		{matrix(1, nan), 0, nil, ErrNotFinite},
		{matrix(1, -1), nan, nil, ErrNotFinite},
		{matrix(1, -1), -1, nil, ErrNotFinite},
		{matrix(1, 0), 0, nil, ErrUnstable},
		{matrix(1, 1), 0, nil, ErrUnstable},
		{matrix(2, 0, 1, -1, 0), 0, nil, ErrUnstable},
		{matrix(1, 1), 1, nil, ErrUnstable},
		{matrix(1, -1), 1, nil, ErrUnstable},
		{matrix(1, -1.5), 1, nil, ErrUnstable},
		{matrix(2, 0.5, 0, 0, 1e120), 1, nil, ErrUnstable},
	} {
		settle, peak, err := s.Settle(c.f, c.period, c.keep)
		if !errors.Is(err, c.want) || !math.IsNaN(settle) || !math.IsNaN(peak) {
			t.Errorf("%v, %v: %v, %v, %v, want %v", c.f.Data, c.period, settle, peak, err, c.want)
		}
	}
}

func TestPaddedRows(t *testing.T) {
	var s Solver
	nan := math.NaN()
	f := blas64.General{Rows: 2, Cols: 2, Stride: 3, Data: []float64{0, 7, nan, 0, 0.5}}
	settle, peak, err := s.Settle(f, 1, nil)
	want, top, _ := s.Settle(matrix(2, 0, 7, 0, 0.5), 1, nil)
	if err != nil || settle != want || peak != top || f.Data[1] != 7 {
		t.Errorf("%v, %v, %v; want %v, %v", settle, peak, err, want, top)
	}
}

func TestNoAllocation(t *testing.T) {
	for _, n := range []int{2, 4, 10} {
		for _, period := range []float64{0, 0.1} {
			f := stableMatrix(rand.New(rand.NewPCG(7, uint64(n))), n, period > 0).RawMatrix()
			var s Solver
			if got := testing.AllocsPerRun(5, func() {
				if _, _, err := s.Settle(f, period, nil); err != nil {
					t.Fatal(err)
				}
			}); got != 0 {
				t.Errorf("n = %d, period %v: %v allocations", n, period, got)
			}
		}
	}
}

var sink float64

// designed is an error matrix as a design leaves it: poles of good damping, from
// 1 to 5 rad/s, in coordinates of condition 10 or so; exp(F/4) of it when
// discrete.
func designed(n int, discrete bool) *mat.Dense {
	r := rand.New(rand.NewPCG(7, uint64(n)))
	f, v := mat.NewDense(n, n, nil), mat.NewDense(n, n, nil)
	for i := 0; i < n; i += 2 {
		w := 1 + 4*float64(i)/float64(n)
		f.Set(i, i, -0.7*w)
		if i+1 < n {
			f.Set(i+1, i+1, -0.7*w)
			f.Set(i, i+1, 0.7*w)
			f.Set(i+1, i, -0.7*w)
		}
	}
	for i := range n {
		for k := range n {
			v.Set(i, k, r.NormFloat64()/math.Sqrt(float64(n)))
		}
		v.Set(i, i, v.At(i, i)+1.5)
	}
	var vf, inverse mat.Dense
	if inverse.Inverse(v) != nil {
		panic("singular")
	}
	vf.Mul(v, f)
	f.Mul(&vf, &inverse)
	if discrete {
		f.Scale(0.25, f)
		f.Exp(f)
	}
	return f
}

func BenchmarkSettle(b *testing.B) {
	for _, n := range []int{4, 6, 10, 20, 50} {
		for name, period := range map[string]float64{"continuous": 0, "discrete": 0.25} {
			b.Run(fmt.Sprintf("%s/%d", name, n), func(b *testing.B) {
				f := designed(n, period > 0).RawMatrix()
				var s Solver
				if _, _, err := s.Settle(f, period, nil); err != nil {
					b.Fatal(err)
				}
				b.ReportAllocs()
				for b.Loop() {
					v, _, err := s.Settle(f, period, nil)
					if err != nil {
						b.Fatal(err)
					}
					sink = v
				}
			})
		}
	}
}
