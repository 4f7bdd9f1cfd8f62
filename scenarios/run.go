package scenarios

import (
	"math"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
)

// Gain is what a design gives to a run: L (n×p) of the prediction form or of
// continuous time, and Lf (n×p), which the current form alone needs.
type Gain struct {
	L, Lf *mat.Dense
	Form  estimator.Form
}

// Run is what happened. Signals are absolute values, one list of samples per
// signal; entry k of all is at T[k]. It is immutable unless it is handed to
// RunInto again; T and the names are shared between the runs of a Runner.
type Run struct {
	T []float64 // s

	// True has the real values of the plant's states, NaN where a fuller plant has
	// no state of that name.
	True [][]float64
	// Estimate has one entry per state of the design: x̂[k|k−1] in prediction form,
	// x̂[k|k] in current form.
	Estimate [][]float64
	// Innovations has one entry per sensor in use, 0 where a sample was lost.
	Innovations [][]float64
	// Inputs are what the actuators did and the estimator was told.
	Inputs [][]float64
	// Measured are the readings of the sensors in use, NaN where one was lost.
	Measured [][]float64
	// Others are the states of a fuller plant that the plant has not.
	Others [][]float64

	// Names in the order of the lists above.
	StateNames, EstimateNames, SensorNames, InputNames, OtherNames []string

	// Form is the form of the estimator.
	Form estimator.Form
	// Diverged tells that a value went beyond 1e12 times its scale; the run ends
	// before that.
	Diverged bool

	memory []float64
	lists  [][]float64
}

// names of the signals of a run.
type names struct{ states, others, estimates, sensors, inputs []string }

// lay divides the run's memory, its own from before where that suffices.
func (run *Run) lay(n *names, time []float64, form estimator.Form) {
	rows, p, m := len(time), len(n.sensors), len(n.inputs)
	signals := len(n.states) + len(n.others) + len(n.estimates) + 2*p + m
	if cap(run.memory) < signals*rows {
		run.memory = make([]float64, signals*rows)
	}
	if cap(run.lists) < signals {
		run.lists = make([][]float64, signals)
	}
	all, lists := run.memory[:signals*rows], run.lists[:signals]
	for i := range lists {
		lists[i] = all[i*rows : (i+1)*rows : (i+1)*rows]
	}
	take := func(count int) [][]float64 {
		part := lists[:count:count]
		lists = lists[count:]
		return part
	}
	run.T, run.Form, run.Diverged = time, form, false
	run.True, run.Others, run.Estimate = take(len(n.states)), take(len(n.others)), take(len(n.estimates))
	run.Innovations, run.Inputs, run.Measured = take(p), take(m), take(p)
	run.StateNames, run.OtherNames, run.EstimateNames = n.states, n.others, n.estimates
	run.SensorNames, run.InputNames = n.sensors, n.inputs
}

// cut keeps the first rows of all signals.
func (run *Run) cut(rows int) {
	run.T = run.T[:rows]
	for _, group := range [][][]float64{run.True, run.Others, run.Estimate, run.Innovations, run.Inputs, run.Measured} {
		for i := range group {
			group[i] = group[i][:rows]
		}
	}
}

// beyond finds the first row from first to before end in which a value is not
// finite or beyond 1e12 times its scale; end where there is none.
func (run *Run) beyond(first, end int, real, estimated []float64) int {
	check := func(list, bound []float64, scaleOf int) {
		for k := first; k < end; k++ {
			if !(math.Abs(list[k]) <= bound[scaleOf]) {
				end = k
				return
			}
		}
	}
	for i, list := range run.Estimate {
		check(list, estimated, i)
	}
	for i, list := range run.True {
		if !math.IsNaN(real[i]) {
			check(list, real, i)
		}
	}
	for i, list := range run.Others {
		check(list, real, len(run.True)+i)
	}
	for _, group := range [][][]float64{run.Innovations, run.Inputs} {
		for _, list := range group {
			for k := first; k < end; k++ {
				if math.IsNaN(list[k]) || math.IsInf(list[k], 0) {
					end = k
					break
				}
			}
		}
	}
	return end
}
