package views_test

import (
	"math"
	"math/cmplx"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/estimator/sweep"
	"polewright/plants/library"
	"polewright/ui/desk"
	"polewright/ui/desk/desktest"
	"polewright/ui/plane/targets"
	"polewright/ui/views"
)

// Every mode of every built-in plant: its direction is an eigenvector of unit
// length, and one that the sensors do not see gives no reading.
func TestDirectionsAreEigenvectors(t *testing.T) {
	for _, name := range library.Names() {
		m := desktest.Bench(t, name).Model
		n, _, p := m.Dims()
		d, err := estimator.NewDesigner(m, estimator.Options{})
		if err != nil {
			t.Fatal(err)
		}
		size := mat.Norm(m.A, 2)
		for _, mode := range d.Analysis().Observability.Modes {
			v := views.Direction(m, mode.Eigenvalue)
			if len(v) != n {
				t.Fatalf("%s: %d parts", name, len(v))
			}
			var length, residual, reading float64
			for i := range n {
				length += real(v[i] * cmplx.Conj(v[i]))
				sum := -mode.Eigenvalue * v[i]
				for j := range n {
					sum += complex(m.A.At(i, j)*m.StateScale[j]/m.StateScale[i], 0) * v[j]
				}
				residual += real(sum * cmplx.Conj(sum))
			}
			for i := range p {
				var sum complex128
				for j := range n {
					sum += complex(m.C.At(i, j)*m.StateScale[j], 0) * v[j]
				}
				reading += cmplx.Abs(sum)
			}
			if math.Abs(length-1) > 1e-12 || math.Sqrt(residual) > 1e-6*size {
				t.Errorf("%s, mode %v: length² %v, residual %v", name, mode.Eigenvalue, length, math.Sqrt(residual))
			}
			if !mode.Observable && reading > 1e-6 {
				t.Errorf("%s, mode %v that nobody sees reads %v", name, mode.Eigenvalue, reading)
			}
		}
	}
}

// Two equal, separate tanks and a sensor on their sum: of all combinations only
// the difference is not seen, which no eigenvector routine would pick.
func TestDirectionAmongSeveralIsTheLeastSeen(t *testing.T) {
	m := &estimator.Model{A: mat.NewDense(2, 2, []float64{-1, 0, 0, -1}), C: mat.NewDense(1, 2, []float64{1, 1}),
		Q: mat.NewSymDense(2, []float64{1, 0, 0, 1}), R: mat.NewSymDense(1, []float64{1})}
	v := views.Direction(m, -1)
	if len(v) != 2 || cmplx.Abs(v[0]+v[1]) > 1e-9 {
		t.Errorf("direction %v, expected the difference", v)
	}
	if views.Direction(m, cmplx.NaN()) != nil || views.Direction(nil, -1) != nil || views.Direction(&estimator.Model{}, -1) != nil {
		t.Error("a direction from nothing")
	}
}

// What the sensors and the process give adds up, and without process noise it is
// the sensors alone.
func TestSharesOfNoiseAddUp(t *testing.T) {
	for _, name := range library.Names() {
		b := desktest.Bench(t, name)
		for _, form := range []estimator.Form{estimator.Prediction, estimator.Current} {
			if form == estimator.Current && !b.Model.Discrete() {
				continue
			}
			sharesAddUp(t, name, b, estimator.Options{Form: form})
		}
	}
}

func sharesAddUp(t *testing.T, name string, b *desk.Bench, o estimator.Options) {
	_, _, d := desktest.Start(t, b, o)
	quiet := *b.Model
	quiet.Q = mat.NewSymDense(quiet.Q.SymmetricDim(), nil)
	silent, err := estimator.NewDesigner(&quiet, o)
	if err != nil {
		t.Fatal(err)
	}
	same, err := silent.Judge(estimator.Given{L: d.Gain, Lf: d.GainCurrent})
	if err != nil {
		t.Fatal(err)
	}
	sensor, process := views.Shares(b.Model, d)
	for i, std := range d.Noise.Std {
		only := 0.0
		for _, v := range sensor.RawRowView(i) {
			only = math.Hypot(only, v)
		}
		tiny := 1e-9 * b.Model.StateScale[i] // a delay register is exact but for rounding
		if sum := math.Hypot(only, process[i]); !(math.Abs(sum-std) <= 1e-8*std+tiny) {
			t.Errorf("%s, form %d, state %d: parts give %v, expected %v", name, o.Form, i, sum, std)
		}
		if want := same.Noise.Std[i]; !(math.Abs(only-want) <= 1e-6*std+tiny) {
			t.Errorf("%s, form %d, state %d: sensors give %v, without process noise it is %v", name, o.Form, i, only, want)
		}
	}
}

