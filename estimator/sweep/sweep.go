// Package sweep draws the price of speed: how noise over the floor follows settle
// time when all poles of a design are made faster or slower together, and along
// the family of the best linear estimators, whose assumed process noise is larger
// or smaller than the model's.
package sweep

import (
	"context"
	"errors"
	"fmt"
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/estimator/poles"
)

// Point is one design of a curve.
type Point struct {
	// Factor is that of the speed, or that on the process-noise covariance.
	Factor float64
	// Design is judged by the model's own noise figures; nil where Err says why
	// there is none.
	Design *estimator.Design
	Err    error
}

// Settle is the design's settle time in s, NaN where there is none.
func (p Point) Settle() float64 {
	if p.Design == nil {
		return math.NaN()
	}
	return p.Design.Transient.Settle
}

// OverFloor is the design's noise over the floor (rms), NaN where there is none.
func (p Point) OverFloor() float64 {
	if p.Design == nil {
		return math.NaN()
	}
	return p.Design.Noise.OverFloorRMS
}

// Factors returns count factors from 1/span to span, evenly spaced in their
// logarithm; an odd count has 1 in its middle. It returns nil unless span > 1 and
// count > 1.
func Factors(span float64, count int) []float64 {
	if !(span > 1) || math.IsInf(span, 0) || count < 2 {
		return nil
	}
	out := make([]float64, count)
	for i := range out {
		out[i] = math.Exp(math.Log(span) * (2*float64(i)/float64(count-1) - 1))
	}
	if count%2 == 1 {
		out[count/2] = 1
	}
	return out
}

// ErrSampling reports poles that would leave what sampling lets through.
var ErrSampling = errors.New("beyond the sampling limit")

// Scale makes poles of a model's own plane k times as fast in the s-plane; period
// is 0 in continuous time. A pole at z = 0 stays, one on the negative real axis of
// z keeps its sign. ErrSampling tells that |Im s| would exceed π/period.
func Scale(list []complex128, k, period float64) ([]complex128, error) {
	if !(k > 0) || math.IsInf(k, 0) {
		return nil, fmt.Errorf("a factor of %g on the speed: expected a number above 0", k)
	}
	out := make([]complex128, len(list))
	for i, v := range list {
		switch {
		case period == 0:
			out[i] = v * complex(k, 0)
		case v == 0:
		case imag(v) == 0:
			out[i] = complex(math.Copysign(math.Pow(math.Abs(real(v)), k), real(v)), 0)
		default:
			s, _ := poles.ToS(v, period)
			if math.Abs(imag(s))*k > math.Pi/period {
				return nil, fmt.Errorf("%s times as fast: %w", poles.Format(complex(k, 0)), ErrSampling)
			}
			z := cmplx.Exp(s * complex(k*period, 0))
			if imag(v) < 0 && i > 0 && list[i-1] == cmplx.Conj(v) {
				z = cmplx.Conj(out[i-1]) // to the bit
			}
			out[i] = z
		}
	}
	return out, nil
}

// Speeds scales the wanted poles of base by each factor and follows its branch
// outwards from the factor nearest to 1, so that the curve has no jumps; at 1
// stands base itself. The designer must be the one that base came from. It stops early, with the points
// found so far, when ctx is cancelled.
func Speeds(ctx context.Context, d *estimator.Designer, base *estimator.Design, period float64, factors []float64) ([]Point, error) {
	movable, _ := d.Movable()
	if base == nil || len(base.Wanted) < movable {
		return nil, errors.New("a gain found elsewhere has no wanted poles to scale")
	}
	out := make([]Point, len(factors))
	middle := 0
	for i, k := range factors {
		out[i] = Point{Factor: k, Err: context.Canceled}
		if math.Abs(math.Log(k)) < math.Abs(math.Log(factors[middle])) {
			middle = i
		}
	}
	walk := func(from, to, step int) {
		prev := base
		for i := from; i != to; i += step {
			if ctx.Err() != nil {
				return
			}
			p := &out[i]
			if p.Factor == 1 { // placing its poles anew may choose another gain
				p.Design, p.Err = base, nil
				continue
			}
			var list []complex128
			if list, p.Err = Scale(base.Wanted[:movable], p.Factor, period); p.Err != nil {
				continue
			}
			if p.Design, p.Err = d.Place(list, prev); p.Err == nil {
				prev = p.Design
			}
		}
	}
	walk(middle, len(factors), 1)
	walk(middle-1, -1, -1)
	return out, ctx.Err()
}

// Floors designs the best linear estimator for each factor on the model's
// process-noise covariance, and judges it by the model's own. It stops early, with
// the points found so far, when ctx is cancelled.
func Floors(ctx context.Context, m *estimator.Model, o estimator.Options, factors []float64) ([]Point, error) {
	judge, err := estimator.NewDesigner(m, o)
	if err != nil {
		return nil, err
	}
	out := make([]Point, len(factors))
	for i, k := range factors {
		out[i] = Point{Factor: k, Err: context.Canceled}
	}
	for i := range out {
		if ctx.Err() != nil {
			break
		}
		p := &out[i]
		if p.Err = validFactor(p.Factor); p.Err != nil {
			continue
		}
		assumed := *m
		assumed.Q = new(mat.SymDense)
		assumed.Q.ScaleSym(p.Factor, m.Q)
		d, err := estimator.NewDesigner(&assumed, o)
		if err != nil {
			p.Err = err
			continue
		}
		floor := d.Analysis().Floor
		if floor == nil {
			p.Err = errors.New(d.Analysis().FloorReason)
			continue
		}
		p.Design, p.Err = judge.Judge(estimator.Given{L: floor.Gain})
	}
	return out, ctx.Err()
}

func validFactor(k float64) error {
	if !(k > 0) || math.IsInf(k, 0) {
		return fmt.Errorf("a factor of %g on the process noise: expected a number above 0", k)
	}
	return nil
}
