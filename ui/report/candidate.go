package report

import (
	"fmt"
	"math"
	"strings"

	"polewright/estimator/poles"
	"polewright/ui/measures"
)

// candidate tells everything about one candidate.
func (m *maker) candidate(s *shown) {
	if len(m.kept.Designs) > 0 {
		m.page("Candidate " + s.name)
	} else {
		m.page("The design in hand")
	}
	if s.note != "" {
		m.text(Plain, "%s", s.note)
	}
	how := "a gain found elsewhere"
	if s.design.Wanted != nil {
		how = map[string]string{
			"robust":      "poles placed with the best-conditioned eigenvectors (robust)",
			"least-noise": "poles placed with the least noise among all gains that give them (least-noise)",
		}[s.doc.Method]
	}
	form := "continuous time"
	if m.bench.Model.Discrete() {
		form = s.doc.Form + " form"
	}
	m.text(Plain, "%s; %s. The stored gain is what is judged here; nothing was designed anew.", upper(form), how)
	if !s.design.Stable {
		m.text(Warning, "This estimator is UNSTABLE: its error grows, and figures of a steady state are not defined.")
	}
	m.limits(s)
	m.poles(s)
	m.polePlanes(s)
	m.gain(s)
	m.noise(s)
	m.startUp(s)
	m.loop(s)
	m.lost(s)
	m.traces(s)
	if len(s.doc.Warnings) > 0 {
		m.heading(2, "Notes on candidate "+s.name)
	}
	for _, w := range s.doc.Warnings {
		m.text(Warning, "%s", upper(w)+".")
	}
}

func upper(s string) string {
	if s == "" {
		return s
	}
	if s[0] >= 'a' && s[0] <= 'z' && !(len(s) > 1 && s[1] == '-') {
		return strings.ToUpper(s[:1]) + s[1:]
	}
	return s
}

// limits says of every limit whether it is met.
func (m *maker) limits(s *shown) {
	m.heading(2, "Limits of the scenario")
	if len(s.limits) == 0 {
		m.text(Plain, "The scenario sets no limit.")
		return
	}
	t := &Table{Head: []string{"limit", "value", "", "limit", "unit", ""}, Words: []bool{true, false, true, false, true, true}}
	for i, l := range s.limits {
		relation, met := "at most", Cell{Text: "met"}
		if l.AtLeast {
			relation = "at least"
		}
		if !l.Met {
			met = Cell{Text: "NOT MET", Strong: true}
		}
		value := Cell{Text: Digits(l.Value), Key: fmt.Sprintf("limits.%d.value", i)}
		t.Rows = append(t.Rows, []Cell{words(limitName(l.Name)), value, words(relation),
			{Text: Digits(l.Limit), Key: fmt.Sprintf("limits.%d.limit", i)}, words(blank(l.Unit)), met})
	}
	m.table(t)
	if s.diverged {
		m.text(Warning, "The scenario's run DIVERGED: a value went beyond 1e12 times its scale.")
	}
}

// limitName puts the key of a limit in words.
func limitName(key string) string {
	for _, w := range [][2]string{{"settle_s", "settle time"}, {"peak_max", "start-up peak"}, {"over_floor_max", "noise over the floor"},
		{"gain_max", "gain norm"}, {"sensitivity_max", "sensitivity peak"}, {"phase_margin_deg", "phase margin"}, {"delay_margin_s", "delay margin"}} {
		if key == w[0] {
			return w[1]
		}
	}
	for _, w := range [][2]string{{"std ", "noise on "}, {"error ", "largest error in the run of "}, {"input_std ", "noise on the actuator "}} {
		if rest, ok := strings.CutPrefix(key, w[0]); ok {
			return w[1] + rest
		}
	}
	return key
}

