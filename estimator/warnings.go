package estimator

import (
	"fmt"
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/mat"
)

func name(list []string, letter string, i int) string {
	if i < len(list) {
		return list[i]
	}
	return fmt.Sprintf("%s%d", letter, i+1)
}

func (d *Designer) inputName(i int) string { return name(d.model.InputNames, "u", i) }

// warn adds the sentences that a reader of the figures should know.
func (d *Designer) warn(out *Design) {
	say := func(format string, args ...any) {
		out.Warnings = append(out.Warnings, fmt.Sprintf(format, args...))
	}
	m := d.model
	if !out.Stable {
		say("the estimator is unstable: its noise and its transient are not defined")
	}
	if d.analysis.Floor == nil {
		say("%s", d.analysis.FloorReason)
	}
	if out.WorstError > 1e-6 {
		say("the poles are reached only to a relative error of %.2g", out.WorstError)
	}
	if math.IsNaN(out.EigenvectorCondition) {
		say("A − LC has fewer eigenvectors than states: their conditioning is not defined")
	}
	if m.Discrete() && out.GainCurrent == nil {
		say("A is singular and no current-form gain Lf gives this L")
	}
	if zeroNoise(m.R) {
		say("a sensor has no noise at all: the figures promise more than a real sensor gives")
	}
	for j, step := range m.SensorStep {
		// step/√12 is the standard deviation that quantising adds; where it is most of
		// R, the sensor's error is no white noise.
		if v := m.R.At(j, j); m.Discrete() && j < d.p && step > 0 && step*step/12 > 0.8*v {
			say("%s resolves more coarsely than its noise: its error is a staircase, not the white noise that these figures assume", name(m.SensorNames, "y", j))
		}
	}
	if m.Discrete() {
		for _, v := range out.Wanted {
			if real(v) < 0 && imag(v) == 0 {
				say("the pole at z = %s is at the sampling limit: its error changes sign with every sample", formatPole(v))
				break
			}
		}
	}
	if mat.Norm(m.Q, 1) == 0 {
		say("there is no process noise: the best estimator would in time stop listening to the sensors")
	}
	if d.control != nil {
		d.warnLoop(say, out)
	}
}

func zeroNoise(r *mat.SymDense) bool {
	for i := range r.SymmetricDim() {
		if r.At(i, i) == 0 {
			return true
		}
	}
	return false
}

func (d *Designer) warnLoop(say func(string, ...any), out *Design) {
	control := slowest(d.control.closed, d.model.Discrete())
	estimate := slowest(out.Reached, d.model.Discrete())
	if out.Stable && estimate < control {
		say("the slowest pole of the estimator is slower than the controller's")
	}
	if !d.control.aloneStable {
		say("A − BK − LC is unstable: the controller with its estimator is unstable on its own, with the plant cut off")
	}
}

// slowest returns the rate at which the slowest of the poles dies out, per
// second or per sample.
func slowest(list []complex128, discrete bool) float64 {
	rate := math.Inf(1)
	for _, v := range list {
		r := -real(v)
		if discrete {
			r = -math.Log(cmplx.Abs(v))
		}
		rate = min(rate, r)
	}
	return rate
}
