package scenarios

import (
	"context"
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"

	"polewright/plants"
)

// drum is a continuous plant without a sample period.
const drum = `
format = 1
name = "Drum"
[model]
time = "continuous"
A = [[0, 1], [4, -0.5]]
B = [[0], [1]]
C = [[1, 0], [0, 1]]
D = [[0], [0.2]]
[[states]]
name = "turn"
[[states]]
name = "speed"
[[inputs]]
name = "drive"
[[sensors]]
name = "scale"
noise_density = 1e-6
[[sensors]]
name = "tacho"
noise_density = 4e-6
[process_noise]
density = [0, 1e-3]
[feedback]
K = [[12.0, 4.0]]
`

var drumGain = mat.NewDense(2, 2, []float64{6, 1, 10, 3})

// errorAt is exp((A − L C) t) e0 with the columns of lost sensors zero.
func errorAt(p *plants.Plant, t *testing.T, lost []int, at float64, e0 []float64) []float64 {
	m := modelOf(t, p)
	l := mat.DenseCopyOf(drumGain)
	for _, j := range lost {
		l.SetCol(j, []float64{0, 0})
	}
	var f, e mat.Dense
	f.Mul(l, m.C)
	f.Sub(m.A, &f)
	f.Scale(at, &f)
	e.Exp(&f)
	var x mat.VecDense
	x.MulVec(&e, mat.NewVecDense(2, e0))
	return x.RawVector().Data
}

// Whatever the loop and the drives do, the error of an exact model is
// exp((A − L C) t) times the first one, at any step.
func TestContinuousErrorIsExact(t *testing.T) {
	p := plantOf(t, drum)
	for _, step := range []string{"0.05", "0.2"} {
		for _, loop := range []string{"open", "closed"} {
			s := scenarioOf(t, p, `
duration_s = 2
step_s = `+step+`
loop = "`+loop+`"
initial = { true = [0.3, 0], estimate = [0, 0.1] }
drive = [{ input = "drive", shape = "step", at_s = 0.4, size = 3 }]
`+quiet)
			run := runOf(t, p, s, Gain{L: drumGain})
			for k, at := range run.T {
				want := errorAt(p, t, nil, at, []float64{0.3, -0.1})
				for i := range want {
					near(t, loop+" loop, error", run.True[i][k]-run.Estimate[i][k], want[i], 1e-11*math.Exp(2*at))
				}
			}
		}
	}
}

func TestContinuousDropout(t *testing.T) {
	p := plantOf(t, drum)
	s := scenarioOf(t, p, `
duration_s = 1
step_s = 0.1
initial = { true = [0.3, 0] }
fault = [{ sensor = "tacho", kind = "dropout", from_s = 0 }]
`+quiet)
	run := runOf(t, p, s, Gain{L: drumGain})
	for k, at := range run.T {
		want := errorAt(p, t, []int{1}, at, []float64{0.3, 0})
		near(t, "error", run.True[0][k]-run.Estimate[0][k], want[0], 1e-11)
	}
}

func TestContinuousClosedLoopIsExact(t *testing.T) {
	p := plantOf(t, drum)
	s := scenarioOf(t, p, "duration_s = 2\nstep_s = 0.1\n[initial]\ntrue = [0.3, 0]\nestimate = [0.3, 0]\n"+quiet)
	run := runOf(t, p, s, Gain{L: drumGain})
	m := modelOf(t, p)
	var f, e mat.Dense
	f.Mul(m.B, m.K)
	f.Sub(m.A, &f)
	f.Scale(2, &f)
	e.Exp(&f)
	near(t, "turn at the end", run.True[0][20], 0.3*e.At(0, 0), 1e-12)
	near(t, "speed at the end", run.True[1][20], 0.3*e.At(1, 0), 1e-12)
}

func TestContinuousNoiseHasTheCovarianceOfTheModel(t *testing.T) {
	p := plantOf(t, drum)
	m := modelOf(t, p)
	s := scenarioOf(t, p, "duration_s = 2000\nstep_s = 0.01")
	run := runOf(t, p, s, Gain{L: drumGain})
	// F P + P Fᵀ + G Q Gᵀ + L R Lᵀ = 0 for two states, as three equations.
	var f, w, lr mat.Dense
	f.Mul(drumGain, m.C)
	f.Sub(m.A, &f)
	lr.Mul(drumGain, m.R)
	w.Mul(&lr, drumGain.T())
	w.Set(1, 1, w.At(1, 1)+1e-3)
	a, b, c, d := f.At(0, 0), f.At(0, 1), f.At(1, 0), f.At(1, 1)
	var x mat.VecDense
	if err := x.SolveVec(mat.NewDense(3, 3, []float64{2 * a, 2 * b, 0, c, a + d, b, 0, 2 * c, 2 * d}),
		mat.NewVecDense(3, []float64{-w.At(0, 0), -w.At(0, 1), -w.At(1, 1)})); err != nil {
		t.Fatal(err)
	}
	for i, want := range []float64{x.AtVec(0), x.AtVec(2)} {
		var sum float64
		for k := range run.T {
			e := run.True[i][k] - run.Estimate[i][k]
			sum += e * e
		}
		// Some thousand independent values: 15 % is about five standard errors.
		if have := sum / float64(len(run.T)); math.Abs(have/want-1) > 0.15 {
			t.Errorf("state %d: variance %g, want %g", i+1, have, want)
		}
	}
}

func TestContinuousStepIsChosen(t *testing.T) {
	p := plantOf(t, drum)
	s := Default(p)
	// |λ| of A are 1.766 and 2.266: eight slow time constants.
	near(t, "duration", s.Duration, 8/1.766, 0.01)
	r, err := NewRunner(p, modelOf(t, p), s, nil)
	if err != nil {
		t.Fatal(err)
	}
	near(t, "step", r.Step(), s.Duration/1000, 1e-12)
	if run, err := r.Run(context.Background(), Gain{L: drumGain}); err != nil || len(run.T) != 1001 || run.Diverged {
		t.Errorf("%v, %d samples", err, len(run.T))
	}
}
