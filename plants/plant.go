package plants

import "gonum.org/v1/gonum/mat"

// Plant is a checked plant file. It is immutable: nobody changes it, nor what
// its fields point to, after Parse.
type Plant struct {
	Name, Note string
	// Continuous is the time of the file's matrices. Period is the sample period
	// in s; 0 means a continuous design, never so where Continuous is false.
	Continuous bool
	Period     float64

	Parameters []Parameter // by name
	States     []State
	Inputs     []Input
	Sensors    []Sensor // all, also the disabled ones
	Outputs    []Output
	Unknowns   []Unknown

	// K is m×n on the plant's own states, nil without feedback. Cancel names the
	// inputs whose estimated input-offset is subtracted as well.
	K      *mat.Dense
	Cancel []string

	file          string    // as the user named it, for errors
	a, b, c, d, g [][]entry // b without columns for no inputs; d nil: zero; g nil: identity
	process       *mat.SymDense
	sensorNoise   *mat.SymDense // p×p; nil: the sensors' own figures
}

// Parameter is a number of the plant that matrix entries refer to.
type Parameter struct {
	Name, Unit string
	Value      float64
	Tolerance  float64 // relative, ±
}

// Range is what a signal can reach, as absolute values.
type Range struct{ Low, High float64 }

// State is one state of the plant itself.
type State struct {
	Name, Unit string
	Scale      float64 // typical size, > 0
	Operating  float64 // absolute value at zero deviation
}

// Input is one actuator.
type Input struct {
	Name, Unit   string
	Scale        float64
	Operating    float64
	DelaySamples int
	Lag          float64 // s, 0 without
	Resolution   float64 // 0 without
	Range        *Range  // nil: unlimited
}

// Sensor is one measurement.
type Sensor struct {
	Name, Unit   string
	Scale        float64
	Operating    float64
	NoiseStd     *float64 // of one sample; nil where not given
	NoiseDensity *float64 // two-sided, unit²·s; nil where not given
	// Resolution is the quantisation step, 0 without. NoiseIncludesResolution
	// says that the noise figure was measured behind the quantiser.
	Resolution              float64
	NoiseIncludesResolution bool
	Range                   *Range  // nil: unlimited
	Wrap                    float64 // innovations are taken modulo this; 0 without
	DelaySamples            int
	Lag                     float64 // s, 0 without
	Enabled                 bool
}

// Output is a combination of states that is judged like a state.
type Output struct {
	Name, Unit string
	Row        []float64 // n entries
}

// Kind of an unknown.
type Kind string

// The kinds of unknowns that an estimator can carry.
const (
	InputOffset  Kind = "input-offset"
	SensorOffset Kind = "sensor-offset"
	InputRamp    Kind = "input-ramp"
	InputSine    Kind = "input-sine"
)

// Unknown is what the model leaves out and the estimator finds by itself.
type Unknown struct {
	Kind      Kind
	On        string  // name of the input or sensor
	Index     int     // of that input or sensor
	Drift     float64 // density of the white noise that drives it, > 0
	Scale     float64
	Frequency float64 // Hz, input-sine only
}

// Enabled has one entry per sensor, true for those that the file has in use. The
// list belongs to the caller.
func (p *Plant) Enabled() []bool {
	on := make([]bool, len(p.Sensors))
	for i, s := range p.Sensors {
		on[i] = s.Enabled
	}
	return on
}

// StateIndex finds a state by its name.
func (p *Plant) StateIndex(name string) (int, bool) {
	return index(p.States, name, func(s State) string { return s.Name })
}

// InputIndex finds an input by its name.
func (p *Plant) InputIndex(name string) (int, bool) {
	return index(p.Inputs, name, func(s Input) string { return s.Name })
}

// SensorIndex finds a sensor by its name, also a disabled one.
func (p *Plant) SensorIndex(name string) (int, bool) {
	return index(p.Sensors, name, func(s Sensor) string { return s.Name })
}

// OutputIndex finds an output by its name.
func (p *Plant) OutputIndex(name string) (int, bool) {
	return index(p.Outputs, name, func(s Output) string { return s.Name })
}

// ParameterIndex finds a parameter by its name.
func (p *Plant) ParameterIndex(name string) (int, bool) {
	return index(p.Parameters, name, func(s Parameter) string { return s.Name })
}

func index[T any](list []T, name string, of func(T) string) (int, bool) {
	for i, item := range list {
		if of(item) == name {
			return i, true
		}
	}
	return -1, false
}
