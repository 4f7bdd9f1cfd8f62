package plants

import (
	"cmp"
	"errors"
	"fmt"
	"slices"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
)

// assembly is a design model while it grows.
type assembly struct {
	p        *Plant
	used     []int // indices of the sensors in use
	period   float64
	discrete bool // A, B, G, Q are in discrete time

	withoutUnknowns bool

	a, b, c, d, g *mat.Dense // b, d nil without inputs
	q             *mat.SymDense

	names  []string
	scales []float64
	roles  []estimator.Role
	cancel map[int]string // input → the name of its offset's state
	taken  map[string]bool
}

// add appends a state and returns its index.
func (b *assembly) add(name string, scale float64, role estimator.Role) int {
	if b.taken == nil {
		b.taken = map[string]bool{}
		for _, o := range b.p.Outputs {
			b.taken[o.Name] = true
		}
	}
	unique := name
	for k := 2; b.taken[unique]; k++ {
		unique = fmt.Sprintf("%s %d", name, k)
	}
	b.taken[unique] = true
	b.names = append(b.names, unique)
	b.scales = append(b.scales, scale)
	b.roles = append(b.roles, role)
	return len(b.names) - 1
}

// fits refuses what the period or the bound on the size rules out.
func (b *assembly) fits() *Error {
	p, size := b.p, len(b.p.States)
	var bad *Error
	take := func(kind string, i, delay int, lag float64) {
		size += delay
		if lag > 0 {
			size++
		}
		if delay > 0 && b.period == 0 {
			bad = cmp.Or(bad, &Error{Where: fmt.Sprintf("%s %d, delay_samples", kind, i+1), Wrong: "a delay in samples without a sample period", Expected: "expected a period above 0"})
		}
	}
	for i, s := range p.Inputs {
		take("inputs", i, s.DelaySamples, s.Lag)
	}
	for _, i := range b.used {
		take("sensors", i, p.Sensors[i].DelaySamples, p.Sensors[i].Lag)
	}
	for i, u := range p.Unknowns {
		if b.withoutUnknowns {
			break
		}
		size++
		if u.Kind == InputRamp || u.Kind == InputSine {
			size++
		}
		if u.Kind == InputSine && b.period > 0 {
			bad = cmp.Or(bad, belowHalfRate(fmt.Sprintf("unknowns %d", i+1), u.Frequency, b.period))
		}
	}
	if bad == nil && size > maxDesign {
		bad = &Error{Where: "model", Wrong: fmt.Sprintf("%d states with lags, delays and unknowns", size), Expected: fmt.Sprintf("expected at most %d", maxDesign)}
	}
	return bad
}

// order brings the states into the order of their roles: delay registers, which
// come up only after sampling, go before unknowns.
func (b *assembly) order() {
	n := len(b.names)
	from := make([]int, n)
	for i := range from {
		from[i] = i
	}
	slices.SortStableFunc(from, func(i, j int) int { return cmp.Compare(b.roles[i], b.roles[j]) })
	if slices.IsSorted(from) {
		return
	}
	b.names, b.scales, b.roles = picked(b.names, from), picked(b.scales, from), picked(b.roles, from)
	b.a = rearranged(b.a, from, from)
	b.c = rearranged(b.c, nil, from)
	if b.b != nil {
		b.b = rearranged(b.b, from, nil)
	}
	if !b.sampled() {
		b.g = rearranged(b.g, from, nil)
		return
	}
	// G stays the identity: Q belongs to the states.
	q := mat.NewSymDense(n, nil)
	for i := range n {
		for j := range i + 1 {
			q.SetSym(i, j, b.q.At(from[i], from[j]))
		}
	}
	b.q = q
}

func picked[T any](list []T, from []int) []T {
	out := make([]T, len(list))
	for i, k := range from {
		out[i] = list[k]
	}
	return out
}

// rearranged takes row rows[i] and column cols[j] of m to (i, j); nil leaves the
// order as it is.
func rearranged(m *mat.Dense, rows, cols []int) *mat.Dense {
	r, c := m.Dims()
	out := mat.NewDense(r, c, nil)
	for i := range r {
		for j := range c {
			fromRow, fromCol := i, j
			if rows != nil {
				fromRow = rows[i]
			}
			if cols != nil {
				fromCol = cols[j]
			}
			out.Set(i, j, m.At(fromRow, fromCol))
		}
	}
	return out
}

func (b *assembly) sample() error {
	ad, bd, qd, err := estimator.Discretise(b.a, b.b, b.g, b.q, b.period)
	if err != nil {
		return fmt.Errorf("sampling the plant every %g s: %w", b.period, err)
	}
	n, _ := ad.Dims()
	b.a, b.b, b.q, b.discrete = ad, bd, qd, true
	b.g = identity(n)
	return nil
}

// model collects the finished matrices and checks them.
func (b *assembly) model() (*estimator.Model, error) {
	p, n := b.p, len(b.names)
	m := &estimator.Model{
		A: b.a, B: b.b, C: b.c, D: b.d, G: b.g, Q: b.q,
		StateScale: b.scales, StateNames: b.names, Roles: b.roles,
	}
	if b.discrete {
		m.Period = b.period
	}
	r := p.SampleNoise(b.period, false)
	m.R = mat.NewSymDense(len(b.used), nil)
	for i, si := range b.used {
		for j, sj := range b.used[:i+1] {
			m.R.SetSym(i, j, r.At(si, sj))
		}
		m.SensorNames = append(m.SensorNames, p.Sensors[si].Name)
		m.SensorScale = append(m.SensorScale, p.Sensors[si].Scale)
		m.SensorStep = append(m.SensorStep, p.Sensors[si].Resolution)
	}
	for _, u := range p.Inputs {
		m.InputNames = append(m.InputNames, u.Name)
	}
	if len(p.Outputs) > 0 {
		m.Outputs = mat.NewDense(len(p.Outputs), n, nil)
		for i, o := range p.Outputs {
			for j, v := range o.Row {
				m.Outputs.Set(i, j, v)
			}
			m.OutputNames = append(m.OutputNames, o.Name)
		}
	}
	if p.K != nil {
		m.K = mat.NewDense(len(p.Inputs), n, nil)
		m.K.Slice(0, len(p.Inputs), 0, len(p.States)).(*mat.Dense).Copy(p.K)
		for input, name := range b.cancel {
			m.K.Set(input, slices.Index(b.names, name), 1)
		}
	}
	if err := m.Check(); err != nil {
		if errors.Is(err, estimator.ErrNotFinite) {
			return nil, &Error{Where: "model", Wrong: err.Error(), Expected: "expected numbers that a computer can hold"}
		}
		return nil, fmt.Errorf("the design model: %w", err)
	}
	return m, nil
}

func identity(n int) *mat.Dense {
	e := mat.NewDense(n, n, nil)
	for i := range n {
		e.Set(i, i, 1)
	}
	return e
}
