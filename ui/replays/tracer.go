package replays

import (
	"math"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/scenarios/logs"
)

// TraceBins bounds the bins of a trace.
const TraceBins = 600

// tracer thins the innovations of a replay, and what the estimate is held against.
type tracer struct {
	start, period float64
	slots         int
	bins          [][]float64

	references []reference
	followed   [][2][]float64
}

// reference is a state, or a combination of states.
type reference struct {
	zero  float64 // the log's column at zero deviation
	index int
	row   []float64 // combination of states; nil for one state
}

func newTracer(v *logs.Survey, l *logs.Layout, m *estimator.Model) *tracer {
	slots := math.Round((v.End-v.Start)/l.Period) + 1
	t := &tracer{start: v.Start, period: l.Period, slots: int(math.Min(math.Max(slots, 1), math.MaxInt32))}
	for range l.Sensors {
		t.bins = append(t.bins, t.empty())
	}
	for _, ref := range v.References {
		r := reference{index: ref.Index}
		if ref.Output {
			r.zero, r.row = l.Outputs[ref.Index].Operating, mat.Row(nil, ref.Index, m.Outputs)
		} else {
			r.zero = l.States[ref.Index].Operating
		}
		t.references = append(t.references, r)
		t.followed = append(t.followed, [2][]float64{t.empty(), t.empty()})
	}
	return t
}

// empty are bins without anything.
func (t *tracer) empty() []float64 {
	bins := make([]float64, min(TraceBins, t.slots))
	for i := range bins {
		bins[i] = math.NaN()
	}
	return bins
}

// take puts a row into its bin.
func (t *tracer) take(row *logs.Row) error {
	slot := math.Round((row.Sample.T - t.start) / t.period)
	bins := min(TraceBins, t.slots)
	k := int(math.Min(math.Max(slot*float64(bins)/float64(t.slots), 0), float64(bins-1)))
	for i, e := range row.Innovation {
		if old := t.bins[i][k]; math.IsNaN(old) || math.Abs(e) > math.Abs(old) {
			t.bins[i][k] = e
		}
	}
	for i := range t.references {
		f, r := &t.followed[i], &t.references[i]
		if math.IsNaN(f[0][k]) {
			f[0][k], f[1][k] = row.Sample.Reference[i]+r.zero, r.of(row.Estimate)
		}
	}
	return nil
}

// of is the estimate of the reference, from absolute states: a combination of these
// is absolute too.
func (r *reference) of(x []float64) float64 {
	if r.row == nil {
		return x[r.index]
	}
	v := 0.0
	for i, c := range r.row {
		v += c * x[i]
	}
	return v
}
