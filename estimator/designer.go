package estimator

import (
	"errors"
	"fmt"
	"math"
	"strings"

	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/mat"

	"polewright/estimator/internal/modes"
	"polewright/estimator/internal/placement"
	"polewright/estimator/internal/schur"
	"polewright/estimator/internal/transient"
)

// Designer turns wanted poles or a given gain into a Design. It analyses its
// model once and owns the workspaces of the work that follows, so one Designer
// serves one goroutine at a time.
type Designer struct {
	model    *Model
	opt      Options
	analysis *Analysis

	n, p   int
	sx, sy []float64 // scales of states and sensors

	// In scaled coordinates: S⁻¹ A S, C S over the sensors' scales, and noise.
	a, c, w, r *mat.Dense

	pair    pair     // what placement works on
	control *control // nil without feedback

	form         schur.Form // of F
	filteredForm schur.Form // of (I − Lf C) A, in current form
	placement    placement.Solver
	transient    transient.Solver
	keep         []bool // states that count in the transient; nil is all
}

// FixedModesError says that the wanted poles ask for what no gain can do.
type FixedModesError struct {
	// Fixed are the eigenvalues no gain can move, in the model's own plane.
	Fixed []complex128
	// Movable is the number of poles that can be chosen.
	Movable int
	// Wanted is the number of poles asked for.
	Wanted int
	// Unstable tells that a fixed mode is not strictly stable, so that no
	// choice of the others gives an estimator.
	Unstable bool
}

func (e *FixedModesError) Error() string {
	list := make([]string, len(e.Fixed))
	for i, v := range e.Fixed {
		list[i] = formatPole(v)
	}
	switch {
	case len(e.Fixed) == 0:
		return fmt.Sprintf("%d poles were given; expected %d", e.Wanted, e.Movable)
	case e.Unstable:
		return fmt.Sprintf("the sensors do not see the modes at %s, and not all of these die out by themselves: no gain can help", strings.Join(list, ", "))
	}
	others := fmt.Sprintf("%d poles", e.Movable)
	if e.Movable == 1 {
		others = "pole"
	}
	return fmt.Sprintf("the sensors do not see the modes at %s, which no gain can move; expected the other %s alone, or all with these among them (%d were given)",
		strings.Join(list, ", "), others, e.Wanted)
}

var (
	// ErrMethod reports a combination of options that has no meaning.
	ErrMethod = errors.New("not available")
	// ErrNotReached reports poles that no gain in double precision comes near, such
	// as where a mode is hardly seen.
	ErrNotReached = placement.ErrNotReached
)

// NewDesigner checks and analyses a model. It fails where the model does
// (Model.Check), where the current form is asked for in continuous time, or
// where an eigenvalue iteration gives up.
func NewDesigner(m *Model, opt Options) (_ *Designer, err error) {
	defer guard(&err)
	if err := m.Check(); err != nil {
		return nil, err
	}
	if opt.Form == Current && !m.Discrete() {
		return nil, fmt.Errorf("the current form needs a sample period: %w", ErrMethod)
	}
	if math.IsNaN(opt.Tolerance) || opt.Tolerance < 0 || opt.Tolerance >= 1 {
		return nil, fmt.Errorf("tolerance %g, expected 0 to 1: %w", opt.Tolerance, ErrRange)
	}
	if opt.Form > Current || opt.Method > LeastNoise {
		return nil, fmt.Errorf("form %d, method %d: %w", opt.Form, opt.Method, ErrMethod)
	}
	if opt.Tolerance == 0 {
		opt.Tolerance = 1e-12
	}
	d := &Designer{model: m, opt: opt}
	d.n, _, d.p = m.Dims()
	d.scale()
	for _, part := range []struct {
		name string
		m    *mat.Dense
		most float64
	}{{"A", d.a, mostScaled}, {"C", d.c, mostScaled}, {"the process noise", d.w, mostNoise}, {"R", d.r, mostNoise}} {
		if err := checkScaled(part.name, part.m, part.most); err != nil {
			return nil, err
		}
	}
	if err := d.analyse(); err != nil {
		return nil, err
	}
	if err := d.prepareControl(); err != nil {
		return nil, err
	}
	return d, nil
}

// Analysis returns what holds for every gain. It is immutable.
func (d *Designer) Analysis() *Analysis { return d.analysis }

// Movable returns how many poles can be chosen, and how many of these are the
// poles of delay registers, which default to zero.
func (d *Designer) Movable() (poles, registers int) {
	registers = d.registers() - countZero(d.pair.fixed)
	return d.pair.rank, max(registers, 0)
}

// Fixed returns the eigenvalues that placement in this form leaves where they are.
func (d *Designer) Fixed() []complex128 { return append([]complex128(nil), d.pair.fixed...) }

func (d *Designer) registers() int {
	k := 0
	for _, r := range d.model.Roles {
		if r == DelayRegister {
			k++
		}
	}
	return k
}

func countZero(list []complex128) int {
	k := 0
	for _, v := range list {
		if math.Hypot(real(v), imag(v)) < 1e-9 {
			k++
		}
	}
	return k
}

