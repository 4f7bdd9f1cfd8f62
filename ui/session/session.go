// Package session reads and writes session files: a plant and a scenario with
// their texts whole, the candidates with their stored gains, and the screen's
// view. A session opens on a machine that has nothing else.
package session

import (
	"bytes"
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"os"
	"strings"
	"time"

	"polewright/plants"
	"polewright/scenarios"
	"polewright/ui/desk"
	"polewright/ui/measures"
)

// Format is the newest format that this program reads, and the one it writes.
const Format = 1

// Ending is what the name of a session file ends in.
const Ending = ".session.json"

// Bounds on what is read: bytes of a file and of each text in it, candidates,
// wanted poles of each, characters of a name, of a note and of a file's name.
const (
	maxFile       = 64 << 20
	maxText       = 1 << 20
	maxCandidates = 100
	maxPoles      = 1000
	maxLetter     = 20
	maxNote       = 80
	maxFileName   = 120
)

type document struct {
	Format     int         `json:"format"`
	Program    string      `json:"program"`
	Caution    string      `json:"caution"`
	Plant      text        `json:"plant"`
	Scenario   *text       `json:"scenario"`
	Truth      *text       `json:"truth_plant"`
	Period     *float64    `json:"period_s"` // of the design; null for continuous time
	Current    candidate   `json:"current"`
	Candidates []candidate `json:"candidates"`
	Selected   string      `json:"selected"`
	View       desk.View   `json:"view"`
	Journal    *Mark       `json:"journal,omitempty"`
}

// Mark is what the journal of unsaved work notes beside the work.
type Mark struct {
	File    string    `json:"file"`    // session file, absolute; empty where none was named
	Content string    `json:"content"` // SHA-256 of that file as it was read or written
	Plant   string    `json:"plant"`   // name of the plant
	Written time.Time `json:"written"`
}

// text is a file held whole.
type text struct {
	File   string `json:"file"`
	SHA256 string `json:"sha256"`
	Text   string `json:"text"`
}

type candidate struct {
	Name        string              `json:"name"`
	Note        string              `json:"note,omitempty"`
	Plane       string              `json:"plane"` // of the wanted poles: the design's own
	Poles       []measures.Complex  `json:"poles"` // wanted; null for a gain found elsewhere
	Method      string              `json:"method"`
	Form        string              `json:"form"`
	Gain        [][]measures.Number `json:"gain"`
	GainCurrent [][]measures.Number `json:"gain_current"`
	Measures    *measures.Document  `json:"measures,omitempty"`
}

func hold(file string, content []byte) text {
	sum := sha256.Sum256(content)
	return text{File: file, SHA256: hex.EncodeToString(sum[:]), Text: string(content)}
}

// Is tells from its first bytes whether a file is a session rather than a plant
// in JSON.
func Is(file string) bool {
	if strings.HasSuffix(file, Ending) {
		return true
	}
	if !strings.HasSuffix(file, ".json") {
		return false
	}
	data, err := read(file)
	if err != nil {
		return false
	}
	var probe struct {
		Candidates *json.RawMessage `json:"candidates"`
	}
	return json.Unmarshal(data, &probe) == nil && probe.Candidates != nil
}

func read(file string) ([]byte, error) {
	f, err := openRegular(file, os.O_RDONLY)
	if err != nil {
		return nil, err
	}
	defer f.Close()
	data, err := io.ReadAll(io.LimitReader(f, maxFile+1))
	if err == nil && len(data) > maxFile {
		err = fmt.Errorf("larger than %d bytes", maxFile)
	}
	return data, err
}

// Load reads a session file. Stored gains are what its candidates are judged by;
// nothing is designed anew. The error is a *plants.Error where the content is at
// fault.
func Load(file string) (*desk.Work, error) {
	w, _, err := LoadSum(file)
	return w, err
}

// LoadSum is Load that also returns what stands for the content that was read.
func LoadSum(file string) (*desk.Work, Sum, error) {
	data, err := read(file)
	if err != nil {
		return nil, Sum{}, err
	}
	w, err := Decode(file, data)
	if err != nil {
		return nil, Sum{}, err
	}
	w.File = file
	return w, sha256.Sum256(data), nil
}