// poles lists the poles as asked for and as reached, and spells them out.
func (m *maker) poles(s *shown) {
	b, doc := m.bench, &s.doc.Poles
	m.heading(2, "Poles")
	t := &Table{Caption: "Poles of the estimator, the eigenvalues of A − L C (" + doc.Plane + "-plane)", Head: []string{"reached", "wanted"}}
	if b.Model.Discrete() {
		t.Head = append(t.Head, map[string]string{"s": "z-plane", "z": "s-plane, rad/s"}[doc.Plane])
	}
	t.Head = append(t.Head, "frequency, rad/s", "damping", "time constant, s")
	for i, v := range doc.Reached {
		wanted := words("–")
		if i < len(doc.Wanted) {
			wanted = pole(doc.Wanted[i], "poles.wanted", i)
		}
		row := []Cell{pole(v, "poles.reached", i), wanted}
		own := s.design.Reached[i]
		if b.Model.Discrete() {
			other := pole(doc.Eigenvalues[i], "poles.eigenvalues", i)
			if doc.Plane == "z" {
				other = pole(toS(*doc.Eigenvalues[i], b.Model.Period))
			}
			row = append(row, other)
		}
		d := poles.Describe(own, b.Model.Period)
		t.Rows = append(t.Rows, append(row, words(Digits(d.Frequency)), words(Digits(d.Damping)), words(Digits(d.TimeConstant))))
	}
	m.table(t)
	figures := &Table{Head: []string{"", ""}}
	if s.design.Wanted != nil {
		figures.Rows = append(figures.Rows, []Cell{words("worst relative error of a pole"), number(doc.WorstError, "poles.worst_relative_error")})
	}
	figures.Rows = append(figures.Rows,
		[]Cell{words("condition number of the eigenvectors"), number(s.doc.EigenvectorCondition, "eigenvector_condition")},
		[]Cell{words("largest relative shift of a pole in float32"), number(s.doc.Rounding.Float32, "rounding.float32_pole_shift")})
	m.table(figures)
}

// gain prints the gains in all their digits.
func (m *maker) gain(s *shown) {
	states, sensors := m.bench.Model.StateNames, m.bench.Model.SensorNames
	m.heading(2, "Gain")
	name := "L: x̂' = A x̂ + B u + L (y − C x̂ − D u)"
	if m.bench.Model.Discrete() {
		name = "L, prediction form: x̂⁺ = A x̂ + B u + L (y − C x̂ − D u)"
	}
	m.matrix(name, "gain", states, sensors, s.doc.Gain, exact)
	m.matrix("Lf, current form: x̂f = x̂ + Lf (y − C x̂ − D u), x̂⁺ = A x̂f + B u", "gain_current", states, sensors, s.doc.GainCurrent, exact)
	if m.bench.Model.Discrete() && s.doc.GainCurrent == nil {
		m.text(Plain, "There is no gain of the current form: no Lf solves A Lf = L.")
	}
	m.table(&Table{Head: []string{"", ""}, Rows: [][]Cell{{words("2-norm of L"), number(s.doc.GainNorm, "gain_norm")}}})
}

// noise holds the steady-state noise of every state against the floor.
func (m *maker) noise(s *shown) {
	doc, names := &s.doc.Noise, m.bench.Model.StateNames
	m.heading(2, "Steady-state noise")
	at := func(list []measures.Number, i int, key ...any) Cell {
		if i >= len(list) {
			return words("–")
		}
		return number(list[i], append(key, i)...)
	}
	t := &Table{Caption: "Standard deviation of the error, the floor (the best that any linear estimator could do), and their ratio",
		Head: []string{"state", "unit", "noise", "floor", "over the floor"}, Words: []bool{true, true}}
	for i, name := range names {
		t.Rows = append(t.Rows, []Cell{words(name), words(blank(m.units[i])), at(doc.Std, i, "noise.std"), at(doc.FloorStd, i, "noise.floor_std"), at(doc.OverFloor, i, "noise.over_floor")})
	}
	for i, o := range doc.Outputs {
		unit := ""
		if i < len(m.bench.Plant.Outputs) {
			unit = m.bench.Plant.Outputs[i].Unit
		}
		t.Rows = append(t.Rows, []Cell{words(o.Name), words(blank(unit)), number(o.Std, "noise.outputs", i, "std"), number(o.FloorStd, "noise.outputs", i, "floor_std"), words("")})
	}
	t.Rows = append(t.Rows, []Cell{words("all states together (root mean square)"), words("–"), words(""), words(""), number(doc.OverFloorRMS, "noise.over_floor_rms")})
	m.table(t)
	if an := s.designer.Analysis(); an.Floor == nil {
		m.text(Warning, "%s.", upper(an.FloorReason))
	} else {
		m.text(Faint, "The floor is only as true as the noise figures of the plant file.")
	}
	intensity := "noise of unit density"
	if m.bench.Model.Discrete() {
		intensity = "a noise of unit variance per sample"
	}
	m.matrix("What "+intensity+" on one sensor alone makes of each state's error (standard deviation, prediction form)", "noise.sensor_to_state",
		withUnits(names, m.units), m.bench.Model.SensorNames, doc.SensorToState, number)
	peaks := &Table{Caption: "Largest gain over frequency from the sensors' noise to each state's error (prediction form)", Head: []string{"state", "gain", "at rad/s"}}
	for i, p := range doc.PeakGain {
		peaks.Rows = append(peaks.Rows, []Cell{words(names[i]), number(p.Value, "noise.peak_gain", i, "value"), number(p.Rad, "noise.peak_gain", i, "rad_per_s")})
	}
	m.table(peaks)
}

