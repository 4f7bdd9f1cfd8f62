package views

import (
	"errors"
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/plants"
	"polewright/ui/desk"
)

// Seen is what a set of sensors sees. It is immutable.
type Seen struct {
	Plugged  []bool // one entry per sensor of the plant file
	Model    *estimator.Model
	Analysis *estimator.Analysis
	// Parts are, per mode, the shares of the states in it, as Direction gives them;
	// nil where that was not found.
	Parts [][]complex128
	Err   error // why the set cannot be judged; the rest is nil then
}

var errNoSensor = errors.New("without any sensor there is nothing to estimate from")

// See judges what the plugged sensors of a bench see. It takes as long as a
// design does: not for the drawing of a frame.
func See(b *desk.Bench, form estimator.Form, plugged []bool) *Seen {
	s := &Seen{Plugged: append([]bool(nil), plugged...)}
	any := false
	for _, on := range plugged {
		any = any || on
	}
	if !any {
		s.Err = errNoSensor
		return s
	}
	period := b.Model.Period
	m, err := b.Plant.Model(plants.Options{Period: &period, Sensors: s.Plugged})
	if err != nil {
		s.Err = err
		return s
	}
	d, err := estimator.NewDesigner(m, estimator.Options{Form: form})
	if err != nil {
		s.Err = err
		return s
	}
	s.Model, s.Analysis = m, d.Analysis()
	for _, mode := range s.Analysis.Observability.Modes {
		s.Parts = append(s.Parts, Direction(m, mode.Eigenvalue))
	}
	return s
}

// whisper weighs the sensors against the dynamics where a mode's direction is
// sought: little enough to leave a single mode's direction alone, enough to choose
// among several modes at one place.
const whisper = 1e-6

// Direction returns the direction of the mode at lambda, an eigenvalue of A: the
// unit vector, complex and in scaled coordinates, in which it moves. Where several
// modes share the place it is the one that the sensors see least. The largest
// entry is real and positive. It is nil for sizes that do not fit and where no
// answer is found.
//
// It is the right singular vector of [A − λI; whisper·C] that belongs to the least
// singular value. The complex matrix P + iQ is embedded as [P −Q; Q P], whose
// singular values are the same, each twice.
func Direction(m *estimator.Model, lambda complex128) []complex128 {
	if m == nil || m.Check() != nil || cmplx.IsNaN(lambda) || cmplx.IsInf(lambda) {
		return nil
	}
	n, _, p := m.Dims()
	scale := func(list []float64, i int) float64 {
		if i < len(list) && list[i] > 0 {
			return list[i]
		}
		return 1
	}
	e := mat.NewDense(2*(n+p), 2*n, nil)
	for j := range n {
		for i := range n {
			v := m.A.At(i, j) * scale(m.StateScale, j) / scale(m.StateScale, i)
			if i == j {
				v -= real(lambda)
				e.Set(i, n+j, imag(lambda))
				e.Set(n+p+i, j, -imag(lambda))
			}
			e.Set(i, j, v)
			e.Set(n+p+i, n+j, v)
		}
		for i := range p {
			v := whisper * m.C.At(i, j) * scale(m.StateScale, j) / scale(m.SensorScale, i)
			e.Set(n+i, j, v)
			e.Set(n+p+n+i, n+j, v)
		}
	}
	var svd mat.SVD
	if !svd.Factorize(e, mat.SVDThinV) {
		return nil
	}
	var v mat.Dense
	svd.VTo(&v)
	out := make([]complex128, n)
	for i := range out {
		out[i] = complex(v.At(i, 2*n-1), v.At(n+i, 2*n-1))
	}
	return turned(out)
}

// turned gives a vector the phase that makes its largest entry real and positive.
func turned(v []complex128) []complex128 {
	large := 0
	for i := range v {
		if cmplx.Abs(v[i]) > cmplx.Abs(v[large])*(1+1e-6) {
			large = i
		}
	}
	size := cmplx.Abs(v[large])
	if !(size > 0) || math.IsInf(size, 0) {
		return nil
	}
	turn := cmplx.Conj(v[large]) / complex(size, 0)
	for i := range v {
		v[i] *= turn
	}
	return v
}
