package logs

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"math"
	"unicode/utf8"

	"polewright/plants"
)

// Options say how a log is read. The zero value reads it as it stands.
type Options struct {
	// File is the log's name for errors.
	File string
	// Names renames columns: from the log's name to the plant's. An empty name
	// leaves a column out; "*" with an empty name leaves out all that the plant does
	// not know, which is an error else.
	Names map[string]string
	// InputLag takes the inputs of row k from row k − InputLag, −10000 to 10000.
	// Rows beyond the ends of the log hold its first or last inputs.
	InputLag int
	// Resample holds the last row on the grid of the design's period; else the log
	// must have that period.
	Resample bool
}

const maxLag = 10000

// Sample is one instant of a log. What its slices hold lasts until the next one
// is asked for.
type Sample struct {
	// T is the log's own time in s.
	T float64
	// Missing is how many sample periods passed without a row since the sample
	// before, beyond the one that is due.
	Missing int
	// U and Y are the inputs and sensors as deviations from the operating point.
	// A lost sensor is NaN.
	U, Y []float64
	// Held tells that an input was lost and its last value stands for it.
	Held bool
	// Reference has one deviation per reference of the survey; NaN where the log
	// has none.
	Reference []float64
	// Line of the file, from 1.
	Line int
}

func newSample(inputs, sensors, references int) Sample {
	list := make([]float64, inputs+sensors+references)
	return Sample{U: list[:inputs], Y: list[inputs : inputs+sensors], Reference: list[inputs+sensors:]}
}

func (s *Sample) copyFrom(o *Sample) {
	s.T, s.Missing, s.Held, s.Line = o.T, o.Missing, o.Held, o.Line
	copy(s.U, o.U)
	copy(s.Y, o.Y)
	copy(s.Reference, o.Reference)
}

// rows reads a log row by row.
type rows struct {
	split   splitter
	layout  *Layout
	opt     Options
	columns []column
	// references are the meanings of the reference columns, in their order.
	references []column
	slot       []int // per column, its place in references

	now   Sample
	count int64
	lost  []int64 // per sensor
	held  int64

	queue lagQueue
}

// open reads the header.
func (r *rows) open(src io.Reader, l *Layout, o Options) error {
	r.layout, r.opt = l, o
	if o.InputLag < -maxLag || o.InputLag > maxLag {
		return r.fault("input lag", fmt.Sprintf("%d rows", o.InputLag), fmt.Sprintf("expected at most %d either way", maxLag))
	}
	r.split.reset(src)
	header, err := r.split.next()
	if err == io.EOF {
		return r.fault("", "the file is empty", "expected a header line with "+quoteAll(l.needed()))
	}
	if err != nil {
		return r.unreadable(err)
	}
	if bad := r.checkHeader(header); bad != nil {
		return bad
	}
	columns, bad := l.columns(header, o.Names)
	if bad != nil {
		bad.File = o.File
		return bad
	}
	r.columns, r.references, r.slot = columns, nil, make([]int, len(columns))
	for i, c := range columns {
		if c.kind == stateColumn || c.kind == outputColumn {
			r.slot[i] = len(r.references)
			r.references = append(r.references, c)
		}
	}
	r.now = newSample(len(l.Inputs), len(l.Sensors), len(r.references))
	r.lost = make([]int64, len(l.Sensors))
	r.count, r.held = 0, 0
	r.queue.reset(r, o.InputLag)
	return nil
}

// checkHeader refuses what is no header of a CSV file.
func (r *rows) checkHeader(header [][]byte) error {
	whole := bytes.Join(header, []byte{','})
	if bytes.HasPrefix(whole, []byte("\xff\xfe")) || bytes.HasPrefix(whole, []byte("\xfe\xff")) {
		return r.fault("line 1", "the text is UTF-16", "expected UTF-8")
	}
	if bytes.IndexByte(whole, 0) >= 0 || !utf8.Valid(whole) {
		return r.unreadable(errBinary)
	}
	if len(header) == 1 && bytes.ContainsAny(whole, ";\t") {
		return r.fault("line 1", "the columns are not separated by commas", "expected commas between columns and a point in numbers")
	}
	numeric := true
	for _, f := range header {
		if v, ok := number(f); !ok || math.IsNaN(v) {
			numeric = false
		}
	}
	if numeric {
		return r.fault("line 1", "no header, only numbers", "expected a header line with "+quoteAll(r.layout.needed()))
	}
	return nil
}

