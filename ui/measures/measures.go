// Package measures is the JSON form of a design and its judgement, as
// `polewright design --json` prints it and as a session file stores it. JSON has
// no infinity and no NaN: a figure that is not defined is null, and the warnings
// say why. An infinite margin is null too.
package measures

import (
	"encoding/json"
	"math"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/estimator/poles"
	"polewright/scenarios"
)

// Number is a float64 that JSON shows as null where it is not finite. It reads
// back exactly.
type Number float64

// Complex is a complex number as [re, im].
type Complex [2]float64

// Document is one design with everything that was judged about it.
type Document struct {
	Format               int           `json:"format"`
	Plant                Plant         `json:"plant"`
	Model                Model         `json:"model"`
	Poles                Poles         `json:"poles"`
	Form                 string        `json:"form"`
	Method               string        `json:"method"`
	Gain                 [][]Number    `json:"gain"`
	GainCurrent          [][]Number    `json:"gain_current"`
	GainNorm             Number        `json:"gain_norm"`
	EigenvectorCondition Number        `json:"eigenvector_condition"`
	Stable               bool          `json:"stable"`
	Observability        Observability `json:"observability"`
	Noise                Noise         `json:"noise"`
	Transient            Transient     `json:"transient"`
	Loop                 *Loop         `json:"loop"`
	Rounding             Rounding      `json:"rounding"`
	SensorSets           []SensorSet   `json:"sensor_sets"`
	Limits               []Limit       `json:"limits,omitempty"`
	Warnings             []string      `json:"warnings"`
	Caution              string        `json:"caution"`
}

// Caution goes with every figure and every file that can move a machine.
const Caution = "Verify on the real machine at low energy first; keep independent limits and stops that do not depend on the estimate; local codes and licensed practice decide."

// Plant names what the design is for.
type Plant struct {
	Name    string   `json:"name"`
	States  []string `json:"states"`
	Sensors []string `json:"sensors"`
	Inputs  []string `json:"inputs"`
	Time    string   `json:"time"`
	Period  *Number  `json:"period_s"`
}

// Model is the design model.
type Model struct {
	A          [][]Number `json:"A"`
	B          [][]Number `json:"B"`
	C          [][]Number `json:"C"`
	D          [][]Number `json:"D"`
	G          [][]Number `json:"G"`
	Q          [][]Number `json:"Q"`
	R          [][]Number `json:"R"`
	StateNames []string   `json:"state_names"`
}

// Poles are in the plane that Plane names; a z of 0 has no s and is null.
type Poles struct {
	Plane       string     `json:"plane"`
	Wanted      []*Complex `json:"wanted"`
	Reached     []*Complex `json:"reached"`
	Eigenvalues []*Complex `json:"eigenvalues"`
	WorstError  Number     `json:"worst_relative_error"`
}

// Observability mirrors estimator.Observability.
type Observability struct {
	Rank      int        `json:"rank"`
	Tolerance Number     `json:"tolerance"`
	Modes     []Mode     `json:"modes"`
	Fixed     []*Complex `json:"fixed"`
	Gramian   []Number   `json:"gramian_eigenvalues"`
}

// Mode mirrors estimator.Mode.
type Mode struct {
	Eigenvalue Complex `json:"eigenvalue"`
	Sigma      Number  `json:"sigma"`
	Observable bool    `json:"observable"`
}

// Noise mirrors estimator.Noise and estimator.Floor.
type Noise struct {
	Covariance      [][]Number `json:"covariance"`
	Std             []Number   `json:"std"`
	FloorCovariance [][]Number `json:"floor_covariance"`
	FloorStd        []Number   `json:"floor_std"`
	FloorGain       [][]Number `json:"floor_gain"`
	FloorPoles      []*Complex `json:"floor_poles"`
	OverFloor       []Number   `json:"over_floor"`
	OverFloorRMS    Number     `json:"over_floor_rms"`
	Outputs         []Output   `json:"outputs"`
	SensorToState   [][]Number `json:"sensor_to_state"`
	PeakGain        []Peak     `json:"peak_gain"`
}

// Output mirrors estimator.OutputNoise.
type Output struct {
	Name     string `json:"name"`
	Std      Number `json:"std"`
	FloorStd Number `json:"floor_std"`
}

// Peak mirrors estimator.Peak.
type Peak struct {
	Value Number `json:"value"`
	Rad   Number `json:"rad_per_s"`
}

