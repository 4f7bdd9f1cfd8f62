package session

import (
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
	w := &desk.Work{Bench: b, Current: Printable(doc.Selected, maxLetter), View: view(doc.View)}
	judges := map[estimator.Options]*estimator.Designer{}
	now, err := doc.Current.restore(file, "current", b, judges)
	if err != nil {
		return nil, err
	}
	w.Form, w.Method, w.Poles = now.Form, now.Method, now.Poles
	if now.Design != nil {
		w.Gain, w.GainCurrent = now.Design.Gain, now.Design.GainCurrent
	}
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
		if c.Design == nil {
			return nil, &plants.Error{File: file, Where: where + ", gain", Wrong: "missing", Expected: "the gain that was saved"}
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
	out := &desk.Candidate{Letter: Printable(c.Name, maxLetter), Note: Printable(c.Note, maxNote)}
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
	if len(c.Poles) > maxPoles {
		return nil, wrong("poles", fmt.Sprintf("%d of them", len(c.Poles)), fmt.Sprintf("at most %d", maxPoles))
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
	if l == nil && lf == nil && len(out.Poles) > 0 {
		return out, nil // poles in hand whose gain had not been found
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
