package estimator

import (
	"errors"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator/internal/frequency"
)

// broken is the loop cut open at the plant input: from the input u of the plant
// to w = K x̂ of the controller, so that closing it is u = −w. Its state is the
// plant's without the unknowns, then the estimator's.
type broken struct {
	a, b, c, d *mat.Dense
	plant      int        // plant states
	noise      *mat.Dense // how a sensor sample enters the state
	direct     *mat.Dense // and w
}

// openLoop builds the cut loop of the estimator with a plant, which need not be
// the one it was designed for, in the user's units. With e = y − C x̂ − D u the
// controller's own command stands for u, which in current form leaves the
// algebraic loop (I − D K Lf) e = y − (C − D K) x̂.
func (d *Designer) openLoop(plant *Model, out *Design) (*broken, error) {
	m := d.model
	_, inputs, _ := m.Dims()
	own := plant.own()
	np := len(own)
	N := np + d.n
	feed := m.D
	if feed == nil {
		feed = mat.NewDense(d.p, inputs, nil)
	}
	states, _ := plant.A.Dims()
	take := mat.NewDense(states, np, nil) // x = take·xp
	for k, i := range own {
		take.Set(i, k, 1)
	}

	through := plant.D
	if through == nil {
		through = mat.NewDense(d.p, inputs, nil)
	}

	// e = ey·(C xp + D u) + ex·x̂
	ey, direct := identity(d.p), mat.NewDense(inputs, d.p, nil)
	if d.opt.Form == Current {
		direct.Mul(m.K, out.GainCurrent)
		var loop mat.Dense
		loop.Mul(feed, direct)
		loop.Sub(identity(d.p), &loop)
		if err := ey.Solve(&loop, identity(d.p)); err != nil {
			return nil, errors.New("the direct feedthrough closes an algebraic loop that has no answer")
		}
		direct.Mul(direct, ey)
	}
	var ex, dk mat.Dense
	dk.Mul(feed, m.K)
	dk.Sub(&dk, m.C)
	ex.Mul(ey, &dk)

	// w = K x̂ + (K Lf) e in current form, K x̂ in prediction form
	var eC, eD, cp mat.Dense
	cp.Mul(plant.C, take)
	eC.Mul(ey, &cp)
	eD.Mul(ey, through)
	c, dd := mat.NewDense(inputs, N, nil), mat.NewDense(inputs, inputs, nil)
	set(c, 0, np, m.K)
	if d.opt.Form == Current {
		var kl, part mat.Dense
		kl.Mul(m.K, out.GainCurrent)
		part.Mul(&kl, &eC)
		add(c, 0, 0, &part)
		part.Reset()
		part.Mul(&kl, &ex)
		add(c, 0, np, &part)
		dd.Mul(&kl, &eD)
	}

	// xp' = A xp + B u;  x̂' = A x̂ + L e − B w
	a, b := mat.NewDense(N, N, nil), mat.NewDense(N, inputs, nil)
	var at, ap, bp mat.Dense
	at.Mul(plant.A, take)
	ap.Mul(take.T(), &at)
	bp.Mul(take.T(), plant.B)
	set(a, 0, 0, &ap)
	set(b, 0, 0, &bp)
	var lc, lx, bw, ld, bd mat.Dense
	lc.Mul(out.Gain, &eC)
	set(a, np, 0, &lc)
	lx.Mul(out.Gain, &ex)
	lx.Add(&lx, m.A)
	set(a, np, np, &lx)
	bw.Mul(m.B, c)
	bw.Scale(-1, &bw)
	add(a, np, 0, &bw)
	ld.Mul(out.Gain, &eD)
	bd.Mul(m.B, dd)
	ld.Sub(&ld, &bd)
	set(b, np, 0, &ld)

	noise := mat.NewDense(N, d.p, nil)
	var ln, bn mat.Dense
	ln.Mul(out.Gain, ey)
	bn.Mul(m.B, direct)
	ln.Sub(&ln, &bn)
	set(noise, np, 0, &ln)
	return &broken{a: a, b: b, c: c, d: dd, plant: np, noise: noise, direct: direct}, nil
}

// own lists the states that are no unknowns.
func (m *Model) own() []int {
	n, _ := m.A.Dims()
	var own []int
	for i := range n {
		if m.Roles == nil || m.Roles[i] != UnknownState {
			own = append(own, i)
		}
	}
	return own
}

func identity(n int) *mat.Dense {
	m := mat.NewDense(n, n, nil)
	for i := range n {
		m.Set(i, i, 1)
	}
	return m
}

// set copies src into dst with its corner at (row, col); add adds it.
func set(dst *mat.Dense, row, col int, src mat.Matrix) {
	r, c := src.Dims()
	dst.Slice(row, row+r, col, col+c).(*mat.Dense).Copy(src)
}

func add(dst *mat.Dense, row, col int, src mat.Matrix) {
	r, c := src.Dims()
	part := dst.Slice(row, row+r, col, col+c).(*mat.Dense)
	part.Add(part, src)
}

// closed returns the cut loop with the inputs in shut closed by u = −w, seen
// from the others: A − B (I + D)⁻¹ C on the closed part.
func (l *broken) closed(shut []int) (a *mat.Dense, inverse *mat.Dense, err error) {
	k := len(shut)
	if k == 0 {
		return mat.DenseCopyOf(l.a), nil, nil
	}
	n, _ := l.a.Dims()
	b, c, one := mat.NewDense(n, k, nil), mat.NewDense(k, n, nil), identity(k)
	for i, u := range shut {
		for r := range n {
			b.Set(r, i, l.b.At(r, u))
			c.Set(i, r, l.c.At(u, r))
		}
		for j, v := range shut {
			one.Set(i, j, one.At(i, j)+l.d.At(u, v))
		}
	}
	inverse = new(mat.Dense)
	if err := inverse.Inverse(one); err != nil {
		return nil, nil, errors.New("the direct feedthrough closes an algebraic loop that has no answer")
	}
	var ic, bic mat.Dense
	ic.Mul(inverse, c)
	bic.Mul(b, &ic)
	a = mat.NewDense(n, n, nil)
	a.Sub(l.a, &bic)
	return a, inverse, nil
}

// single returns the loop of one input with all the others closed.
func (l *broken) single(input int) (frequency.System, error) {
	_, inputs := l.b.Dims()
	n, _ := l.a.Dims()
	var others []int
	for u := range inputs {
		if u != input {
			others = append(others, u)
		}
	}
	a, inverse, err := l.closed(others)
	if err != nil {
		return frequency.System{}, err
	}
	b, c := mat.NewDense(n, 1, nil), mat.NewDense(1, n, nil)
	b.Copy(l.b.ColView(input))
	c.Copy(l.c.RowView(input).T())
	through := mat.NewDense(1, 1, []float64{l.d.At(input, input)})
	for i, u := range others {
		for j, v := range others {
			// u_others = −(I + D)⁻¹ (C x + D_oi u)
			g := -inverse.At(i, j)
			for r := range n {
				b.Set(r, 0, b.At(r, 0)+l.b.At(r, u)*g*l.d.At(v, input))
				c.Set(0, r, c.At(0, r)+l.d.At(input, u)*g*l.c.At(v, r))
			}
			through.Set(0, 0, through.At(0, 0)+l.d.At(input, u)*g*l.d.At(v, input))
		}
	}
	return frequency.System{A: raw(a), B: raw(b), C: raw(c), D: raw(through)}, nil
}
