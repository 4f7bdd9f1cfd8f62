package estimator

import (
	"cmp"
	"errors"
	"fmt"
	"math"
	"math/cmplx"
	"slices"
	"strings"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator/internal/modes"
)

// Verdict says what a sample period does to modes that it folds together.
type Verdict uint8

const (
	// Told is a fold that the sensors, several of them, still tell apart.
	Told Verdict = iota
	// Faint modes are seen much less than in continuous time.
	Faint
	// Gone modes are not seen at all after sampling.
	Gone
)

func (v Verdict) String() string {
	switch v {
	case Told:
		return "told apart"
	case Faint:
		return "faint"
	}
	return "gone"
}

// Fold is a set of modes of a continuous plant that sampling maps onto each other,
// or nearly so. Kalman, Ho and Narendra, "Controllability of linear dynamical
// systems", Contributions to Differential Equations 1 (1963), call a period
// pathological where two eigenvalues with equal real parts have imaginary parts
// that differ by a whole multiple of 2π/period: with one sensor they cannot be
// told apart.
type Fold struct {
	// Modes are the eigenvalues of A in rad/s that meet, by rising imaginary part.
	Modes []complex128
	// Sampled is where they meet in the z-plane (of a conjugate pair of folds, the
	// upper), Period the sample period in s.
	Sampled complex128
	Period  float64
	// Gap is the largest distance between the sampled poles over their size: 0 for
	// an exact fold.
	Gap     float64
	Verdict Verdict
	// Sigma is the smallest singular value of [(exp(A T)/z − I)/T; C] at the sampled
	// poles over that of [A − λI; C] at the modes, both in scaled coordinates: how
	// much of the modes' visibility is left. It tends to 1 as the period goes to 0.
	Sigma float64
	// Better is the nearest period that folds no modes the sensors lose, in s; NaN
	// where none was found.
	Better float64
}

func (f Fold) String() string {
	names, more := make([]string, 0, len(f.Modes)), 0
	for _, v := range f.Modes {
		if imag(v) < 0 && slices.Contains(f.Modes, cmplx.Conj(v)) {
			continue // its partner stands for both
		}
		name := formatPole(complex(sixDigits(real(v)), sixDigits(imag(v))))
		if imag(v) > 0 && slices.Contains(f.Modes, cmplx.Conj(v)) {
			name = strings.Replace(name, "+", "±", 1)
		}
		if len(names) == namedModes {
			more++
			continue
		}
		names = append(names, name)
	}
	if more > 0 {
		names = append(names, fmt.Sprintf("%d more", more))
	}
	how := "onto each other"
	if f.Gap > exactFold {
		how = "almost onto each other"
	}
	text := fmt.Sprintf("sampling every %.6g s maps the modes at %s %s", f.Period, strings.Join(names, " and "), how)
	switch f.Verdict {
	case Told:
		return text + "; the sensors still tell them apart"
	case Faint:
		text += fmt.Sprintf(": the sensors see them %.2g times as well as without sampling", f.Sigma)
	case Gone:
		text += ": the sensors no longer see all of them"
	}
	if math.IsNaN(f.Better) {
		return text
	}
	return text + fmt.Sprintf("; a period of %.6g s does not", f.Better)
}

func sixDigits(v float64) float64 {
	if v == 0 {
		return 0
	}
	unit := math.Pow(10, 5-math.Floor(math.Log10(math.Abs(v))))
	return math.Round(v*unit) / unit
}

const (
	exactFold  = 1e-7 // relative gap that rounding explains
	nearFold   = 0.1  // relative gap below which a fold is looked at
	clearFold  = 0.3  // gap that a better period keeps
	faint      = 0.1  // part of a mode's visibility that is too little
	namedModes = 4    // that a sentence names
)

// ErrSampling reports a plant whose sampling cannot be judged.
var ErrSampling = errors.New("the sampling cannot be judged")

// Folds lists the modes that sampling the continuous model every period seconds
// folds together, the worst first. Only modes that the sensors see in continuous
// time count. Folds that several sensors tell apart are listed where they are
// exact. B and the noises are not looked at. A discrete model, a period that is
// not above 0 and one in which the plant outgrows the range of numbers are errors.
func Folds(m *Model, period float64) ([]Fold, error) {
	s, err := newFolding(m, period)
	if err != nil {
		return nil, err
	}
	list, err := s.at(period)
	if err != nil {
		return nil, err
	}
	better, looked := math.NaN(), false
	for i := range list {
		list[i].Better = math.NaN()
		if list[i].Verdict == Told {
			continue
		}
		if !looked {
			better, looked = s.better(period), true
		}
		list[i].Better = better
	}
	return list, nil
}