func TestSharesOfCorrelatedSensorsAreNotMadeUp(t *testing.T) {
	b := desktest.Bench(t, "balancer")
	_, _, d := desktest.Start(t, b, estimator.Options{})
	m := *b.Model
	m.R = mat.NewSymDense(2, []float64{m.R.At(0, 0), 1e-9, 1e-9, m.R.At(1, 1)})
	if _, process := views.Shares(&m, d); !math.IsNaN(process[0]) {
		t.Errorf("process share %v", process)
	}
}

// Without its inclinometer the balancer cannot be watched, without the tachometer
// it can (its plant file's note, and the rank of [C; CA; CA²]).
func TestUnplugging(t *testing.T) {
	b := desktest.Bench(t, "balancer")
	if s := views.See(b, estimator.Prediction, []bool{true, false}); s.Err != nil || s.Analysis.Observability.Rank != 3 {
		t.Errorf("inclinometer alone: %+v", s)
	}
	if s := views.See(b, estimator.Prediction, []bool{false, true}); s.Err != nil || s.Analysis.Observability.Rank != 1 || len(s.Analysis.Observability.Fixed) != 2 {
		t.Errorf("tachometer alone: %+v", s)
	}
	if s := views.See(b, estimator.Prediction, []bool{false, false}); s.Err == nil {
		t.Error("no sensor is no error")
	}
}

func TestWalkingSkipsWhatHasNoPlace(t *testing.T) {
	point := func(k, settle, over float64) sweep.Point {
		return sweep.Point{Factor: k, Design: &estimator.Design{Transient: estimator.Transient{Settle: settle},
			Noise: estimator.Noise{Std: []float64{1}, OverFloorRMS: over}}}
	}
	list := []sweep.Point{point(0.25, 4, 2), {Factor: 0.5, Err: sweep.ErrSampling}, {Factor: 1, Err: sweep.ErrSampling},
		point(1.9, math.NaN(), 1), point(2.5, 1, 1), point(4, 1, math.Inf(1))}
	if at := views.Unchanged(list); at != 4 {
		t.Errorf("starts at %d", at)
	}
	if at := views.Along(list, 4, -1); at != 0 {
		t.Errorf("back leads to %d", at)
	}
	if at := views.Along(list, 4, 1); at != 4 {
		t.Errorf("beyond the end leads to %d", at)
	}
	if at := views.Unchanged(list[1:4]); at != -1 {
		t.Errorf("nothing has a place, but %d", at)
	}
	f := views.Tradeoff{Scaling: list, At: 1}
	if _, ok := f.Point(); ok {
		t.Error("a point without a place is under the cursor")
	}
}

func TestSeveralSensorsLostAtOnce(t *testing.T) {
	b := bench()
	b.Model.C, b.Model.SensorNames = mat.NewDense(3, 1, []float64{1, 1, 1}), []string{"ruler", "tape", "laser"}
	f := views.Sensors{Bench: b, Plane: targets.S, Plugged: []bool{false, true, false},
		Design: &estimator.Design{SensorSets: []estimator.SensorSet{{Lost: []int{0}, Stable: true}, {Lost: []int{2}}, {Lost: []int{0, 2}}}}}
	seen := &views.Seen{Model: &estimator.Model{A: b.Model.A, C: mat.NewDense(1, 1, []float64{1}), SensorNames: []string{"tape"}, StateNames: b.Model.StateNames},
		Analysis: &estimator.Analysis{Observability: estimator.Observability{Rank: 1}, FloorReason: "none here"}}
	f.All, f.Rest = seen, seen
	all := text(f.Lines(80, plain))
	for _, must := range []string{"this design stays stable without it", "this design is UNSTABLE without it", "UNSTABLE without all of them", "tape would see"} {
		if !strings.Contains(all, must) {
			t.Errorf("nothing about %q:\n%s", must, all)
		}
	}
}
