package report

import (
	"fmt"
	"math"
	"strings"

	"polewright/plants"
	"polewright/ui/measures"
)

// plant tells what the design is for.
func (m *maker) plant() {
	p := m.bench.Plant
	m.page("The plant")
	if p.Note != "" {
		m.text(Plain, "%s", p.Note)
	}
	m.parameters()
	states := &Table{Caption: "States", Head: []string{"state", "unit", "typical size", "operating point"}, Words: []bool{true, true}}
	for _, s := range p.States {
		states.Rows = append(states.Rows, []Cell{words(s.Name), words(blank(s.Unit)), words(Digits(s.Scale)), words(Digits(s.Operating))})
	}
	m.table(states)
	m.inputs()
	m.sensors()
	outputs := &Table{Caption: "Combinations of states that matter", Head: []string{"output", "unit", "row"}, Words: []bool{true, true, true}}
	for _, o := range p.Outputs {
		outputs.Rows = append(outputs.Rows, []Cell{words(o.Name), words(blank(o.Unit)), words(combination(o.Row, p))})
	}
	m.table(outputs)
	unknowns := &Table{Caption: "Unknowns that the estimator finds by itself", Head: []string{"kind", "on", "drift", "typical size", "frequency, Hz"}, Words: []bool{true, true}}
	for _, u := range p.Unknowns {
		f := math.NaN()
		if u.Kind == plants.InputSine {
			f = u.Frequency
		}
		unknowns.Rows = append(unknowns.Rows, []Cell{words(string(u.Kind)), words(u.On), words(Digits(u.Drift)), words(Digits(u.Scale)), words(Digits(f))})
	}
	m.table(unknowns)
	m.model()
}

func combination(row []float64, p *plants.Plant) string {
	var parts []string
	for i, v := range row {
		if v != 0 {
			parts = append(parts, Digits(v)+" × "+p.States[i].Name)
		}
	}
	return blank(strings.Join(parts, " + "))
}

func (m *maker) parameters() {
	t := &Table{Caption: "Parameters", Head: []string{"parameter", "value", "unit", "tolerance"}, Words: []bool{true, false, true, false}}
	for _, q := range m.bench.Plant.Parameters {
		tolerance := "–"
		if q.Tolerance > 0 {
			tolerance = "± " + Digits(100*q.Tolerance) + " %"
		}
		t.Rows = append(t.Rows, []Cell{words(q.Name), words(Digits(q.Value)), words(blank(q.Unit)), words(tolerance)})
	}
	m.table(t)
}

func (m *maker) inputs() {
	t := &Table{Caption: "Inputs", Head: []string{"input", "unit", "typical size", "operating point", "delay, samples", "lag, s", "resolution", "range"}, Words: []bool{true, true}}
	for _, s := range m.bench.Plant.Inputs {
		t.Rows = append(t.Rows, []Cell{words(s.Name), words(blank(s.Unit)), words(Digits(s.Scale)), words(Digits(s.Operating)),
			words(fmt.Sprint(s.DelaySamples)), words(Digits(s.Lag)), words(orNone(s.Resolution)), words(between(s.Range))})
	}
	m.table(t)
}

func (m *maker) sensors() {
	t := &Table{Caption: "Sensors", Head: []string{"sensor", "unit", "noise", "resolution", "range", "wraps at", "delay, samples", "lag, s", "in use"}, Words: []bool{true, true, true}}
	for _, s := range m.bench.Plant.Sensors {
		noise := "given as a matrix"
		switch {
		case s.NoiseStd != nil:
			noise = "std " + Digits(*s.NoiseStd)
		case s.NoiseDensity != nil:
			noise = "density " + Digits(*s.NoiseDensity)
		}
		use := Cell{Text: "yes"}
		if !s.Enabled {
			use = Cell{Text: "NO", Strong: true}
		}
		t.Rows = append(t.Rows, []Cell{words(s.Name), words(blank(s.Unit)), words(noise), words(orNone(s.Resolution)), words(between(s.Range)),
			words(orNone(s.Wrap)), words(fmt.Sprint(s.DelaySamples)), words(Digits(s.Lag)), use})
	}
	m.table(t)
}