// folding knows the continuous plant in scaled coordinates.
type folding struct {
	a, c *mat.Dense
	seen []modes.Mode // that the sensors see
}

func newFolding(m *Model, period float64) (*folding, error) {
	if err := m.Check(); err != nil {
		return nil, err
	}
	if m.Discrete() {
		return nil, fmt.Errorf("the model is sampled already: %w", ErrSampling)
	}
	if !(period > 0) || math.IsInf(period, 0) {
		return nil, fmt.Errorf("period %g s, expected above 0: %w", period, ErrSampling)
	}
	_, _, p := m.Dims()
	s := &folding{a: scaled(m, m.A), c: mat.DenseCopyOf(m.C)}
	n, _ := s.a.Dims()
	sx, sy := ones(m.StateScale, n), ones(m.SensorScale, p)
	s.c.Apply(func(i, j int, v float64) float64 { return v * sx[j] / sy[i] }, s.c)
	seen, err := modes.Analyse(raw(s.a), raw(s.c), 0)
	if err != nil {
		return nil, fmt.Errorf("observability: %w", err)
	}
	for _, mode := range seen.Modes {
		if mode.Observable {
			s.seen = append(s.seen, mode)
		}
	}
	return s, nil
}

// gap is the distance between two sampled poles over their size, and whether
// sampling turns one at least half a turn more than the other.
func gap(v, w complex128, period float64) (distance float64, folded bool) {
	difference := (v - w) * complex(period, 0)
	turns := math.Round(imag(difference) / (2 * math.Pi))
	rest := complex(real(difference), imag(difference)-2*math.Pi*turns)
	// |exp(rest) − 1| from the smaller pole's side
	if real(rest) > 0 {
		rest = -rest
	}
	return cmplx.Abs(cmplx.Exp(rest) - 1), turns != 0
}

// at lists the folds of a period.
func (s *folding) at(period float64) ([]Fold, error) {
	groups := s.groups(period)
	if groups == nil {
		return nil, nil
	}
	ad, _, _, err := Discretise(s.a, nil, nil, nil, period)
	if err != nil {
		return nil, fmt.Errorf("%w: %w", ErrSampling, err)
	}
	var out []Fold
	for _, group := range groups {
		f := Fold{Period: period, Sigma: math.Inf(1)}
		for _, k := range group {
			mode := s.seen[k]
			f.Modes = append(f.Modes, mode.Eigenvalue)
			for _, other := range group {
				d, _ := gap(mode.Eigenvalue, s.seen[other].Eigenvalue, period)
				f.Gap = max(f.Gap, d)
			}
			left, err := visibility(ad, s.c, mode.Eigenvalue, period)
			if err != nil {
				return nil, err
			}
			if ratio := left / mode.Sigma; ratio < f.Sigma {
				f.Sigma, f.Sampled = ratio, cmplx.Exp(mode.Eigenvalue*complex(period, 0))
			}
		}
		switch {
		case math.IsInf(f.Sigma, 1): // all have died out within a period
			continue
		case f.Sigma < exactFold:
			f.Verdict = Gone
		case f.Sigma < faint:
			f.Verdict = Faint
		case f.Gap > exactFold:
			continue
		}
		f.Modes = byFrequency(f.Modes)
		out = append(out, f)
	}
	slices.SortStableFunc(out, func(a, b Fold) int { return cmp.Compare(a.Sigma, b.Sigma) })
	return out, nil
}