// Decode reads the content of a session file, which is named in errors.
func Decode(file string, data []byte) (*desk.Work, error) {
	wrong := func(where, wrong, expected string) error {
		return &plants.Error{File: file, Where: where, Wrong: wrong, Expected: expected}
	}
	var probe struct {
		Format *float64 `json:"format"`
	}
	if err := json.Unmarshal(data, &probe); err != nil {
		return nil, wrong(place(data, err), "not a session file: "+plain(err), "JSON as polewright saves it")
	}
	switch {
	case probe.Format == nil:
		return nil, wrong("format", "missing", fmt.Sprint(Format))
	case *probe.Format > Format:
		return nil, wrong("format", fmt.Sprintf("%g was written by a newer polewright", *probe.Format), fmt.Sprintf("at most %d; the file is left as it is", Format))
	case *probe.Format != Format:
		return nil, wrong("format", fmt.Sprintf("%g is unknown", *probe.Format), fmt.Sprint(Format))
	}
	var doc document
	dec := json.NewDecoder(bytes.NewReader(data))
	if err := dec.Decode(&doc); err != nil {
		return nil, wrong(place(data, err), plain(err), "a session as polewright saves it")
	}
	if _, err := dec.Token(); !errors.Is(err, io.EOF) {
		return nil, wrong("end", "more text after the session", "nothing")
	}
	for _, t := range []struct {
		where string
		text  *text
	}{{"plant", &doc.Plant}, {"scenario", doc.Scenario}, {"truth_plant", doc.Truth}} {
		if t.text == nil {
			continue
		}
		if len(t.text.Text) > maxText {
			return nil, wrong(t.where+".text", fmt.Sprintf("%d bytes", len(t.text.Text)), fmt.Sprintf("at most %d", maxText))
		}
		if hold("", []byte(t.text.Text)).SHA256 != t.text.SHA256 {
			return nil, wrong(t.where+".text", "does not match its sha256", "the text as it was saved")
		}
		t.text.File = fileName(t.text.File)
	}
	bench, err := doc.bench(file)
	if err != nil {
		return nil, err
	}
	return doc.work(file, bench)
}

// place is the line of a JSON error.
func place(data []byte, err error) string {
	var syntax *json.SyntaxError
	var kind *json.UnmarshalTypeError
	offset := int64(-1)
	switch {
	case errors.As(err, &syntax):
		offset = syntax.Offset
	case errors.As(err, &kind):
		offset = kind.Offset
	}
	if offset < 0 || offset > int64(len(data)) {
		return "file"
	}
	return fmt.Sprintf("line %d", 1+bytes.Count(data[:offset], []byte("\n")))
}

func plain(err error) string { return strings.TrimPrefix(err.Error(), "json: ") }

// bench rebuilds what the person sat down to from the texts.
func (doc *document) bench(file string) (*desk.Bench, error) {
	inside := func(err error) error {
		var e *plants.Error
		if errors.As(err, &e) {
			c := *e
			c.File = file + ", " + e.File
			return &c
		}
		return fmt.Errorf("%s: %w", file, err)
	}
	b := &desk.Bench{PlantFile: doc.Plant.File, PlantText: []byte(doc.Plant.Text)}
	var err error
	if b.Plant, err = plants.Parse(doc.Plant.File, b.PlantText); err != nil {
		return nil, inside(err)
	}
	if doc.Scenario != nil {
		b.ScenarioFile, b.ScenarioText = doc.Scenario.File, []byte(doc.Scenario.Text)
		if b.Scenario, err = scenarios.Parse(b.ScenarioFile, b.ScenarioText, b.Plant); err != nil {
			return nil, inside(err)
		}
	} else {
		b.Scenario = scenarios.Default(b.Plant)
	}
	if doc.Truth != nil {
		b.TruthFile, b.TruthText = doc.Truth.File, []byte(doc.Truth.Text)
		if b.Truth, err = plants.Parse(b.TruthFile, b.TruthText); err != nil {
			return nil, inside(err)
		}
	}
	period := 0.0
	if doc.Period != nil {
		period = *doc.Period
	}
	if b.Model, err = b.Plant.Model(plants.Options{Period: &period}); err != nil {
		return nil, inside(err)
	}
	return b, nil
}
