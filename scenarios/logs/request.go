package logs

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/plants"
)

// Gain is an estimator for a replay.
type Gain struct {
	// L is n×p, of the prediction form.
	L *mat.Dense
	// Lf is the current form's with A Lf = L; nil runs the prediction form.
	Lf *mat.Dense
	// Settle is the time in s that an error takes to die out: as long after a loss,
	// samples stay out of the statistics. NaN counts as 0.
	Settle float64
}

// GainOf takes the gain of a design, in its form.
func GainOf(d *estimator.Design) Gain {
	g := Gain{L: d.Gain, Settle: d.Transient.Settle}
	if d.Form == estimator.Current {
		g.Lf = d.GainCurrent
	}
	return g
}

// FloorGain takes the gain of the best linear estimator, in prediction form: the
// innovations of both forms are the same. It is nil where there is no floor, and
// fails where the model does.
func FloorGain(m *estimator.Model, a *estimator.Analysis) (*Gain, error) {
	if a == nil || a.Floor == nil {
		return nil, nil
	}
	d, err := estimator.NewDesigner(m, estimator.Options{})
	if err != nil {
		return nil, err
	}
	design, err := d.Judge(estimator.Given{L: a.Floor.Gain})
	if err != nil {
		return nil, fmt.Errorf("judging the floor gain: %w", err)
	}
	g := GainOf(design)
	return &g, nil
}

// Request is one replay.
type Request struct {
	Model *estimator.Model
	Gain  Gain
	// Floor is the floor gain of the model, whose innovations alone are white if
	// the model is true; nil leaves whiteness out.
	Floor *Gain
	Start Start
	// Skip is the time in s at the start that stays out of the statistics; nil is
	// the first tenth of the samples.
	Skip *float64
	// Each is called for every sample of the log, nil for none. Its error ends the
	// replay.
	Each func(*Row) error
}

// Row is what the estimator makes of one sample. Its slices last until the next.
type Row struct {
	Sample *Sample
	// Estimate has an absolute value per state: x̂[k|k−1] in prediction form, x̂[k|k]
	// in current form.
	Estimate []float64
	// Innovation has one entry per sensor, NaN where it was lost.
	Innovation []float64
}

func (q *Request) check(l *Layout, v *Survey) error {
	if q.Model == nil {
		return fmt.Errorf("no model to replay: %w", estimator.ErrShape)
	}
	if err := q.Model.Check(); err != nil {
		return err
	}
	n, inputs, p := q.Model.Dims()
	if len(l.Inputs) != inputs || len(l.Sensors) != p || len(l.States) != n || l.Period != q.Model.Period {
		return fmt.Errorf("the log was opened for another model: %w", estimator.ErrShape)
	}
	outputs := 0
	if q.Model.Outputs != nil {
		outputs, _ = q.Model.Outputs.Dims()
	}
	for _, ref := range v.References {
		if ref.Index < 0 || ref.Index >= n && !ref.Output || ref.Index >= outputs && ref.Output {
			return fmt.Errorf("the log has a reference that the model has not: %w", estimator.ErrShape)
		}
	}
	if err := q.Gain.check(n, p); err != nil {
		return err
	}
	if q.Floor != nil {
		if err := q.Floor.check(n, p); err != nil {
			return fmt.Errorf("the floor: %w", err)
		}
	}
	if s := q.Skip; s != nil && !(*s >= 0) {
		return &plants.Error{Where: "skip", Wrong: fmt.Sprintf("%g s", *s), Expected: "expected 0 or above"}
	}
	return nil
}

func (g *Gain) check(n, p int) error {
	if g.L == nil {
		return fmt.Errorf("no gain to replay: %w", estimator.ErrShape)
	}
	for _, l := range []*mat.Dense{g.L, g.Lf} {
		if l == nil {
			continue
		}
		if r, c := l.Dims(); r != n || c != p {
			return fmt.Errorf("the gain is %d×%d, expected %d×%d: %w", r, c, n, p, estimator.ErrShape)
		}
		for i := range n {
			for j := range p {
				if v := l.At(i, j); math.IsNaN(v) || math.IsInf(v, 0) {
					return fmt.Errorf("the gain: %w", estimator.ErrNotFinite)
				}
			}
		}
	}
	return nil
}