// visibility is the smallest singular value of [(exp(A T)/z − I)/T; C] at the
// sampled pole z = exp(λT), in its real form of twice the size. With z close to 0
// the mode has died out within a period; its visibility is infinite, for what is
// lost there is no work of folding.
func visibility(ad, c *mat.Dense, lambda complex128, period float64) (float64, error) {
	z := cmplx.Exp(lambda * complex(period, 0))
	if cmplx.Abs(z) < 1e-9 {
		return math.Inf(1), nil
	}
	n, _ := ad.Dims()
	p, _ := c.Dims()
	whole := mat.NewDense(2*(n+p), 2*n, nil)
	factor := 1 / (z * complex(period, 0))
	for i := range n {
		for j := range n {
			v := complex(ad.At(i, j), 0) * factor
			if i == j {
				v -= complex(1/period, 0)
			}
			whole.Set(i, j, real(v))
			whole.Set(n+i, n+j, real(v))
			whole.Set(i, n+j, -imag(v))
			whole.Set(n+i, j, imag(v))
		}
	}
	set(whole, 2*n, 0, c)
	set(whole, 2*n+p, n, c)
	var svd mat.SVD
	if !finite(whole) || !svd.Factorize(whole, mat.SVDNone) {
		return 0, fmt.Errorf("singular values at a sampled pole: %w", ErrSampling)
	}
	values := svd.Values(nil)
	return values[len(values)-1], nil
}

// groups joins the modes that sampling turns onto each other, the closest first, so
// that all of a group lie close together; of two conjugate groups one stands for both.
func (s *folding) groups(period float64) [][]int {
	type meeting struct {
		i, j int
		gap  float64
	}
	var list []meeting
	for i := range s.seen {
		for j := range i {
			if d, turned := gap(s.seen[i].Eigenvalue, s.seen[j].Eigenvalue, period); turned && d < nearFold {
				list = append(list, meeting{i, j, d})
			}
		}
	}
	slices.SortStableFunc(list, func(a, b meeting) int { return cmp.Compare(a.gap, b.gap) })
	members := make([][]int, len(s.seen)) // by the group's first mode
	at := all(len(s.seen))                // the first mode of each mode's group
	for i := range members {
		members[i] = []int{i}
	}
	for _, m := range list {
		into, from := at[m.i], at[m.j]
		if into == from || !s.close(members[into], members[from], period) {
			continue
		}
		for _, k := range members[from] {
			at[k] = into
		}
		members[into], members[from] = append(members[into], members[from]...), nil
	}
	var out [][]int
	for _, group := range members {
		if len(group) > 1 && s.angle(group, period) >= -nearFold {
			out = append(out, group)
		}
	}
	return out
}

// close tells whether every mode of a group is sampled close to all of another.
func (s *folding) close(a, b []int, period float64) bool {
	for _, i := range a {
		for _, j := range b {
			if d, _ := gap(s.seen[i].Eigenvalue, s.seen[j].Eigenvalue, period); d >= nearFold {
				return false
			}
		}
	}
	return true
}

// angle is where a group's sampled poles lie, by their mean direction, in rad: from
// −π to π. A group around the real axis is its own conjugate.
func (s *folding) angle(group []int, period float64) float64 {
	var sum complex128
	for _, k := range group {
		sum += cmplx.Rect(1, imag(s.seen[k].Eigenvalue)*period)
	}
	a := cmplx.Phase(sum)
	if math.Pi-math.Abs(a) <= nearFold {
		return math.Pi
	}
	return a
}

// better looks for the nearest period that loses no mode, in steps of a hundredth
// both ways, then below the period at which anything folds at all. NaN where that
// is out of the range of numbers.
func (s *folding) better(period float64) float64 {
	for k := 1; k < 100; k++ {
		for _, sign := range []float64{-1, 1} {
			if t := period * (1 + sign*float64(k)/100); s.clear(t) {
				return t
			}
		}
	}
	fastest := 0.0
	for _, m := range s.seen {
		fastest = max(fastest, math.Abs(imag(m.Eigenvalue)))
	}
	if t := 0.8 * math.Pi / fastest; t > 0 && t < period && s.clear(t) {
		return t
	}
	return math.NaN()
}

// clear tells whether a period keeps all modes well apart.
func (s *folding) clear(period float64) bool {
	for i := range s.seen {
		for j := range i {
			if d, turned := gap(s.seen[i].Eigenvalue, s.seen[j].Eigenvalue, period); turned && d < clearFold {
				return false
			}
		}
	}
	return true
}

func byFrequency(list []complex128) []complex128 {
	slices.SortFunc(list, func(a, b complex128) int {
		return cmp.Or(cmp.Compare(imag(a), imag(b)), cmp.Compare(real(a), real(b)))
	})
	return list
}
