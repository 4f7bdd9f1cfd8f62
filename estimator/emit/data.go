package emit

import (
	"bytes"
	"encoding/json"
	"fmt"
	"strconv"
	"strings"

	"polewright/estimator"
)

// formName is the form's name on the command line.
func (p *program) formName() string {
	if p.form == estimator.Current {
		return "current"
	}
	return "prediction"
}

// document is the JSON file. Matrices are row-major nested lists; numbers read
// back exactly.
type document struct {
	Format     int          `json:"format"`
	Kind       string       `json:"kind"`
	Provenance provenance   `json:"provenance"`
	Cautions   []string     `json:"cautions"`
	Form       string       `json:"form"`
	Period     float64      `json:"period_s"`
	States     []signalText `json:"states"`
	Inputs     []signalText `json:"inputs"`
	Sensors    []signalText `json:"sensors"`
	A          [][]float64  `json:"A"`
	B          [][]float64  `json:"B"`
	C          [][]float64  `json:"C"`
	D          [][]float64  `json:"D"`
	Gain       [][]float64  `json:"gain"`         // L; null where the source has none
	Current    [][]float64  `json:"gain_current"` // Lf; null where the source has none
	K          [][]float64  `json:"K"`            // the controller's gain; null without
}

type provenance struct {
	Program       string `json:"program"`
	Version       string `json:"version"`
	Plant         string `json:"plant"`
	Candidate     string `json:"candidate"`
	PlantSHA256   string `json:"plant_sha256"`
	SessionSHA256 string `json:"session_sha256"`
}

type signalText struct {
	Name       string    `json:"name"`
	Identifier string    `json:"identifier"`
	Unit       string    `json:"unit"`
	Offset     float64   `json:"operating_point"`
	Role       string    `json:"role,omitempty"`
	Range      []float64 `json:"range,omitempty"`
	Wrap       float64   `json:"wrap,omitempty"`
}

// jsonText returns the design as JSON in ASCII.
func jsonText(p *program) ([]byte, error) {
	doc := document{
		Format: 1, Kind: "estimator", Cautions: p.cautions, Form: p.formName(), Period: p.period,
		Provenance: provenance{"polewright", p.src.Version, p.src.Plant, p.src.Candidate, p.src.PlantSHA256, p.src.SessionSHA256},
		States:     signalTexts(p.states, p.x0), Inputs: signalTexts(p.inputs, p.u0), Sensors: signalTexts(p.sensors, p.y0),
		A: nested(p.a, p.n, p.n), B: nested(p.b, p.n, p.m), C: nested(p.c, p.p, p.n), D: nested(p.d, p.p, p.m),
	}
	for i := range doc.States {
		doc.States[i].Role = p.roleName(i)
	}
	for i := range doc.Sensors {
		if p.hasRange[i] {
			doc.Sensors[i].Range = p.src.Sensors[i].Range
		}
		doc.Sensors[i].Wrap = p.wrap[i]
	}
	for _, g := range p.gains() {
		if g.name == "L" {
			doc.Gain = nested(g.v, p.n, p.p)
		} else {
			doc.Current = nested(g.v, p.n, p.p)
		}
	}
	if p.k != nil {
		doc.K = nested(p.k, p.m, p.n)
	}
	text, err := json.MarshalIndent(doc, "", " ")
	if err != nil {
		return nil, fmt.Errorf("%w: %w", ErrValue, err)
	}
	return asciiJSON(append(text, '\n')), nil
}

// asciiJSON writes everything but printable ASCII and line breaks as \u escapes,
// so that no terminal or viewer is fooled by it.
func asciiJSON(text []byte) []byte {
	var out bytes.Buffer
	for _, r := range string(text) {
		switch {
		case r == '\n' || r >= ' ' && r < 0x7f:
			out.WriteRune(r)
		case r > 0xffff:
			r -= 0x10000
			fmt.Fprintf(&out, `\u%04x\u%04x`, 0xd800+r>>10, 0xdc00+r&0x3ff)
		default:
			fmt.Fprintf(&out, `\u%04x`, r)
		}
	}
	return out.Bytes()
}

func signalTexts(signals []named, offset []float64) []signalText {
	t := make([]signalText, len(signals))
	for i, s := range signals {
		t[i] = signalText{Name: s.name, Identifier: s.id, Unit: s.unit, Offset: offset[i]}
	}
	return t
}

