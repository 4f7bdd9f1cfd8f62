package estimator

import (
	"context"
	"fmt"
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator/internal/frequency"
	"polewright/estimator/internal/placement"
	"polewright/estimator/internal/schur"
	"polewright/estimator/poles"
)

// Complete returns a quick design of this Designer with the figures that were left
// out; a complete one is returned as it is. It looks at ctx between them and returns its
// error once it is cancelled.
func (d *Designer) Complete(ctx context.Context, quick *Design) (_ *Design, err error) {
	defer guard(&err)
	if err := d.owns(quick); err != nil {
		return nil, err
	}
	if !quick.Partial {
		return quick, nil
	}
	whole := *quick
	out := &whole
	out.Partial = false
	out.Warnings = append([]string(nil), quick.Warnings...)
	ls := d.scaleGain(out.Gain)
	if out.Stable && out.Noise.Covariance != nil {
		f := d.errorMatrix(ls)
		if err := d.form.Factor(raw(f)); err != nil {
			return nil, fmt.Errorf("eigenvalues of A − LC: %w", err)
		}
		d.sensorNoise(&out.Noise, f, ls)
		d.peakGains(out)
	}
	if ctx.Err() != nil {
		return nil, ctx.Err()
	}
	d.exactLoop(out)
	if ctx.Err() != nil {
		return nil, ctx.Err()
	}
	out.Float32Shift = d.float32Shift(out)
	out.SensorSets = d.sensorSets(ls)
	for _, s := range out.SensorSets {
		if out.Stable && !s.Stable && len(s.Lost) == 1 && d.p > 1 {
			out.Warnings = append(out.Warnings, fmt.Sprintf("with %s lost and its column of L set to zero the estimator is unstable, or its error stays for good",
				name(d.model.SensorNames, "y", s.Lost[0])))
		}
	}
	return out, nil
}

// owns refuses what cannot be a design of this Designer.
func (d *Designer) owns(design *Design) error {
	if design == nil || design.Gain == nil || design.Form != d.opt.Form || (d.opt.Form == Current && design.GainCurrent == nil) {
		return fmt.Errorf("no design of this designer: %w", ErrMethod)
	}
	if r, c := design.Gain.Dims(); r != d.n || c != d.p {
		return fmt.Errorf("no design of this designer, its gain is %d×%d, expected %d×%d: %w", r, c, d.n, d.p, ErrMethod)
	}
	return nil
}

// mostCompared bounds the unknowns n·p up to which compareMethods looks for the
// least noise.
const mostCompared = 24

// compareMethods warns of a robust gain that is far noisier than the least-noise gain
// for the same poles. It asks only where the gain is so far above the floor that this
// can be.
func (d *Designer) compareMethods(out *Design) {
	const far = 1.5 // on the standard deviations, root mean square
	pr := &d.pair
	if pr.rank == 0 || d.opt.Method != Robust || !out.Stable || !(out.Noise.OverFloorRMS > far) {
		return
	}
	p1, _ := pr.c.Dims()
	if p1 < 2 || p1*pr.rank > mostCompared || pr.rank < d.n {
		return
	}
	part := mat.NewDense(pr.rank, p1, nil)
	weights := d.noiseWeights()
	info, err := d.placement.LeastNoise(raw(part), raw(pr.a), raw(pr.c), raw(pr.w), raw(pr.r), weights, out.Wanted[:pr.rank], d.model.Discrete(), new(placement.Warm))
	if err != nil {
		return
	}
	var cost float64
	for i, w := range weights {
		cost += w * out.Noise.Covariance.At(i, i) / d.sx[i] / d.sx[i]
	}
	if ratio := math.Sqrt(cost / info.Cost); ratio > far {
		out.Warnings = append(out.Warnings, fmt.Sprintf("the robust gain is %.3g times as noisy as the least-noise gain for the same poles", ratio))
	}
}

func (d *Designer) sensorNoise(noise *Noise, f, ls *mat.Dense) {
	s := mat.NewDense(d.n, d.p, nil)
	q := mat.NewDense(d.n, d.n, nil)
	for j := range d.p {
		col := ls.ColView(j)
		q.Outer(1, col, col)
		p, err := d.solveNoise(f, q)
		if err != nil {
			return
		}
		for i := range d.n {
			s.Set(i, j, math.Sqrt(max(p.At(i, i), 0))*d.sx[i]/d.sy[j])
		}
	}
	noise.SensorToState = s
}

// peakGains finds, per state, the largest gain over frequency from the sensors'
// noise to its error (prediction form).
func (d *Designer) peakGains(out *Design) {
	var f, b mat.Dense
	f.Mul(out.Gain, d.model.C)
	f.Sub(d.model.A, &f)
	b.Scale(-1, out.Gain)
	values, rads, err := frequency.PeakGains(frequency.System{A: raw(&f), B: raw(&b), C: raw(identity(d.n)), Period: d.model.Period})
	if err != nil {
		out.Warnings = append(out.Warnings, "peak gains: "+err.Error())
		return
	}
	for i, v := range values {
		out.Noise.PeakGain = append(out.Noise.PeakGain, Peak{Value: v, Frequency: rads[i]})
	}
}

// float32Shift rounds A, L and C to float32 and returns the largest relative
// movement of an eigenvalue of F; NaN where an eigenvalue iteration gives up.
func (d *Designer) float32Shift(out *Design) float64 {
	round := func(m *mat.Dense) *mat.Dense {
		r := mat.DenseCopyOf(m)
		r.Apply(func(_, _ int, v float64) float64 { return float64(float32(v)) }, r)
		return r
	}
	var f mat.Dense
	f.Mul(round(out.Gain), round(d.model.C))
	f.Sub(round(d.model.A), &f)
	if !finite(&f) {
		return math.NaN()
	}
	var form schur.Form
	f.Apply(func(i, j int, v float64) float64 { return v * d.sx[j] / d.sx[i] }, &f)
	if form.Factor(raw(&f)) != nil {
		return math.NaN()
	}
	have, worst := form.Eigenvalues(), 0.0
	for i, k := range poles.Match(out.Reached, have) {
		v := out.Reached[i]
		worst = max(worst, cmplx.Abs(have[k]-v)/d.model.poleSize(v))
	}
	return worst
}

// settles asks every eigenvalue to be strictly stable: what stands on the limit but for
// rounding never forgets its error.
func settles(list []complex128, discrete bool) bool {
	for _, v := range list {
		if !strictlyStable(v, discrete) {
			return false
		}
	}
	return true
}

// sensorSets judges F with the columns of lost sensors set to zero: every
// subset for up to six sensors, else each sensor alone.
func (d *Designer) sensorSets(ls *mat.Dense) []SensorSet {
	var sets []SensorSet
	var form schur.Form
	judge := func(lost []int) {
		l := mat.DenseCopyOf(ls)
		for _, j := range lost {
			for i := range d.n {
				l.Set(i, j, 0)
			}
		}
		if form.Factor(raw(d.errorMatrix(l))) == nil {
			sets = append(sets, SensorSet{Lost: lost, Stable: settles(form.Eigenvalues(), d.model.Discrete())})
		}
	}
	if d.p > 6 {
		for j := range d.p {
			judge([]int{j})
		}
		return sets
	}
	for bits := 1; bits < 1<<d.p; bits++ {
		var lost []int
		for j := range d.p {
			if bits>>j&1 == 1 {
				lost = append(lost, j)
			}
		}
		judge(lost)
	}
	return sets
}
