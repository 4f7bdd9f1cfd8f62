package estimator

import (
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// Role says what a state of the design model stands for.
type Role uint8

const (
	// PlantState is a state of the plant itself.
	PlantState Role = iota
	// LagState is the state of a first-order lag of a sensor or an actuator.
	LagState
	// DelayRegister holds one sample of a whole-sample delay. Its error is
	// left out of the transient and of the noise ratio.
	DelayRegister
	// UnknownState is an added state for what the model leaves out: an offset,
	// a ramp, a sine. No input reaches it.
	UnknownState
)

// Model is the linear model an estimator is designed for and judged on.
// The matrices belong to the model once it is handed to NewDesigner; nobody may
// change them afterwards.
type Model struct {
	// Period is the sample period in seconds; zero means continuous time.
	Period float64

	A *mat.Dense    // n×n
	B *mat.Dense    // n×m; nil without inputs
	C *mat.Dense    // p×n
	D *mat.Dense    // p×m; nil is zero
	G *mat.Dense    // n×q; nil is the identity
	Q *mat.SymDense // q×q: density of the process noise, discrete: covariance per step
	R *mat.SymDense // p×p: density of the sensor noise, discrete: covariance per sample

	// StateScale and SensorScale are typical sizes, > 0; nil is all ones.
	StateScale  []float64
	SensorScale []float64

	// SensorStep are the quantisation steps of the sensors, nil or 0 without. They
	// are in R already; a warning compares the two.
	SensorStep []float64

	// Roles has one entry per state; nil means that all are plant states.
	Roles []Role

	// Outputs is r×n, one row per combination of states that is judged like a
	// state; nil without.
	Outputs *mat.Dense

	// K is m×n, the controller u = −K x̂ that will use the estimate; nil without.
	// Columns of lag, delay and unknown states are zero but for an input offset
	// that the controller subtracts.
	K *mat.Dense

	// Names for the sentences of warnings; nil gives x1.., u1.., y1...
	StateNames, InputNames, SensorNames, OutputNames []string
}

// Errors of the shape and content of a model.
var (
	// ErrShape reports matrices whose sizes do not fit together.
	ErrShape = errors.New("sizes do not fit")
	// ErrNotFinite reports a NaN or an infinity where a number is needed.
	ErrNotFinite = errors.New("not a finite number")
	// ErrNoise reports a noise matrix that is no covariance.
	ErrNoise = errors.New("not a covariance")
)

// Discrete reports whether the model is in discrete time.
func (m *Model) Discrete() bool { return m.Period > 0 }

// Dims returns the numbers of states, inputs and sensors.
func (m *Model) Dims() (states, inputs, sensors int) {
	states, _ = m.A.Dims()
	sensors, _ = m.C.Dims()
	if m.B != nil {
		_, inputs = m.B.Dims()
	}
	return states, inputs, sensors
}

// Check reports the first thing that makes the model unusable: a missing or
// mis-shaped matrix (ErrShape), a number that is not finite (ErrNotFinite) or beyond
// 1e100 (ErrRange), or a Q or R that is not a covariance (ErrNoise).
func (m *Model) Check() error {
	if m == nil || m.A == nil || m.C == nil || m.A.IsEmpty() || m.C.IsEmpty() {
		return fmt.Errorf("A and C are needed and must not be empty: %w", ErrShape)
	}
	if math.IsNaN(m.Period) || math.IsInf(m.Period, 0) || m.Period < 0 {
		return fmt.Errorf("period %g s: %w", m.Period, ErrNotFinite)
	}
	if m.Period > mostGiven || m.Period != 0 && m.Period < 1/mostGiven {
		return fmt.Errorf("period %g s: %w", m.Period, ErrRange)
	}
	n, inputs, p := m.Dims()
	q := n
	if m.G != nil {
		_, q = m.G.Dims()
	}
	shapes := []struct {
		name       string
		have       mat.Matrix
		absent     bool
		rows, cols int
	}{
		{"A", m.A, false, n, n},
		{"B", m.B, m.B == nil, n, inputs},
		{"C", m.C, false, p, n},
		{"D", m.D, m.D == nil, p, inputs},
		{"G", m.G, m.G == nil, n, q},
		{"Q", m.Q, m.Q == nil, q, q},
		{"R", m.R, m.R == nil, p, p},
		{"K", m.K, m.K == nil, inputs, n},
	}
	for _, s := range shapes {
		if s.absent {
			continue
		}
		if r, c := s.have.Dims(); r != s.rows || c != s.cols {
			return fmt.Errorf("%s is %d×%d, expected %d×%d: %w", s.name, r, c, s.rows, s.cols, ErrShape)
		}
		if err := checkEntries(s.name, s.have); err != nil {
			return err
		}
	}
	if m.Q == nil || m.R == nil {
		return fmt.Errorf("Q and R are needed: %w", ErrShape)
	}
	if m.Outputs != nil {
		if _, c := m.Outputs.Dims(); c != n {
			return fmt.Errorf("an output row has %d entries, expected %d: %w", c, n, ErrShape)
		}
		if err := checkEntries("outputs", m.Outputs); err != nil {
			return err
		}
	}
	if m.Roles != nil && len(m.Roles) != n {
		return fmt.Errorf("%d roles for %d states: %w", len(m.Roles), n, ErrShape)
	}
	if err := checkScale("state", m.StateScale, n); err != nil {
		return err
	}
	if err := checkScale("sensor", m.SensorScale, p); err != nil {
		return err
	}
	if err := checkCovariance("Q", m.Q); err != nil {
		return err
	}
	return checkCovariance("R", m.R)
}

func checkScale(what string, s []float64, want int) error {
	if s == nil {
		return nil
	}
	if len(s) != want {
		return fmt.Errorf("%d %s scales, expected %d: %w", len(s), what, want, ErrShape)
	}
	for _, v := range s {
		if !(v > 0) || math.IsInf(v, 0) {
			return fmt.Errorf("%s scale %g must be above 0: %w", what, v, ErrNotFinite)
		}
		if v > mostGiven || v < 1/mostGiven {
			return fmt.Errorf("%s scale %g, expected between %.0g and %.0g: %w", what, v, 1/mostGiven, mostGiven, ErrRange)
		}
	}
	return nil
}

// checkCovariance accepts a symmetric matrix whose eigenvalues, after scaling
// its diagonal to ones, are not below zero beyond rounding.
func checkCovariance(name string, s *mat.SymDense) error {
	n := s.SymmetricDim()
	d := make([]float64, n)
	for i := range d {
		v := s.At(i, i)
		if v < 0 {
			return fmt.Errorf("%s has the variance %g: %w", name, v, ErrNoise)
		}
		d[i] = math.Sqrt(v)
	}
	scaled := mat.NewSymDense(n, nil)
	for i := range n {
		for j := i; j < n; j++ {
			v := s.At(i, j)
			switch {
			case d[i] > 0 && d[j] > 0:
				scaled.SetSym(i, j, v/d[i]/d[j])
			case v != 0:
				return fmt.Errorf("%s couples a noise of zero variance: %w", name, ErrNoise)
			}
		}
	}
	var e mat.EigenSym
	if !e.Factorize(scaled, false) {
		return fmt.Errorf("%s: %w", name, ErrNoise)
	}
	if low := e.Values(nil)[0]; low < -1e-10*float64(n) {
		return fmt.Errorf("%s has a negative eigenvalue: %w", name, ErrNoise)
	}
	return nil
}

func finite(a mat.Matrix) bool {
	r, c := a.Dims()
	for i := range r {
		for j := range c {
			if v := a.At(i, j); math.IsNaN(v) || math.IsInf(v, 0) {
				return false
			}
		}
	}
	return true
}