// Transient mirrors estimator.Transient.
type Transient struct {
	Settle Number `json:"settle_s"`
	Peak   Number `json:"peak"`
}

// Loop mirrors estimator.Loop.
type Loop struct {
	GainMargin   []Number   `json:"gain_margin_db"`
	PhaseMargin  Number     `json:"phase_margin_deg"`
	DelayMargin  Number     `json:"delay_margin_s"`
	DelaySamples *int       `json:"delay_margin_samples"`
	Sensitivity  Number     `json:"sensitivity_peak"`
	WorstInput   *string    `json:"worst_input"`
	Poles        []*Complex `json:"poles"`
	InputStd     []Number   `json:"input_std"`
}

// Rounding says what the arithmetic of the target moves.
type Rounding struct {
	Float32 Number `json:"float32_pole_shift"`
}

// SensorSet is a set of lost sensors.
type SensorSet struct {
	Lost   []string `json:"lost"`
	Stable bool     `json:"stable"`
}

// Limit is one requirement and how the design meets it.
type Limit struct {
	Name  string `json:"name"`
	Value Number `json:"value"`
	Limit Number `json:"limit"`
	Met   bool   `json:"met"`
}

// MarshalJSON writes null for what is not finite.
func (v Number) MarshalJSON() ([]byte, error) {
	f := float64(v)
	if math.IsNaN(f) || math.IsInf(f, 0) {
		return []byte("null"), nil
	}
	return appendFloat(nil, f), nil
}

// UnmarshalJSON reads null as NaN.
func (v *Number) UnmarshalJSON(b []byte) error {
	if string(b) == "null" {
		*v = Number(math.NaN())
		return nil
	}
	f, err := parseFloat(b)
	*v = Number(f)
	return err
}

// Build makes the document. plane is "s" or "z"; limits is nil without a scenario.
func Build(plantName string, m *estimator.Model, an *estimator.Analysis, d *estimator.Design, plane string, limits []scenarios.LimitResult) *Document {
	doc := &Document{
		Format: 1,
		Plant: Plant{Name: plantName, States: m.StateNames, Sensors: list(m.SensorNames), Inputs: list(m.InputNames),
			Time: "continuous"},
		Model: Model{A: Matrix(m.A), B: Matrix(m.B), C: Matrix(m.C), D: Matrix(m.D), G: Matrix(m.G),
			Q: Symmetric(m.Q), R: Symmetric(m.R), StateNames: m.StateNames},
		Form: FormName(d.Form), Method: MethodName(d.Method),
		Gain: Matrix(d.Gain), GainCurrent: Matrix(d.GainCurrent), GainNorm: Number(d.GainNorm),
		EigenvectorCondition: Number(d.EigenvectorCondition),
		Stable:               d.Stable,
		Transient:            Transient{Number(d.Transient.Settle), Number(d.Transient.Peak)},
		Rounding:             Rounding{Number(d.Float32Shift)},
		Warnings:             list(d.Warnings),
		Caution:              Caution,
	}
	if m.Discrete() {
		doc.Plant.Time = "discrete"
		period := Number(m.Period)
		doc.Plant.Period = &period
	}
	fillModel(doc, m)
	doc.Poles = Poles{Plane: plane, Wanted: inPlane(d.Wanted, plane, m.Period), Reached: inPlane(d.Reached, plane, m.Period),
		Eigenvalues: inPlane(d.Reached, "", m.Period), WorstError: Number(d.WorstError)}
	doc.Observability = Observe(&an.Observability)
	doc.Noise = noise(m, an, d)
	doc.Loop = loop(m, d)
	for _, s := range d.SensorSets {
		set := SensorSet{Lost: []string{}, Stable: s.Stable}
		for _, j := range s.Lost {
			set.Lost = append(set.Lost, m.SensorNames[j])
		}
		doc.SensorSets = append(doc.SensorSets, set)
	}
	for _, l := range limits {
		doc.Limits = append(doc.Limits, Limit{l.Name, Number(l.Value), Number(l.Limit), l.Met})
	}
	return doc
}

// fillModel writes out the matrices that a model may leave out.
func fillModel(doc *Document, m *estimator.Model) {
	n, inputs, p := m.Dims()
	if m.B == nil {
		doc.Model.B = zeros(n, 0)
	}
	if m.D == nil {
		doc.Model.D = zeros(p, inputs)
	}
	if m.G == nil {
		doc.Model.G = zeros(n, n)
		for i := range n {
			doc.Model.G[i][i] = 1
		}
	}
}