func (d *Designer) scale() {
	m := d.model
	d.sx, d.sy = ones(m.StateScale, d.n), ones(m.SensorScale, d.p)
	d.a = mat.DenseCopyOf(m.A)
	d.a.Apply(func(i, j int, v float64) float64 { return v * d.sx[j] / d.sx[i] }, d.a)
	d.c = mat.DenseCopyOf(m.C)
	d.c.Apply(func(i, j int, v float64) float64 { return v * d.sx[j] / d.sy[i] }, d.c)
	d.w = processNoise(m)
	d.w.Apply(func(i, j int, v float64) float64 { return v / d.sx[i] / d.sx[j] }, d.w)
	d.r = mat.DenseCopyOf(m.R)
	d.r.Apply(func(i, j int, v float64) float64 { return v / d.sy[i] / d.sy[j] }, d.r)
	for i, r := range m.Roles {
		if r == DelayRegister {
			if d.keep == nil {
				d.keep = make([]bool, d.n)
				for k := range d.keep {
					d.keep[k] = true
				}
			}
			d.keep[i] = false
		}
	}
}

// processNoise returns G Q Gᵀ.
func processNoise(m *Model) *mat.Dense {
	if m.G == nil {
		return mat.DenseCopyOf(m.Q)
	}
	var gq, w mat.Dense
	gq.Mul(m.G, m.Q)
	w.Mul(&gq, m.G.T())
	return &w
}

func ones(s []float64, n int) []float64 {
	if s != nil {
		return s
	}
	one := make([]float64, n)
	for i := range one {
		one[i] = 1
	}
	return one
}

func raw(m *mat.Dense) blas64.General { return m.RawMatrix() }

func (d *Designer) analyse() error {
	seen, err := modes.Analyse(raw(d.a), raw(d.c), d.opt.Tolerance)
	if err != nil {
		return fmt.Errorf("observability: %w", err)
	}
	an := &Analysis{Observability: Observability{
		Rank:      seen.Rank,
		Tolerance: d.opt.Tolerance,
		Fixed:     seen.Fixed,
	}}
	for _, m := range seen.Modes {
		an.Observability.Modes = append(an.Observability.Modes, Mode(m))
	}
	if err := d.form.Factor(raw(d.a)); err != nil {
		return err
	}
	if stable(d.form.Eigenvalues(), d.model.Discrete()) {
		an.Observability.Gramian = d.gramian()
	}
	d.analysis = an
	d.findFloor()
	return d.split(seen)
}

// gramian returns the eigenvalues of the observability Gramian of the Schur
// form at hand, ascending.
func (d *Designer) gramian() []float64 {
	var ctc mat.Dense
	ctc.Mul(d.c.T(), d.c)
	x := mat.NewDense(d.n, d.n, nil)
	solve := d.form.LyapunovAdjoint
	if d.model.Discrete() {
		solve = d.form.SteinAdjoint
	}
	if solve(raw(x), raw(&ctc)) != nil {
		return nil
	}
	size := mat.Norm(x, 2)
	if size == 0 {
		return make([]float64, d.n)
	}
	x.Scale(1/size, x) // a tiny matrix would break the eigenvalue routine
	var e mat.EigenSym
	if !e.Factorize(symmetric(x), false) {
		return nil
	}
	values := e.Values(nil)
	for i := range values {
		values[i] *= size
	}
	return values
}

func symmetric(x *mat.Dense) *mat.SymDense {
	n, _ := x.Dims()
	s := mat.NewSymDense(n, nil)
	for i := range n {
		for j := i; j < n; j++ {
			s.SetSym(i, j, (x.At(i, j)+x.At(j, i))/2)
		}
	}
	return s
}

func (d *Designer) unscaleCovariance(p *mat.Dense) *mat.SymDense {
	s := mat.NewSymDense(d.n, nil)
	for i := range d.n {
		for j := i; j < d.n; j++ {
			s.SetSym(i, j, (p.At(i, j)+p.At(j, i))/2*d.sx[i]*d.sx[j])
		}
	}
	return s
}

func (d *Designer) unscaleGain(l *mat.Dense) *mat.Dense {
	out := mat.DenseCopyOf(l)
	out.Apply(func(i, j int, v float64) float64 { return v * d.sx[i] / d.sy[j] }, out)
	return out
}

func (d *Designer) scaleGain(l *mat.Dense) *mat.Dense {
	out := mat.DenseCopyOf(l)
	out.Apply(func(i, j int, v float64) float64 { return v / d.sx[i] * d.sy[j] }, out)
	return out
}

func roots(s *mat.SymDense) []float64 {
	out := make([]float64, s.SymmetricDim())
	for i := range out {
		out[i] = math.Sqrt(max(s.At(i, i), 0))
	}
	return out
}

func stable(list []complex128, discrete bool) bool {
	for _, v := range list {
		if discrete && math.Hypot(real(v), imag(v)) >= 1 || !discrete && real(v) >= 0 {
			return false
		}
	}
	return true
}

// strictlyStable asks for a relative margin of 1e-9.
func strictlyStable(v complex128, discrete bool) bool {
	size := math.Hypot(real(v), imag(v))
	if discrete {
		return size < 1-1e-9
	}
	return real(v) < -1e-9*size && real(v) < 0
}