func (p *program) roleName(i int) string {
	if p.roles == nil {
		return "plant"
	}
	switch p.roles[i] {
	case estimator.LagState:
		return "lag"
	case estimator.DelayRegister:
		return "delay"
	case estimator.UnknownState:
		return "unknown"
	}
	return "plant"
}

func nested(v []float64, rows, cols int) [][]float64 {
	m := make([][]float64, rows)
	for i := range m {
		m[i] = row(v, i, cols)
	}
	return m
}

// gainTable is a gain that the source has.
type gainTable struct {
	name string
	v    []float64
}

// gains returns L and Lf where the source has them in the right shape; the one
// that the form uses is always there.
func (p *program) gains() []gainTable {
	var list []gainTable
	for _, f := range []estimator.Form{estimator.Prediction, estimator.Current} {
		s := *p.src
		s.Form = f
		from, name := gainOf(&s)
		if from == nil {
			continue
		}
		if v, err := flat(name, from, p.n, p.p); err == nil {
			list = append(list, gainTable{name, v})
		}
	}
	return list
}

// csvText returns the design as one long table: what, place, names, unit and
// value, one entry per line (RFC 4180).
func csvText(p *program) []byte {
	var w bytes.Buffer
	record := func(fields ...string) {
		for i, f := range fields {
			if i > 0 {
				w.WriteByte(',')
			}
			w.WriteString(csvField(f))
		}
		w.WriteString("\r\n")
	}
	record("item", "row", "column", "row_name", "column_name", "unit", "value")
	for _, t := range [][2]string{
		{"program", "polewright"}, {"version", p.src.Version}, {"plant", p.src.Plant}, {"candidate", p.src.Candidate},
		{"plant_sha256", p.src.PlantSHA256}, {"session_sha256", p.src.SessionSHA256},
		{"form", p.formName()}, {"period_s", full(p.period)},
	} {
		record(t[0], "", "", "", "", "", t[1])
	}
	for i, c := range p.cautions {
		record("caution", strconv.Itoa(i+1), "", "", "", "", c)
	}
	column := func(item string, signals []named, v []float64) {
		for i, s := range signals {
			record(item, strconv.Itoa(i+1), "", s.name, "", s.unit, full(v[i]))
		}
	}
	column("state_operating_point", p.states, p.x0)
	column("input_operating_point", p.inputs, p.u0)
	column("sensor_operating_point", p.sensors, p.y0)
	for i, s := range p.sensors {
		if p.hasRange[i] {
			r := p.src.Sensors[i].Range
			record("sensor_low", strconv.Itoa(i+1), "", s.name, "", s.unit, full(r[0]))
			record("sensor_high", strconv.Itoa(i+1), "", s.name, "", s.unit, full(r[1]))
		}
		if p.wrap[i] > 0 {
			record("sensor_wrap", strconv.Itoa(i+1), "", s.name, "", s.unit, full(p.wrap[i]))
		}
	}
	matrix := func(item string, v []float64, rows, cols []named) {
		for i, r := range rows {
			for j, c := range cols {
				record(item, strconv.Itoa(i+1), strconv.Itoa(j+1), r.name, c.name, "", full(v[i*len(cols)+j]))
			}
		}
	}
	matrix("A", p.a, p.states, p.states)
	matrix("B", p.b, p.states, p.inputs)
	matrix("C", p.c, p.sensors, p.states)
	matrix("D", p.d, p.sensors, p.inputs)
	for _, g := range p.gains() {
		matrix(g.name, g.v, p.states, p.sensors)
	}
	if p.k != nil {
		matrix("K", p.k, p.inputs, p.states)
	}
	return w.Bytes()
}

// csvField quotes a field. Characters that a terminal could obey are written
// as their code point, and a text that a spreadsheet would take for a formula
// gets an apostrophe in front; numbers stay as they are.
func csvField(s string) string {
	if _, err := strconv.ParseFloat(s, 64); err == nil {
		return s
	}
	var b strings.Builder
	for _, r := range s {
		if strconv.IsPrint(r) {
			b.WriteRune(r)
		} else {
			fmt.Fprintf(&b, "<U+%04X>", r)
		}
	}
	s = b.String()
	if s != "" && strings.ContainsRune("=+-@", rune(s[0])) {
		s = "'" + s
	}
	if strings.ContainsAny(s, `",`) {
		s = `"` + strings.ReplaceAll(s, `"`, `""`) + `"`
	}
	return s
}