func zeros(rows, cols int) [][]Number {
	z := make([][]Number, rows)
	for i := range z {
		z[i] = make([]Number, cols)
	}
	return z
}

func noise(m *estimator.Model, an *estimator.Analysis, d *estimator.Design) Noise {
	out := Noise{Std: Numbers(d.Noise.Std), OverFloor: Numbers(d.Noise.OverFloor), OverFloorRMS: Number(d.Noise.OverFloorRMS),
		Outputs: []Output{}, SensorToState: Matrix(d.Noise.SensorToState), Covariance: Symmetric(d.Noise.Covariance)}
	if f := an.Floor; f != nil {
		out.FloorCovariance, out.FloorStd = Symmetric(f.Covariance), Numbers(f.Std)
		out.FloorGain, out.FloorPoles = Matrix(f.Gain), inPlane(f.Poles, "", 0)
	}
	for i, o := range d.Noise.Outputs {
		out.Outputs = append(out.Outputs, Output{m.OutputNames[i], Number(o.Std), Number(o.FloorStd)})
	}
	for _, p := range d.Noise.PeakGain {
		out.PeakGain = append(out.PeakGain, Peak{Number(p.Value), Number(p.Frequency)})
	}
	return out
}

func loop(m *estimator.Model, d *estimator.Design) *Loop {
	l := d.Loop
	if l == nil {
		return nil
	}
	out := &Loop{PhaseMargin: Number(l.PhaseMargin), DelayMargin: Number(l.DelayMargin), Sensitivity: Number(l.SensitivityPeak),
		Poles: inPlane(l.Poles, "", 0), InputStd: Numbers(l.InputStd)}
	if l.Stable {
		out.GainMargin = []Number{Number(l.GainMarginBelow), Number(l.GainMarginAbove)}
	}
	if l.DelayMarginSamples >= 0 {
		out.DelaySamples = &l.DelayMarginSamples
	}
	if l.Input >= 0 {
		out.WorstInput = &m.InputNames[l.Input]
	}
	return out
}

// Observe makes the observability object.
func Observe(o *estimator.Observability) Observability {
	out := Observability{Rank: o.Rank, Tolerance: Number(o.Tolerance), Fixed: inPlane(o.Fixed, "", 0), Gramian: Numbers(o.Gramian)}
	for _, m := range o.Modes {
		out.Modes = append(out.Modes, Mode{Complex{real(m.Eigenvalue), imag(m.Eigenvalue)}, Number(m.Sigma), m.Observable})
	}
	return out
}

// inPlane maps eigenvalues of a model with this period to the s-plane where
// that is asked for.
func inPlane(in []complex128, plane string, period float64) []*Complex {
	if in == nil && plane != "" {
		return nil
	}
	out := make([]*Complex, len(in))
	for i, v := range in {
		if plane == "s" && period > 0 {
			s, ok := poles.ToS(v, period)
			if !ok {
				continue
			}
			v = s
		}
		out[i] = &Complex{real(v), imag(v)}
	}
	return out
}

func list(s []string) []string {
	if s == nil {
		return []string{}
	}
	return s
}

// Numbers converts; nil stays nil.
func Numbers(in []float64) []Number {
	if in == nil {
		return nil
	}
	out := make([]Number, len(in))
	for i, v := range in {
		out[i] = Number(v)
	}
	return out
}

// Matrix converts row by row; nil stays nil.
func Matrix(m *mat.Dense) [][]Number {
	if m == nil {
		return nil
	}
	r, c := m.Dims()
	out := zeros(r, c)
	for i := range r {
		for j := range c {
			out[i][j] = Number(m.At(i, j))
		}
	}
	return out
}

// Symmetric converts row by row; nil stays nil.
func Symmetric(m *mat.SymDense) [][]Number {
	if m == nil {
		return nil
	}
	return Matrix(mat.DenseCopyOf(m))
}

// FormName is the word for a form in files and options.
func FormName(f estimator.Form) string {
	if f == estimator.Current {
		return "current"
	}
	return "prediction"
}

// MethodName is the word for a method in files and options.
func MethodName(m estimator.Method) string {
	if m == estimator.LeastNoise {
		return "least-noise"
	}
	return "robust"
}

// GainText is a gain as one line with all digits, as --use-gain takes it.
func GainText(l *mat.Dense) string {
	text, err := json.Marshal(Matrix(l))
	if err != nil {
		return ""
	}
	return string(text)
}
