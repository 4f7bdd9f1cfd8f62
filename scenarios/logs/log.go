package logs

import (
	"context"
	"fmt"
	"io"
	"math"
)

// Survey is what a log holds, known before it is replayed.
type Survey struct {
	// File is the log's name for errors.
	File string
	// Rows of the log, and samples that a replay takes from it: the same but for
	// resampled logs.
	Rows, Samples int64
	// Missing is how many rows are missing between the first and the last.
	Missing int64
	// Lost has one count per sensor of empty or NaN fields, Held counts the rows
	// where an input was lost and its last value stands for it.
	Lost []int64
	Held int64
	// Start and End are the times of the first and the last row in s.
	Start, End float64
	// Period is the measured period in s, Jitter the largest deviation of an
	// interval from it (missing rows taken into account) over the period.
	Period, Jitter float64
	// Resampled tells that the log is held on the design's period.
	Resampled bool
	// PassedOver are the names of the columns that have no use here.
	PassedOver []string
	// References are the states and outputs that the log has a column for.
	References []Reference

	interval float64 // median of the first intervals
}

// Reference is a column to compare an estimate with.
type Reference struct {
	Name, Unit string
	// Index of the state, or of the output where Output is true.
	Index  int
	Output bool
}

// Recording is a log that can be replayed any number of times.
type Recording interface {
	Layout() *Layout
	Survey() *Survey
	// Samples starts again at the first sample.
	Samples() (Source, error)
}

// Source gives samples one by one, io.EOF behind the last. A sample is
// overwritten by the call after.
type Source interface {
	Next() (*Sample, error)
}

// Log is a log in a file, read anew for every use.
type Log struct {
	src    io.ReadSeeker
	start  int64
	layout *Layout
	opt    Options
	survey Survey
	file   rows
}

// Open reads a log from where src stands to its end and checks it: its columns,
// every number, its times and its period. The error is a *plants.Error where the
// log or the options are to blame, else that of src or of the context.
//
// Without Resample, the measured period must be the design's within 1 %.
func Open(ctx context.Context, src io.ReadSeeker, l *Layout, o Options) (*Log, error) {
	start, err := src.Seek(0, io.SeekCurrent)
	if err != nil {
		return nil, fmt.Errorf("reading a log twice: %w", err)
	}
	g := &Log{src: src, start: start, layout: l, opt: o}
	r := &g.file
	if err := r.open(src, l, o); err != nil {
		return nil, err
	}
	var p pace
	for {
		if r.count%4096 == 0 && ctx.Err() != nil {
			return nil, ctx.Err()
		}
		err := r.next()
		if err == io.EOF {
			break
		}
		if err != nil {
			return nil, err
		}
		p.add(r.now.T, r.now.Line)
	}
	p.finish()
	if r.count < 2 {
		rows := fmt.Sprintf("%d rows", r.count)
		if r.count == 1 {
			rows = "1 row"
		}
		return nil, r.fault("", rows+" below the header", "expected at least 2")
	}
	if err := g.checkPace(&p); err != nil {
		return nil, err
	}
	g.survey = Survey{
		File: o.File,
		Rows: r.count, Samples: r.count, Missing: p.missing, Lost: r.lost, Held: r.held,
		Start: p.begin, End: p.end, Period: p.period(), Jitter: p.jitter(), interval: p.median,
	}
	if o.Resample {
		g.survey.Resampled = true
		g.survey.Samples = int64(gridSize(p.begin, p.end, l.Period))
	}
	for _, c := range r.columns {
		if c.kind == passedOver {
			g.survey.PassedOver = append(g.survey.PassedOver, c.name)
		}
	}
	for _, c := range r.references {
		s := l.States
		if c.kind == outputColumn {
			s = l.Outputs
		}
		g.survey.References = append(g.survey.References, Reference{
			Name: s[c.index].Name, Unit: s[c.index].Unit, Index: c.index, Output: c.kind == outputColumn,
		})
	}
	return g, nil
}

// checkPace holds the log's times against the design's period.
func (g *Log) checkPace(p *pace) error {
	want := g.layout.Period
	step := p.median
	if g.opt.Resample {
		step = want
	}
	if !(p.longest.span/step <= maxGap) {
		return g.file.fault(fmt.Sprintf("line %d", p.longest.line), fmt.Sprintf("a gap of %.6g s", p.longest.span), fmt.Sprintf("expected at most %d sample periods; cut the log there", maxGap))
	}
	if g.opt.Resample {
		return nil
	}
	have := p.period()
	if math.Abs(have/want-1) <= 0.01 {
		return nil
	}
	return g.file.fault("column "+quote(g.file.timeField()),
		fmt.Sprintf("a row every %.6g s, but the design's period is %.6g s", have, want),
		fmt.Sprintf("expected the same within 1 %%: design for the log's period (period_s, or --period %.6g for a continuous plant), or hold its last values on the design's (--resample)", have))
}

// Layout returns what the log was opened with.
func (g *Log) Layout() *Layout { return g.layout }

// Survey returns what the log holds. It is immutable.
func (g *Log) Survey() *Survey { return &g.survey }

// Samples rewinds the log. One source of a log is in use at a time.
func (g *Log) Samples() (Source, error) {
	if _, err := g.src.Seek(g.start, io.SeekStart); err != nil {
		return nil, fmt.Errorf("reading a log again: %w", err)
	}
	if err := g.file.open(g.src, g.layout, g.opt); err != nil {
		return nil, err
	}
	if g.opt.Resample {
		return newGrid(&g.file.queue, g.layout.Period, g.survey.interval), nil
	}
	return newPaced(&g.file.queue, g.survey.interval), nil
}
