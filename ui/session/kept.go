package session

import (
	"bytes"
	"crypto/sha256"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"strings"
	"unicode"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/plants"
	"polewright/ui/desk"
)

// Kept is the content of a session file for whoever checks or prints it: what is
// stored is set out as it stands, and nothing in it is believed beyond its shape.
type Kept struct {
	Program  string // name and version of the program that saved it
	Sum      Sum    // of the whole file
	Bench    *desk.Bench
	Texts    []KeptText
	InHand   KeptDesign // the design in hand when it was saved; it stores no measures
	Designs  []KeptDesign
	Selected string // name of the selected candidate; empty for none
}

// KeptText is one text that a session holds whole.
type KeptText struct {
	What    string // "plant", "scenario", "truth_plant"
	File    string
	SHA256  string // of the text as it stands
	Matches bool   // whether the stored sum is that one
}

// KeptDesign is a stored design, unjudged.
type KeptDesign struct {
	Name, Note        string
	Kind              estimator.Options
	Wanted            []complex128 // own plane; nil for a gain found elsewhere
	Gain, GainCurrent *mat.Dense   // nil where the file has none
	// Measures are the stored figures as a tree of JSON: nil where there are none,
	// numbers as float64.
	Measures map[string]any
}

// LoadKept reads a session file without judging its gains and without refusing
// texts that do not match their sums: it says so in Texts. The error is a
// *plants.Error where the content is at fault.
func LoadKept(file string) (*Kept, error) {
	data, err := read(file)
	if err != nil {
		return nil, err
	}
	return DecodeKept(file, data)
}

// DecodeKept is LoadKept of content at hand; file is its name in errors.
func DecodeKept(file string, data []byte) (*Kept, error) {
	doc, err := shape(file, data)
	if err != nil {
		return nil, err
	}
	k := &Kept{Program: visible(doc.Program), Sum: sha256.Sum256(data), Selected: visible(doc.Selected)}
	for _, t := range []struct {
		what string
		text *text
	}{{"plant", &doc.Plant}, {"scenario", doc.Scenario}, {"truth_plant", doc.Truth}} {
		if t.text != nil {
			own := hold("", []byte(t.text.Text)).SHA256
			k.Texts = append(k.Texts, KeptText{What: t.what, File: visible(t.text.File), SHA256: own, Matches: own == t.text.SHA256})
		}
	}
	if k.Bench, err = doc.bench(file); err != nil {
		return nil, err
	}
	if k.InHand, err = doc.Current.kept(file, "current"); err != nil {
		return nil, err
	}
	if len(doc.Candidates) > maxCandidates {
		return nil, &plants.Error{File: file, Where: "candidates", Wrong: fmt.Sprintf("%d of them", len(doc.Candidates)), Expected: fmt.Sprintf("at most %d", maxCandidates)}
	}
	stored, err := storedMeasures(data)
	if err != nil {
		return nil, fmt.Errorf("%s: %w", file, err)
	}
	names := map[string]bool{}
	for i := range doc.Candidates {
		where := fmt.Sprintf("candidates %d", i+1)
		d, err := doc.Candidates[i].kept(file, where)
		if err != nil {
			return nil, err
		}
		if d.Name == "" || names[d.Name] {
			return nil, &plants.Error{File: file, Where: where + ", name", Wrong: fmt.Sprintf("%q", d.Name), Expected: "a name that no other candidate has"}
		}
		names[d.Name] = true
		d.Measures = stored[i]
		k.Designs = append(k.Designs, d)
	}
	if k.Selected != "" && !names[k.Selected] {
		return nil, &plants.Error{File: file, Where: "selected", Wrong: fmt.Sprintf("no candidate %q", k.Selected), Expected: "the name of a candidate, or none"}
	}
	return k, nil
}

// shape reads the file's tree and refuses another format.
func shape(file string, data []byte) (*document, error) {
	wrong := func(where, wrong, expected string) error {
		return &plants.Error{File: file, Where: where, Wrong: wrong, Expected: expected}
	}
	var probe struct {
		Format *float64 `json:"format"`
	}
	if err := json.Unmarshal(data, &probe); err != nil {
		return nil, wrong(place(data, err), "not a session file: "+plain(err), "JSON as polewright saves it")
	}
	if probe.Format == nil {
		return nil, wrong("format", "missing", fmt.Sprint(Format))
	}
	if *probe.Format != Format {
		return nil, wrong("format", fmt.Sprintf("%g is not one that this polewright reads", *probe.Format), fmt.Sprint(Format))
	}
	doc := new(document)
	dec := json.NewDecoder(bytes.NewReader(data))
	if err := dec.Decode(doc); err != nil {
		return nil, wrong(place(data, err), plain(err), "a session as polewright saves it")
	}
	if _, err := dec.Token(); !errors.Is(err, io.EOF) {
		return nil, wrong("end", "more text after the session", "nothing")
	}
	return doc, nil
}

// storedMeasures returns the figures of each candidate as they stand in the file.
func storedMeasures(data []byte) ([]map[string]any, error) {
	var raw struct {
		Candidates []struct {
			Measures map[string]any `json:"measures"`
		} `json:"candidates"`
	}
	if err := json.Unmarshal(data, &raw); err != nil {
		return nil, err
	}
	out := make([]map[string]any, len(raw.Candidates))
	for i, c := range raw.Candidates {
		out[i] = c.Measures
	}
	return out, nil
}

// kept takes a stored design over without judging it.
func (c *candidate) kept(file, where string) (KeptDesign, error) {
	wrong := func(key, wrong, expected string) error {
		return &plants.Error{File: file, Where: where + ", " + key, Wrong: wrong, Expected: expected}
	}
	d := KeptDesign{Name: visible(c.Name), Note: visible(c.Note)}
	switch c.Form {
	case "prediction":
	case "current":
		d.Kind.Form = estimator.Current
	default:
		return d, wrong("form", fmt.Sprintf("%q", c.Form), "prediction or current")
	}
	switch c.Method {
	case "robust":
	case "least-noise":
		d.Kind.Method = estimator.LeastNoise
	default:
		return d, wrong("method", fmt.Sprintf("%q", c.Method), "robust or least-noise")
	}
	for _, v := range c.Poles {
		d.Wanted = append(d.Wanted, complex(v[0], v[1]))
	}
	var err error
	if d.Gain, err = matrix(c.Gain); err != nil {
		return d, wrong("gain", err.Error(), "rows of numbers")
	}
	if d.GainCurrent, err = matrix(c.GainCurrent); err != nil {
		return d, wrong("gain_current", err.Error(), "rows of numbers, or null")
	}
	return d, nil
}

// visible leaves what can be read: no control or direction-changing characters.
func visible(s string) string {
	out := strings.Map(func(r rune) rune {
		if r == unicode.ReplacementChar || !unicode.IsPrint(r) {
			return -1
		}
		return r
	}, s)
	if r := []rune(out); len(r) > 120 {
		out = string(r[:120])
	}
	return out
}
