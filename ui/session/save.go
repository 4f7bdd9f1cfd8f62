package session

import (
	"encoding/json"
	"errors"

	"polewright/estimator"
	"polewright/ui/desk"
	"polewright/ui/measures"
)

// Save writes a session file whole, atomically and durably. program is the name
// and version that wrote it. Without force, an existing file is refused with an
// error that is fs.ErrExist.
func Save(file, program string, w *desk.Work, force bool) error {
	data, err := Encode(program, w)
	if err != nil {
		return err
	}
	return WriteNew(file, data, force)
}

// Encode returns the content of a session file.
func Encode(program string, w *desk.Work) ([]byte, error) {
	if w.Gain == nil {
		return nil, errors.New("there is no design to save yet")
	}
	doc := compose(program, w)
	judges := map[estimator.Form]*estimator.Designer{}
	for i := range w.Candidates {
		c := &w.Candidates[i]
		if judges[c.Form] == nil {
			var err error
			if judges[c.Form], err = estimator.NewDesigner(w.Bench.Model, estimator.Options{Form: c.Form}); err != nil {
				return nil, err
			}
		}
		own := plane(w.Bench.Model)
		doc.Candidates[i].Measures = measures.Build(w.Bench.Plant.Name, w.Bench.Model, judges[c.Form].Analysis(), c.Design, own, c.Limits)
	}
	return marshal(doc)
}

// EncodeDraft returns the content of a session file without what can be judged
// anew, and whether or not the design in hand was answered yet: quick, for the
// journal. Decode reads it as it reads a session.
func EncodeDraft(program string, w *desk.Work, mark *Mark) ([]byte, error) {
	doc := compose(program, w)
	doc.Journal = mark
	return marshal(doc)
}

// DraftMark returns what a journal noted beside the work, nil for other content.
func DraftMark(data []byte) *Mark {
	var probe struct {
		Journal *Mark `json:"journal"`
	}
	if json.Unmarshal(data, &probe) != nil {
		return nil
	}
	return probe.Journal
}

func marshal(doc *document) ([]byte, error) {
	data, err := json.MarshalIndent(doc, "", " ")
	if err != nil {
		return nil, err
	}
	return append(data, '\n'), nil
}

// compose lays out all but the measures.
func compose(program string, w *desk.Work) *document {
	b := w.Bench
	doc := &document{Format: Format, Program: program, Caution: measures.Caution,
		Plant: hold(b.PlantFile, b.PlantText), Selected: w.Current, View: view(w.View), Candidates: []candidate{}}
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
	doc.Current = candidate{Plane: plane(b.Model), Poles: pairs(w.Poles), Method: measures.MethodName(w.Method),
		Form: measures.FormName(w.Form)}
	if w.Gain != nil {
		doc.Current.Gain, doc.Current.GainCurrent = measures.Matrix(w.Gain), measures.Matrix(w.GainCurrent)
	}
	for i := range w.Candidates {
		doc.Candidates = append(doc.Candidates, store(&w.Candidates[i], b))
	}
	return doc
}

func store(c *desk.Candidate, b *desk.Bench) candidate {
	return candidate{Name: c.Letter, Note: c.Note, Plane: plane(b.Model), Poles: pairs(c.Poles),
		Method: measures.MethodName(c.Method), Form: measures.FormName(c.Form),
		Gain: measures.Matrix(c.Design.Gain), GainCurrent: measures.Matrix(c.Design.GainCurrent)}
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