func orNone(v float64) string {
	if v == 0 {
		return "none"
	}
	return Digits(v)
}

func between(r *plants.Range) string {
	if r == nil {
		return "unlimited"
	}
	return Digits(r.Low) + " to " + Digits(r.High)
}

// model prints the matrices that everything is judged on. Figures are those of the
// first candidate's measures: they are the same for all.
func (m *maker) model() {
	b, doc := m.bench, &m.list[0].doc.Model
	m.heading(2, "Design model")
	if b.Model.Discrete() && b.Plant.Continuous {
		m.text(Plain, "Sampled exactly every %s s (zero-order hold), noise included; the estimator is designed, judged and run on these matrices.", Digits(b.Model.Period))
	}
	states, inputs, sensors := b.Model.StateNames, b.Model.InputNames, b.Model.SensorNames
	noise := states
	if len(doc.G) > 0 && len(doc.G[0]) != len(states) {
		noise = nil
		for i := range doc.G[0] {
			noise = append(noise, fmt.Sprintf("w%d", i+1))
		}
	}
	if len(states) > maxPrinted {
		m.text(Plain, "The model has %d states: too many for its matrices to be printed here. `design --json` with the session prints them.", len(states))
		return
	}
	for _, t := range []struct {
		name, key  string
		rows, cols []string
		data       [][]measures.Number
	}{
		{"A", "model.A", states, states, doc.A}, {"B", "model.B", states, inputs, doc.B},
		{"C", "model.C", sensors, states, doc.C}, {"D", "model.D", sensors, inputs, doc.D},
		{"G, how process noise enters", "model.G", states, noise, doc.G},
		{"Q, process noise", "model.Q", noise, noise, doc.Q}, {"R, sensor noise", "model.R", sensors, sensors, doc.R},
	} {
		m.matrix(t.name, t.key, t.rows, t.cols, t.data, number)
	}
	if k := b.Model.K; k != nil {
		m.matrix("K, the controller u = −K x̂", "", inputs, states, measures.Matrix(k), number)
	}
}

// maxPrinted is the most states of a model whose matrices are printed.
const maxPrinted = 30

// wide is how many columns of figures fit on a page.
const wide = 7

// matrix prints a labelled matrix, in parts where it is wide. All but the diagonal
// of a matrix without other entries is left out.
func (m *maker) matrix(name, key string, rows, cols []string, data [][]measures.Number, cell func(measures.Number, ...any) Cell) {
	if len(data) == 0 || len(data[0]) == 0 {
		return
	}
	at := func(i, j int) []any {
		if key == "" {
			return nil
		}
		return []any{key, i, j}
	}
	if len(data) > 2 && diagonal(data) {
		t := &Table{Caption: name + " (diagonal; all else is 0)", Head: []string{"", "diagonal"}}
		for i := range data {
			t.Rows = append(t.Rows, []Cell{words(rows[i]), cell(data[i][i], at(i, i)...)})
		}
		m.table(t)
		return
	}
	for from := 0; from < len(cols); from += wide {
		to := min(from+wide, len(cols))
		t := &Table{Caption: name, Head: append([]string{""}, cols[from:to]...)}
		if len(cols) > wide {
			t.Caption += fmt.Sprintf(", columns %d to %d", from+1, to)
		}
		for i := range data {
			row := []Cell{words(rows[i])}
			for j := from; j < to; j++ {
				row = append(row, cell(data[i][j], at(i, j)...))
			}
			t.Rows = append(t.Rows, row)
		}
		m.table(t)
	}
}

func diagonal(data [][]measures.Number) bool {
	for i := range data {
		if len(data[i]) != len(data) {
			return false
		}
		for j := range data[i] {
			if i != j && data[i][j] != 0 {
				return false
			}
		}
	}
	return true
}
