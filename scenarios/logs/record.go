package logs

import (
	"context"
	"io"
	"math"
)

// Record is a window of a log, or any samples at all, in memory: for repeated runs
// while a design changes. It is immutable once it is filled.
type Record struct {
	layout *Layout
	survey Survey

	inputs, sensors, references int

	data []float64 // per sample: T, U, Y, Reference
	info []sampleInfo
}

type sampleInfo struct {
	missing, line int
	held          bool
}

// Load takes the samples of a log from the time `from` in s on into memory, at
// most `most` of them. Survey then speaks of these.
func Load(ctx context.Context, log Recording, from float64, most int) (*Record, error) {
	v, l := *log.Survey(), log.Layout()
	source, err := log.Samples()
	if err != nil {
		return nil, err
	}
	r := &Record{layout: l, survey: v, inputs: len(l.Inputs), sensors: len(l.Sensors), references: len(v.References)}
	r.survey.Lost = make([]int64, len(l.Sensors))
	r.survey.Missing, r.survey.Held, r.survey.Start, r.survey.End = 0, 0, math.NaN(), math.NaN()
	for k := 0; len(r.info) < most; k++ {
		if k%4096 == 0 && ctx.Err() != nil {
			return nil, ctx.Err()
		}
		s, err := source.Next()
		if err == io.EOF {
			break
		}
		if err != nil {
			return nil, err
		}
		if s.T >= from {
			r.add(s)
		}
	}
	r.survey.Samples = int64(len(r.info))
	r.survey.Rows = r.survey.Samples
	return r, nil
}

// add appends a sample.
func (r *Record) add(s *Sample) {
	v := &r.survey
	missing := s.Missing
	if len(r.info) == 0 {
		v.Start, missing = s.T, 0
	}
	v.End = s.T
	v.Missing += int64(missing)
	if s.Held {
		v.Held++
	}
	for i, y := range s.Y {
		if y != y {
			v.Lost[i]++
		}
	}
	r.data = append(r.data, s.T)
	r.data = append(r.data, s.U...)
	r.data = append(r.data, s.Y...)
	r.data = append(r.data, s.Reference...)
	r.info = append(r.info, sampleInfo{missing, s.Line, s.Held})
}

// Layout returns the layout of the log.
func (r *Record) Layout() *Layout { return r.layout }

// Survey returns what the record holds; its period and jitter are the whole log's.
func (r *Record) Survey() *Survey { return &r.survey }

// Samples starts at the first sample; any number of sources may be in use.
func (r *Record) Samples() (Source, error) { return &recordSource{r: r}, nil }

type recordSource struct {
	r   *Record
	k   int
	now Sample
}

func (s *recordSource) Next() (*Sample, error) {
	r := s.r
	if s.k == len(r.info) {
		return nil, io.EOF
	}
	u, y := 1, 1+r.inputs
	ref := y + r.sensors
	end := ref + r.references
	row := r.data[s.k*end : (s.k+1)*end]
	info := &r.info[s.k]
	s.now = Sample{
		T: row[0], U: row[u:y], Y: row[y:ref], Reference: row[ref:],
		Missing: info.missing, Held: info.held, Line: info.line,
	}
	s.k++
	return &s.now, nil
}
