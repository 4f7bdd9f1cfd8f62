// Package desk holds what the screen, the background solver and the session
// file share: immutable requests, answers and documents. It knows no terminal.
package desk

import (
	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/plants"
	"polewright/scenarios"
)

// Bench is what a person sits down to: a plant, its design model, a scenario. It
// is immutable.
type Bench struct {
	Plant        *plants.Plant
	PlantFile    string // as named by the user, or the built-in file's name
	PlantText    []byte
	Model        *estimator.Model
	Scenario     *scenarios.Scenario // never nil: a default one where none was named
	ScenarioFile string              // empty for the default scenario
	ScenarioText []byte
	Truth        *plants.Plant // a fuller plant that the scenario names; nil without
	TruthFile    string
	TruthText    []byte
}

// Request asks the solver for one design. It is immutable.
type Request struct {
	Gen    uint64
	Form   estimator.Form
	Method estimator.Method
	// Poles are wanted in the model's own plane: the movable ones. Nil without a
	// gain asks for the poles to start with.
	Poles []complex128
	// Gain and GainCurrent, where given, are judged as they are instead of placing
	// Poles: n×p, prediction and current form.
	Gain, GainCurrent *mat.Dense
	// From is the design to continue from; nil starts cold.
	From *estimator.Design
	// Truth, where not empty, multiplies the real plant's parameters in the run, in
	// place of what the scenario says of the real plant.
	Truth map[string]float64
}

// Stage says how far an answer has come.
type Stage uint8

const (
	// Judged answers carry the design, its readings and the limits on these.
	Judged Stage = iota
	// Traced answers carry the scenario's run and all limits as well.
	Traced
)

// Answer is what the solver found. It is immutable.
type Answer struct {
	Gen       uint64
	Stage     Stage
	Analysis  *estimator.Analysis
	Movable   int          // how many poles can be chosen in this form
	Registers int          // of these, delay registers at z = 0 that may be left out
	Fixed     []complex128 // that no gain can move, own plane
	Design    *estimator.Design
	Limits    []scenarios.LimitResult
	Run       *scenarios.Run
	// Better is a gain for the same poles that was found from cold, where the
	// branch that Design followed is worse; nil where it is not. It is offered.
	Better *estimator.Design
	Err    error // a design that cannot be made; the other fields may be nil
}

// Candidate is a design that was kept under a letter.
type Candidate struct {
	Letter string // "A", "B" ...
	Note   string
	Form   estimator.Form
	Method estimator.Method
	Poles  []complex128 // wanted, own plane; nil for a gain found elsewhere
	Design *estimator.Design
	Limits []scenarios.LimitResult
	Run    *scenarios.Run // nil until asked for
}

// View is the part of the screen's state that a session restores.
type View struct {
	Plane    string  `json:"plane"`    // "s" or "z"
	Zoom     float64 `json:"zoom"`     // half height of the plane in rad/s, or radius in the z-plane; 0 fits
	Selected int     `json:"selected"` // target pole
	Trace    int     `json:"trace"`    // state shown
	Focus    string  `json:"focus"`    // open view, empty for none
	MapOff   bool    `json:"map_off,omitempty"`
	Shows    string  `json:"shows,omitempty"` // what the traces show: "error", "innovation", empty for truth and estimate
	Band     bool    `json:"band,omitempty"`  // around the estimate
}

// Work is what a session file keeps and what the screen starts from.
type Work struct {
	Bench  *Bench
	File   string // session file; empty before the first save
	Form   estimator.Form
	Method estimator.Method
	Poles  []complex128 // current wanted poles, own plane
	// Gain and GainCurrent are the stored gain of the current design; nil before
	// the first answer.
	Gain, GainCurrent *mat.Dense
	Candidates        []Candidate
	Current           string // letter of the selected candidate; empty where the design was changed since
	View              View
}