func withUnits(names, units []string) []string {
	out := make([]string, len(names))
	for i := range names {
		out[i] = withUnit(names[i], units[i])
	}
	return out
}

// startUp tells how an initial error dies out.
func (m *maker) startUp(s *shown) {
	m.heading(2, "Start-up")
	m.table(&Table{Caption: "How an initial error dies out (2-norm of the scaled transition matrix)", Head: []string{"", "", "unit"}, Words: []bool{true, false, true}, Rows: [][]Cell{
		{words("settles to 2 % in"), number(s.doc.Transient.Settle, "transient.settle_s"), words("s")},
		{words("largest value on the way"), number(s.doc.Transient.Peak, "transient.peak"), words("times")},
	}})
}

// loop tells the margins of the control loop.
func (m *maker) loop(s *shown) {
	l, d := s.doc.Loop, s.design.Loop
	if l == nil {
		return
	}
	m.heading(2, "Control loop, broken at the plant input")
	if !d.Stable {
		m.text(Warning, "The nominal control loop is UNSTABLE: it has no margins.")
	} else {
		t := &Table{Head: []string{"", "", "unit"}, Words: []bool{true, false, true}}
		// The measures write null for a margin without end; the word says more.
		add := func(name, unit string, v float64, key ...any) {
			t.Rows = append(t.Rows, []Cell{words(name), {Text: Digits(v), Key: path(key)}, words(unit)})
		}
		add("gain margin, below", "dB", d.GainMarginBelow, "loop.gain_margin_db", 0)
		add("gain margin, above", "dB", d.GainMarginAbove, "loop.gain_margin_db", 1)
		add("phase margin", "deg", d.PhaseMargin, "loop.phase_margin_deg")
		add("delay margin", "s", d.DelayMargin, "loop.delay_margin_s")
		if l.DelaySamples != nil {
			add("delay margin, whole samples", "samples", float64(*l.DelaySamples), "loop.delay_margin_samples")
		}
		add("sensitivity peak", "–", d.SensitivityPeak, "loop.sensitivity_peak")
		for i, v := range l.InputStd {
			unit := ""
			if i < len(m.bench.Plant.Inputs) {
				unit = m.bench.Plant.Inputs[i].Unit
			}
			add("noise on the actuator "+m.bench.Model.InputNames[i], blank(unit), float64(v), "loop.input_std", i)
		}
		m.table(t)
		if l.WorstInput != nil && len(m.bench.Model.InputNames) > 1 {
			m.text(Plain, "Margins are taken one input at a time; the worst is %s.", *l.WorstInput)
		}
	}
	t := &Table{Caption: "Closed-loop poles of plant and estimator together", Head: []string{"number", "place (" + map[bool]string{true: "z", false: "s"}[m.bench.Model.Discrete()] + "-plane)"}}
	for i, v := range l.Poles {
		t.Rows = append(t.Rows, []Cell{words(fmt.Sprint(i + 1)), pole(v, "loop.poles", i)})
	}
	m.table(t)
}

// lost tells what losing sensors does.
func (m *maker) lost(s *shown) {
	t := &Table{Caption: "When sensors are lost and their columns of L are set to zero", Head: []string{"lost", "the estimator"}, Words: []bool{true, true}}
	for _, set := range s.doc.SensorSets {
		state := Cell{Text: "stays stable"}
		if !set.Stable {
			state = Cell{Text: "becomes UNSTABLE", Strong: true}
		}
		t.Rows = append(t.Rows, []Cell{words(strings.Join(set.Lost, " + ")), state})
	}
	if len(t.Rows) > 0 {
		m.heading(2, "Losing sensors")
	}
	m.table(t)
}

// finite tells a number from what is not one.
func finite(v float64) bool { return !math.IsNaN(v) && !math.IsInf(v, 0) }
