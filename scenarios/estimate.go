package scenarios

import (
	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
)

// estimate is the estimator as the firmware runs it, in discrete time. It works
// on rows of n+m+p values: the state, the input and the innovation, one after
// the other, so that one product gives the next state.
type estimate struct {
	n, m, p  int
	all, own flat   // n×(n+m+p): A B L; n×(n+m): A B
	next     packed // A B L, in current form A B
	lf       packed // n×p
	gain     flat
	nothing  []float64
	filtered []float64
}

func newEstimate(model *estimator.Model) estimate {
	n, m, p := model.Dims()
	s := estimate{n: n, m: m, p: p, all: newFlat(n, n+m+p), gain: newFlat(n, p), nothing: make([]float64, n), filtered: make([]float64, n)}
	s.all.put(0, 0, model.A)
	s.all.put(0, n, model.B)
	s.own = subFlat(s.all, 0, n+m)
	return s
}

func (s *estimate) takePrediction(l *mat.Dense) {
	s.all.put(0, s.n+s.m, l)
	s.next.pack(s.all)
}

func (s *estimate) takeCurrent(lf *mat.Dense) {
	s.gain.put(0, 0, lf)
	s.lf.pack(s.gain)
	s.next.pack(s.own)
}

// correct adds Lf e to the state of a row: x̂[k|k].
func (s *estimate) correct(v []float64) {
	s.lf.mulAdd(s.filtered, v[s.n+s.m:], v)
	copy(v, s.filtered)
}

// advance writes the next state, given the row of this step.
func (s *estimate) advance(to, v []float64) { s.next.mulAdd(to[:s.n], v, s.nothing) }