// next reads the next row into now. It returns io.EOF at the end.
func (r *rows) next() error {
	fields, err := r.split.next()
	if err == io.EOF {
		return err
	}
	if err != nil {
		return r.unreadable(err)
	}
	if len(fields) != len(r.columns) {
		return r.mismatch(fields)
	}
	s, l := &r.now, r.layout
	before := s.T
	s.Held, s.Line = false, r.split.line
	for i := range r.columns {
		c := &r.columns[i]
		if c.kind == passedOver {
			continue
		}
		v, ok := number(fields[i])
		if !ok {
			return r.notNumber(c, fields[i])
		}
		switch c.kind {
		case timeColumn:
			if v != v {
				return r.fault(r.place(c), "no time", "expected seconds in every row")
			}
			s.T = v
		case inputColumn:
			switch {
			case v == v:
				s.U[c.index] = v - l.Inputs[c.index].Operating
			default:
				s.Held = true // the value before, at first zero deviation, stays
			}
		case sensorColumn:
			s.Y[c.index] = v - l.Sensors[c.index].Operating
			if v != v {
				r.lost[c.index]++
			}
		case stateColumn:
			s.Reference[r.slot[i]] = v - l.States[c.index].Operating
		case outputColumn:
			s.Reference[r.slot[i]] = v - l.Outputs[c.index].Operating
		}
	}
	if s.Held {
		r.held++
	}
	if r.count > 0 && !(s.T > before) {
		return r.fault(fmt.Sprintf("line %d, column %s", s.Line, quote(r.timeField())), fmt.Sprintf("%g s after %g s", s.T, before), "expected a later time in every row")
	}
	r.count++
	return nil
}

func (r *rows) timeField() string {
	for _, c := range r.columns {
		if c.kind == timeColumn {
			return c.name
		}
	}
	return timeName
}

func (r *rows) place(c *column) string {
	return fmt.Sprintf("line %d, column %s", r.split.line, quote(c.name))
}

func (r *rows) fault(where, wrong, expected string) error {
	return &plants.Error{File: r.opt.File, Where: where, Wrong: wrong, Expected: expected}
}

func (r *rows) notNumber(c *column, field []byte) error {
	if bytes.IndexByte(field, 0) >= 0 {
		return r.unreadable(errBinary)
	}
	expected := "expected a number, nothing or NaN"
	if c.kind == timeColumn {
		expected = "expected seconds as a number"
	}
	return r.fault(r.place(c), quote(string(field)), expected)
}

func (r *rows) mismatch(fields [][]byte) error {
	for _, f := range fields {
		if bytes.IndexByte(f, 0) >= 0 {
			return r.unreadable(errBinary)
		}
	}
	have := fmt.Sprintf("%d fields", len(fields))
	if len(fields) == 1 {
		have = "1 field"
	}
	return r.fault(fmt.Sprintf("line %d", r.split.line), have, fmt.Sprintf("expected %d as in the header", len(r.columns)))
}

func (r *rows) unreadable(err error) error {
	at := fmt.Sprintf("line %d", r.split.line)
	if errors.Is(err, errLong) && bytes.IndexByte(r.split.buf[r.split.lo:r.split.hi], 0) >= 0 {
		err = errBinary
	}
	switch {
	case errors.Is(err, errBinary):
		return r.fault(at, errBinary.Error(), "expected a CSV file")
	case errors.Is(err, errLong):
		return r.fault(at, errLong.Error(), "expected shorter lines")
	case errors.Is(err, errQuote):
		return r.fault(at, errQuote.Error(), `expected quotes around a whole field, doubled inside it`)
	}
	if r.opt.File != "" {
		return fmt.Errorf("%s: %s: %w", r.opt.File, at, err)
	}
	return fmt.Errorf("%s: %w", at, err)
}
