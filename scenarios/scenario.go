package scenarios

import (
	"math"

	"polewright/plants"
)

// Scenario is a checked scenario file. It is immutable after Parse.
type Scenario struct {
	Name     string
	Duration float64 // s
	// Step of a run in s, for continuous designs only; 0 lets NewRunner choose.
	Step float64
	// Closed tells u = drive − K x̂; else u = drive.
	Closed bool

	// InitialTrue and InitialEstimate are deviations from the operating point, one
	// per state of the (real) plant; nil is zeros. Lags, delays and unknowns start
	// at zero deviation.
	InitialTrue, InitialEstimate []float64

	Drives    []Drive // known to the estimator
	Surprises []Drive // not told to it

	// Factors multiply the real plant's parameters; TruthPlant is the file name of
	// a fuller plant, empty without. At most one of them is given.
	Factors    map[string]float64
	TruthPlant string

	Noise  Noise
	Faults []Fault
	Limits Limits

	file string // as the user named it
}

// Noise says how the run's noise is made.
type Noise struct {
	Seed            uint64
	Process, Sensor float64 // factors on the standard deviations, 0 turns it off
}

// Shape of a drive over time.
type Shape string

// The shapes of drives. The recorded shape "file" is not among them yet.
const (
	// Step is size from at_s on.
	Step Shape = "step"
	// Ramp grows by size per second from at_s and stays where it is from until_s.
	Ramp Shape = "ramp"
	// Pulse is size from at_s to before until_s.
	Pulse Shape = "pulse"
	// Sine is size·sin(2π frequency_hz (t − at_s)) from at_s to before until_s.
	Sine Shape = "sine"
	// Chirp is a sine whose frequency goes evenly from frequency_hz at at_s to to_hz at
	// until_s, the end of the run where that is not given.
	Chirp Shape = "chirp"
	// RandomBinary is +size or −size from at_s to before until_s, drawn anew
	// frequency_hz times a second, at every sample without a frequency.
	RandomBinary Shape = "random-binary"
)

// Drive is one signal on an input.
type Drive struct {
	Input string
	Index int // of the input in the plant
	Shape Shape
	At    float64 // s
	Until float64 // s; +Inf where not given
	Size  float64
	// Frequency and ToFrequency are in Hz; 0 where the shape has none.
	Frequency, ToFrequency float64
}

// FaultKind is what is wrong with a sensor for a while.
type FaultKind string

// The kinds of sensor faults.
const (
	// Dropout loses the samples: the estimator predicts through.
	Dropout FaultKind = "dropout"
	// Freeze repeats the last sample before from_s.
	Freeze FaultKind = "freeze"
	// Offset adds size before saturation and quantisation.
	Offset FaultKind = "offset"
	// Spike adds size to one sample, the first at or after from_s; it needs no until_s.
	Spike FaultKind = "spike"
)

// Fault is one sensor fault, from From to before Until.
type Fault struct {
	Sensor      string
	Index       int // of the sensor in the plant
	Kind        FaultKind
	From, Until float64 // s; Until is +Inf where not given
	Size        float64
}

// Limits are what a candidate must meet; nil is no limit.
type Limits struct {
	Settle, Peak, OverFloor, Gain         *float64
	Sensitivity, PhaseMargin, DelayMargin *float64
	Std, Error, InputStd                  []NamedLimit
}

// NamedLimit is a limit on one state, output or input.
type NamedLimit struct {
	Name  string
	Limit float64
}

// Any reports whether there is a limit at all.
func (l *Limits) Any() bool {
	for _, v := range []*float64{l.Settle, l.Peak, l.OverFloor, l.Gain, l.Sensitivity, l.PhaseMargin, l.DelayMargin} {
		if v != nil {
			return true
		}
	}
	return len(l.Std)+len(l.Error)+len(l.InputStd) > 0
}

// Default is a plain start-up run without limits: the plant stands at its
// operating point, nothing drives it but noise, and the estimate begins off by
// each state's scale. The loop is closed where the plant has feedback.
//
// It lasts 200 samples. Without a sample period it lasts eight times the slowest
// time constant of the plant, but not more than two hundred times the fastest,
// and ten seconds where the plant has none.
func Default(p *plants.Plant) *Scenario {
	s := &Scenario{
		Name: "Start-up", Closed: p.K != nil,
		Noise:           Noise{Seed: 1, Process: 1, Sensor: 1},
		InitialEstimate: make([]float64, len(p.States)),
	}
	for i, x := range p.States {
		s.InitialEstimate[i] = -x.Scale
	}
	if p.Period > 0 {
		s.Duration = 200 * p.Period
		return s
	}
	s.Duration = 10
	m, err := p.Model(plants.Options{WithoutUnknowns: true})
	if err != nil {
		return s
	}
	if slow, fast := rates(m.A); fast > 0 && slow > 0 {
		if d := math.Min(8/slow, 200/fast); d > 1e-300 && d < 1e300 {
			s.Duration = d
		}
	}
	return s
}
