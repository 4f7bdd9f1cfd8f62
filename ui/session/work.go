package session

import (
	"encoding/json"
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/plants"
	"polewright/ui/desk"
	"polewright/ui/measures"
)

// work turns the stored candidates into judged ones.
func (doc *document) work(file string, b *desk.Bench) (*desk.Work, error) {
	if len(doc.Candidates) > maxCandidates {
		return nil, &plants.Error{File: file, Where: "candidates", Wrong: fmt.Sprintf("%d of them", len(doc.Candidates)), Expected: fmt.Sprintf("at most %d", maxCandidates)}
	}
	w := &desk.Work{Bench: b, Current: doc.Selected, View: doc.View}
	judges := map[estimator.Options]*estimator.Designer{}
	now, err := doc.Current.restore(file, "current", b, judges)
	if err != nil {
		return nil, err
	}
	w.Form, w.Method, w.Poles = now.Form, now.Method, now.Poles
	w.Gain, w.GainCurrent = now.Design.Gain, now.Design.GainCurrent
	names := map[string]bool{}
	for i := range doc.Candidates {
		where := fmt.Sprintf("candidates %d", i+1)
		c, err := doc.Candidates[i].restore(file, where, b, judges)
		if err != nil {
			return nil, err
		}
		if c.Letter == "" || names[c.Letter] {
			return nil, &plants.Error{File: file, Where: where + ", name", Wrong: fmt.Sprintf("%q", c.Letter), Expected: "a name that no other candidate has"}
		}
		names[c.Letter] = true
		w.Candidates = append(w.Candidates, *c)
	}
	if w.Current != "" && !names[w.Current] {
		return nil, &plants.Error{File: file, Where: "selected", Wrong: fmt.Sprintf("no candidate %q", w.Current), Expected: "the name of a candidate, or none"}
	}
	return w, nil
}

func (c *candidate) restore(file, where string, b *desk.Bench, judges map[estimator.Options]*estimator.Designer) (*desk.Candidate, error) {
	wrong := func(key, wrong, expected string) error {
		return &plants.Error{File: file, Where: where + ", " + key, Wrong: wrong, Expected: expected}
	}
	out := &desk.Candidate{Letter: printable(c.Name), Note: printable(c.Note)}
	switch c.Form {
	case "prediction":
	case "current":
		out.Form = estimator.Current
	default:
		return nil, wrong("form", fmt.Sprintf("%q", c.Form), "prediction or current")
	}
	switch c.Method {
	case "robust":
	case "least-noise":
		out.Method = estimator.LeastNoise
	default:
		return nil, wrong("method", fmt.Sprintf("%q", c.Method), "robust or least-noise")
	}
	for _, v := range c.Poles {
		out.Poles = append(out.Poles, complex(v[0], v[1]))
	}
	l, err := matrix(c.Gain)
	if err != nil {
		return nil, wrong("gain", err.Error(), "rows of numbers")
	}
	lf, err := matrix(c.GainCurrent)
	if err != nil {
		return nil, wrong("gain_current", err.Error(), "rows of numbers, or null")
	}
	o := estimator.Options{Form: out.Form, Method: out.Method}
	if judges[o] == nil {
		if judges[o], err = estimator.NewDesigner(b.Model, o); err != nil {
			return nil, fmt.Errorf("%s: %w", file, err)
		}
	}
	out.Design, err = judges[o].Judge(estimator.Given{L: l, Lf: lf, Wanted: out.Poles})
	if err != nil {
		return nil, wrong("gain", err.Error(), "the gain that was saved")
	}
	out.Limits = b.Scenario.Judge(out.Design, b.Model, b.Plant, nil)
	return out, nil
}

// printable keeps control characters of a file from the terminal.
func printable(s string) string {
	out := []rune{}
	for _, r := range s {
		if r >= ' ' && r != 0x7f && (r < 0x80 || r >= 0xa0) && len(out) < 80 {
			out = append(out, r)
		}
	}
	return string(out)
}

func matrix(rows [][]measures.Number) (*mat.Dense, error) {
	if len(rows) == 0 {
		return nil, nil
	}
	cols := len(rows[0])
	if cols == 0 {
		return nil, fmt.Errorf("an empty row")
	}
	m := mat.NewDense(len(rows), cols, nil)
	for i, row := range rows {
		if len(row) != cols {
			return nil, fmt.Errorf("row %d has %d entries, the first %d", i+1, len(row), cols)
		}
		for j, v := range row {
			if math.IsNaN(float64(v)) {
				return nil, fmt.Errorf("row %d, column %d is no number", i+1, j+1)
			}
			m.Set(i, j, float64(v))
		}
	}
	return m, nil
}

// Save writes a session file whole and atomically. program is the name and
// version that wrote it. Without force, an existing file is refused with an
// error that is os.ErrExist.
func Save(file, program string, w *desk.Work, force bool) error {
	doc, err := compose(program, w)
	if err != nil {
		return err
	}
	data, err := json.MarshalIndent(doc, "", " ")
	if err != nil {
		return err
	}
	return WriteNew(file, append(data, '\n'), force)
}

func compose(program string, w *desk.Work) (*document, error) {
	b := w.Bench
	doc := &document{Format: Format, Program: program, Caution: measures.Caution,
		Plant: hold(b.PlantFile, b.PlantText), Selected: w.Current, View: w.View, Candidates: []candidate{}}
	if b.ScenarioFile != "" {
		t := hold(b.ScenarioFile, b.ScenarioText)
		doc.Scenario = &t
	}
	if b.Truth != nil {
		t := hold(b.TruthFile, b.TruthText)
		doc.Truth = &t
	}
	if b.Model.Discrete() {
		doc.Period = &b.Model.Period
	}
	judges := map[estimator.Form]*estimator.Designer{}
	keep := func(c *desk.Candidate) (candidate, error) {
		if judges[c.Form] == nil {
			var err error
			if judges[c.Form], err = estimator.NewDesigner(b.Model, estimator.Options{Form: c.Form}); err != nil {
				return candidate{}, err
			}
		}
		return store(c, b, judges[c.Form].Analysis()), nil
	}
	if w.Gain == nil {
		return nil, fmt.Errorf("there is no design to save yet")
	}
	doc.Current = candidate{Plane: plane(b.Model), Poles: pairs(w.Poles), Method: measures.MethodName(w.Method),
		Form: measures.FormName(w.Form), Gain: measures.Matrix(w.Gain), GainCurrent: measures.Matrix(w.GainCurrent)}
	for i := range w.Candidates {
		c, err := keep(&w.Candidates[i])
		if err != nil {
			return nil, err
		}
		doc.Candidates = append(doc.Candidates, c)
	}
	return doc, nil
}

func store(c *desk.Candidate, b *desk.Bench, an *estimator.Analysis) candidate {
	own := plane(b.Model)
	return candidate{Name: c.Letter, Note: c.Note, Plane: own, Poles: pairs(c.Poles),
		Method: measures.MethodName(c.Method), Form: measures.FormName(c.Form),
		Gain: measures.Matrix(c.Design.Gain), GainCurrent: measures.Matrix(c.Design.GainCurrent),
		Measures: measures.Build(b.Plant.Name, b.Model, an, c.Design, own, c.Limits)}
}

func plane(m *estimator.Model) string {
	if m.Discrete() {
		return "z"
	}
	return "s"
}

func pairs(list []complex128) []measures.Complex {
	var out []measures.Complex
	for _, v := range list {
		out = append(out, measures.Complex{real(v), imag(v)})
	}
	return out
}
