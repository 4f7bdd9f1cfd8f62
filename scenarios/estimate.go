package scenarios

import (
	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
)

// estimate is the estimator as the firmware runs it, in discrete time. v holds
// the state, the input and (prediction form) the innovation, one after the
// other, so that one product gives the next state.
type estimate struct {
	n, m, p int
	next    flat // n×(n+m+p): A B L, or A B without use of the last columns
	lf      flat // n×p
	v, to   []float64
}

func newEstimate(model *estimator.Model) estimate {
	n, m, p := model.Dims()
	s := estimate{n: n, m: m, p: p, next: newFlat(n, n+m+p), lf: newFlat(n, p)}
	s.next.put(0, 0, model.A)
	s.next.put(0, n, model.B)
	s.v, s.to = make([]float64, n+m+p), make([]float64, n+m+p)
	return s
}

func (s *estimate) takePrediction(l *mat.Dense) { s.next.put(0, s.n+s.m, l) }

func (s *estimate) takeCurrent(lf *mat.Dense) {
	s.lf.put(0, 0, lf)
	for i := range s.n {
		clear(s.next.row(i)[s.n+s.m:])
	}
}

func (s *estimate) begin(x []float64) {
	clear(s.v)
	copy(s.v, x)
}

// correct adds Lf e to the state: x̂[k|k].
func (s *estimate) correct(e []float64) {
	for i := range s.n {
		sum := s.v[i]
		for j, l := range s.lf.row(i) {
			sum += float64(l * e[j])
		}
		s.v[i] = sum
	}
}

// advance goes to the next step, with the input and the innovation in v.
func (s *estimate) advance() {
	s.next.mul(s.to[:s.n], s.v)
	copy(s.v, s.to[:s.n])
}
