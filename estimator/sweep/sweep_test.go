package sweep_test

import (
	"context"
	"errors"
	"math"
	"math/cmplx"
	"testing"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/estimator/sweep"
)

// integrator is x' = w, y = x + v with densities q and r; its floor has the gain
// √(q/r) and the covariance √(q r).
func integrator(q, r float64) *estimator.Model {
	one := func(v float64) *mat.Dense { return mat.NewDense(1, 1, []float64{v}) }
	return &estimator.Model{A: one(0), C: one(1), Q: mat.NewSymDense(1, []float64{q}), R: mat.NewSymDense(1, []float64{r})}
}

func designer(t *testing.T, m *estimator.Model) *estimator.Designer {
	t.Helper()
	d, err := estimator.NewDesigner(m, estimator.Options{})
	if err != nil {
		t.Fatal(err)
	}
	return d
}

// With the gain l the covariance is (q + l² r)/(2 l) and settling to 2 % takes
// ln 50 / l.
func TestSpeedsOfAnIntegratorByHand(t *testing.T) {
	const q, r = 4, 0.25
	m := integrator(q, r)
	d := designer(t, m)
	base, err := d.Place([]complex128{-4}, nil)
	if err != nil {
		t.Fatal(err)
	}
	points, err := sweep.Speeds(context.Background(), d, base, 0, sweep.Factors(4, 9))
	if err != nil {
		t.Fatal(err)
	}
	for _, p := range points {
		l := 4 * p.Factor
		over := math.Sqrt((q + l*l*r) / (2 * l) / math.Sqrt(q*r))
		if math.Abs(p.OverFloor()-over) > 1e-12*over {
			t.Errorf("at %g: noise %g over the floor, expected %g", p.Factor, p.OverFloor(), over)
		}
		if settle := math.Log(50) / l; math.Abs(p.Settle()-settle) > 1e-4*settle {
			t.Errorf("at %g: settles in %g, expected %g", p.Factor, p.Settle(), settle)
		}
	}
}

// With more sensors than needed the same poles have many gains: the point at 1 is
// the design itself, and its neighbours continue from it.
func TestSpeedsPassThroughTheDesign(t *testing.T) {
	m := &estimator.Model{
		A: mat.NewDense(2, 2, []float64{0, 1, -2, -0.3}), C: mat.NewDense(2, 2, []float64{1, 0, 0, 1}),
		Q: mat.NewSymDense(2, []float64{0.1, 0, 0, 1}), R: mat.NewSymDense(2, []float64{0.01, 0, 0, 0.5}),
	}
	d := designer(t, m)
	placed, err := d.Place([]complex128{-3, -5}, nil)
	if err != nil {
		t.Fatal(err)
	}
	skew := mat.NewDense(2, 2, []float64{3, 1 + 0.8, -2, 5 - 0.3}) // A - L C = [-3 -0.8; 0 -5]
	base, err := d.Judge(estimator.Given{L: skew})
	if err != nil {
		t.Fatal(err)
	}
	if math.Abs(base.Noise.OverFloorRMS/placed.Noise.OverFloorRMS-1) < 1e-3 {
		t.Fatal("the two gains do not differ: the test shows nothing")
	}
	base.Wanted = placed.Wanted
	points, err := sweep.Speeds(context.Background(), d, base, 0, sweep.Factors(2, 5))
	if err != nil {
		t.Fatal(err)
	}
	for i, p := range points {
		if p.Err != nil || (p.Design == base) != (i == 2) {
			t.Errorf("at %g: %v, the design itself: %v", p.Factor, p.Err, p.Design == base)
		}
	}
}

// A factor k on the process noise moves the floor's gain to √(k q/r).
func TestFloorsOfAnIntegratorByHand(t *testing.T) {
	const q, r = 4, 0.25
	points, err := sweep.Floors(context.Background(), integrator(q, r), estimator.Options{}, sweep.Factors(16, 5))
	if err != nil {
		t.Fatal(err)
	}
	for _, p := range points {
		if l := math.Sqrt(p.Factor * q / r); math.Abs(p.Design.Gain.At(0, 0)-l) > 1e-10*l {
			t.Errorf("at %g: gain %g, expected %g", p.Factor, p.Design.Gain.At(0, 0), l)
		}
		if over := p.OverFloor(); over < 1-1e-12 || p.Factor == 1 && over > 1+1e-9 {
			t.Errorf("at %g: noise %g over the floor", p.Factor, over)
		}
	}
}

func TestScale(t *testing.T) {
	z := func(s complex128) complex128 { return cmplx.Exp(s * 0.1) }
	got, err := sweep.Scale([]complex128{z(-2 + 3i), z(-2 - 3i), 0.5, 0, -0.25}, 2, 0.1)
	if err != nil {
		t.Fatal(err)
	}
	want := []complex128{z(-4 + 6i), z(-4 - 6i), 0.25, 0, -0.0625}
	for i := range want {
		if cmplx.Abs(got[i]-want[i]) > 1e-15 {
			t.Errorf("pole %d: %v, expected %v", i, got[i], want[i])
		}
	}
	if got[1] != cmplx.Conj(got[0]) {
		t.Error("the pair is no longer a pair")
	}
	if _, err := sweep.Scale([]complex128{z(-2 + 20i), z(-2 - 20i)}, 2, 0.1); !errors.Is(err, sweep.ErrSampling) {
		t.Errorf("got %v", err)
	}
	for _, k := range []float64{0, -1, math.NaN(), math.Inf(1)} {
		if _, err := sweep.Scale(nil, k, 0); err == nil {
			t.Errorf("a factor of %g was taken", k)
		}
	}
}

func TestCancelKeepsWhatIsThere(t *testing.T) {
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	m := integrator(1, 1)
	d := designer(t, m)
	base, err := d.Place([]complex128{-2}, nil)
	if err != nil {
		t.Fatal(err)
	}
	points, err := sweep.Speeds(ctx, d, base, 0, sweep.Factors(2, 3))
	if !errors.Is(err, context.Canceled) || len(points) != 3 || points[0].Err == nil {
		t.Errorf("got %v, %v", points, err)
	}
	if points, err = sweep.Floors(ctx, m, estimator.Options{}, sweep.Factors(2, 3)); !errors.Is(err, context.Canceled) || points[2].Err == nil {
		t.Errorf("got %v, %v", points, err)
	}
}
