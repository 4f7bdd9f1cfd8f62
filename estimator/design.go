package estimator

import (
	"gonum.org/v1/gonum/mat"

	"polewright/estimator/internal/placement"
)

// Form is the form in which a discrete estimator uses its newest sample.
type Form uint8

const (
	// Prediction uses the sample of this step for the estimate of the next. It
	// is the only form in continuous time.
	Prediction Form = iota
	// Current uses the sample of this step for the estimate of this step.
	Current
)

// Method chooses among the gains that several sensors leave for the same poles.
type Method uint8

const (
	// Robust takes the best-conditioned eigenvectors in the user's scaling.
	Robust Method = iota
	// LeastNoise takes the least steady-state noise at exactly these poles.
	LeastNoise
)

// Options of a Designer. The zero value is a robust design in prediction form.
type Options struct {
	Form   Form
	Method Method
	// Tolerance decides rank in the observability test, relative; if zero, 1e-12.
	Tolerance float64
}

// Analysis holds for every gain on one model and form.
type Analysis struct {
	Observability Observability
	Floor         *Floor // nil where no floor exists; FloorReason says why
	FloorReason   string
}

// Observability is judged in scaled coordinates: S⁻¹ A S and C S divided by the
// sensors' scales.
type Observability struct {
	Rank      int
	Tolerance float64 // relative, of the staircase
	Modes     []Mode
	// Fixed are the eigenvalues that no gain can move.
	Fixed []complex128
	// Gramian are the eigenvalues of the observability Gramian, ascending; nil
	// where A is not asymptotically stable.
	Gramian []float64
}

// Mode is one eigenvalue of A as the sensors see it.
type Mode struct {
	Eigenvalue complex128
	// Sigma is the smallest singular value of [A − λI; C] (Popov, Belevitch, Hautus).
	Sigma      float64
	Observable bool
}

// Floor is the steady-state Kalman filter of the same form: no linear estimator
// has less noise if the model and its noise figures are true.
type Floor struct {
	Covariance *mat.SymDense // n×n, of the chosen form
	Std        []float64     // root of its diagonal
	Gain       *mat.Dense    // n×p, prediction form
	Poles      []complex128  // eigenvalues of A − Gain·C
}

// Design is one estimator and its judgement. It is immutable: nobody changes it
// after it was returned, so it may be shared between goroutines. A figure that
// is not defined is NaN or nil, and Warnings says why.
type Design struct {
	Form   Form
	Method Method
	// Partial tells that Complete has still to add Noise.SensorToState, Noise.PeakGain,
	// Float32Shift, SensorSets and their warnings, to confirm the margins of Loop, and to take the
	// sensitivity of several inputs together.
	Partial bool

	// Wanted are the poles asked for in the model's own plane, nil for a gain
	// found elsewhere; Reached are the eigenvalues of F, in the order of Wanted
	// (matched one to one) where there is one.
	Wanted, Reached []complex128
	// WorstError is the largest distance between a wanted and its reached pole
	// over the size of the wanted one (over 1 where that is zero).
	WorstError float64

	Gain        *mat.Dense // n×p, prediction form
	GainCurrent *mat.Dense // n×p with A·GainCurrent = Gain; nil where there is none
	GainNorm    float64    // 2-norm of Gain
	// EigenvectorCondition is the 2-norm condition number of the unit-length
	// left eigenvectors of F in scaled coordinates; NaN where F is defective.
	EigenvectorCondition float64

	Stable    bool
	Noise     Noise
	Transient Transient
	Loop      *Loop // nil without feedback
	// Float32Shift is the largest relative movement of an eigenvalue of F when
	// A, L and C are rounded to float32; that of one within 0.01 of z = 0 is the
	// distance itself.
	Float32Shift float64
	SensorSets   []SensorSet
	Warnings     []string

	// branch is the choice among the gains for these poles that a next design
	// follows; nil where there is none.
	branch *placement.Warm
	frame  *frame // the same for a normal F
}

// Noise is the steady state of the estimation error of the chosen form. All
// fields are nil or NaN where F is not stable.
type Noise struct {
	Covariance    *mat.SymDense
	Std           []float64
	OverFloor     []float64 // per state, Std over the floor's; NaN where that is undefined
	OverFloorRMS  float64   // root mean square of the defined ones, delay registers left out
	Outputs       []OutputNoise
	SensorToState *mat.Dense // n×p: root of the steady-state variance per unit-intensity noise on one sensor
	PeakGain      []Peak     // per state, over the sensors
}

// OutputNoise is the noise on a combination of states.
type OutputNoise struct{ Std, FloorStd float64 }

// Peak is the largest gain over frequency and where it is, in rad/s.
type Peak struct{ Value, Frequency float64 }

// Transient describes how an initial error dies out, by the 2-norm of the
// scaled transition matrix S⁻¹ Φ(t) S with delay registers left out.
type Transient struct {
	Settle float64 // s after which the norm stays at or below 0.02; NaN where F is not stable
	Peak   float64 // largest norm; NaN where it grows without bound
}

// Loop describes the control loop broken at the plant input. Where the nominal
// loop is unstable only Poles is given and Stable is false.
type Loop struct {
	Stable bool
	Poles  []complex128 // of plant and estimator together, without the unknowns' own
	// GainMarginBelow < 0 < GainMarginAbove in dB; −Inf and +Inf where unlimited.
	GainMarginBelow, GainMarginAbove float64
	PhaseMargin                      float64 // degrees; +Inf where nothing crosses
	DelayMargin                      float64 // s; +Inf where unlimited
	DelayMarginSamples               int     // −1 in continuous time or where unlimited
	SensitivityPeak                  float64
	// Input is the index of the input with the worst margins, one at a time.
	Input int
	// InputStd is the noise on each actuator, u = −K x̂.
	InputStd []float64
}

// SensorSet is what is left when the sensors in Lost fail and their columns of
// L are set to zero: Stable where the error still dies out, by a relative margin of
// 1e-9.
type SensorSet struct {
	Lost   []int
	Stable bool
}
