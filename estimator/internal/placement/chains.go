package placement

import (
	"math"

	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/mat"
)

// chains writes a gain for poles that have no independent eigenvectors, such as
// more copies of one pole than there are sensors (the Jordan chains of Klein &
// Moore 1977). It allocates; such lists are rare. Independent eigenvectors are
// looked for only in blocks of at most limit states.
func chains(dst, a, c blas64.General, list []pole, limit int) error {
	am, cm, l := new(mat.Dense), new(mat.Dense), new(mat.Dense)
	am.SetRawMatrix(a)
	cm.SetRawMatrix(c)
	l.SetRawMatrix(dst)
	k, err := assign(mat.DenseCopyOf(am.T()), mat.DenseCopyOf(cm.T()), list, limit)
	if err != nil {
		return err
	}
	l.Copy(k.T())
	return nil
}

// assign returns K that gives m − b K the listed eigenvalues. Where the rest has
// independent eigenvectors it chooses them as Robust does; else it takes one pole
// with one eigenvector off by an orthogonal change of coordinates and goes on with
// the block that is left, which is controllable as well (Varga 1981). After a search
// in vain the next one waits until half the block is done.
func assign(m, b *mat.Dense, list []pole, limit int) (*mat.Dense, error) {
	b1, turn, err := compress(b)
	if err != nil {
		return nil, err
	}
	n, r := b1.Dims()
	var k *mat.Dense
	if r == 1 {
		k, err = assignSingle(m, b1, list)
	} else {
		if n <= limit && (r == n || mostCopies(list) <= r) {
			k = assignVectors(m, b1, list)
			limit = n / 2
		}
		if k == nil {
			k, err = deflate(m, b1, list, limit)
		}
	}
	if err != nil {
		return nil, err
	}
	full := mat.NewDense(turn.RawMatrix().Rows, n, nil)
	full.Mul(turn, k)
	return full, nil
}

// compress returns b V with independent columns, and V.
func compress(b *mat.Dense) (b1, v *mat.Dense, err error) {
	var svd mat.SVD
	if !svd.Factorize(b, mat.SVDThin) {
		return nil, nil, ErrNotReached
	}
	s := svd.Values(nil)
	rank := 0
	for rank < len(s) && s[rank] > 1e-13*s[0] {
		rank++
	}
	if rank == 0 {
		return nil, nil, ErrUnobservable
	}
	var all mat.Dense
	svd.VTo(&all)
	rows, _ := all.Dims()
	v = mat.DenseCopyOf(all.Slice(0, rows, 0, rank))
	b1 = new(mat.Dense)
	b1.Mul(b, v)
	return b1, v, nil
}

func assignSingle(m, b *mat.Dense, list []pole) (*mat.Dense, error) {
	n, _ := m.Dims()
	var one single
	one.reset(n)
	for i := range n {
		copy(one.m[i*n:i*n+n], m.RawRowView(i))
		one.b[i] = b.At(i, 0)
	}
	if err := one.place(list); err != nil {
		return nil, err
	}
	return mat.NewDense(1, n, one.k), nil
}

// assignVectors returns nil where no independent eigenvectors are found.
func assignVectors(m, b *mat.Dense, list []pole) *mat.Dense {
	n, p := b.Dims()
	var r robust
	if !r.load(mat.DenseCopyOf(m.T()).RawMatrix(), mat.DenseCopyOf(b.T()).RawMatrix()) {
		return nil
	}
	r.gather(list)
	if n == p {
		r.normalVectors(nil)
	} else if _, ok := r.choose(nil); !ok {
		return nil
	}
	l := mat.NewDense(n, p, nil)
	if !r.gain(l.RawMatrix()) {
		return nil
	}
	return mat.DenseCopyOf(l.T())
}

// deflate places one pole of the list and leaves the others to assign. More than p
// copies of a pole take the whole null space at once, which leaves the shortest
// chains.
func deflate(m, b *mat.Dense, list []pole, limit int) (*mat.Dense, error) {
	n, p := b.Dims()
	i := hardest(list)
	r := robust{}
	if !r.load(mat.DenseCopyOf(m.T()).RawMatrix(), mat.DenseCopyOf(b.T()).RawMatrix()) {
		return nil, ErrNotReached
	}
	copies := 1
	var q, part *mat.Dense
	if multiplicity(list, list[i].at) > p {
		copies = p
		q, part = r.everything(list[i])
	} else {
		q, part = r.cheapest(list[i])
	}
	if q == nil {
		return nil, ErrUnobservable
	}
	w := copies * list[i].width()
	rest := without(list, list[i].at, copies)
	k := mat.NewDense(p, n, nil)
	k.Mul(part, q.Slice(0, n, 0, w).T())
	if n == w {
		return k, nil
	}
	q2 := q.Slice(0, n, w, n)
	var t, m2, b2, more mat.Dense
	t.Mul(m, q2)
	m2.Mul(q2.T(), &t)
	b2.Mul(q2.T(), b)
	k2, err := assign(&m2, &b2, rest, limit)
	if err != nil {
		return nil, err
	}
	more.Mul(k2, q2.T())
	k.Add(k, &more)
	return k, nil
}

func mostCopies(list []pole) int {
	most := 0
	for _, p := range list {
		most = max(most, multiplicity(list, p.at))
	}
	return most
}

func without(list []pole, at complex128, copies int) []pole {
	var rest []pole
	for _, q := range list {
		if q.at == at && copies > 0 {
			copies--
			continue
		}
		rest = append(rest, q)
	}
	return rest
}

// hardest returns the entry with most copies, and among equals the one closest to
// another pole.
func hardest(list []pole) int {
	best, most, near := 0, 0, math.Inf(1)
	for i, p := range list {
		k, d := multiplicity(list, p.at), math.Inf(1)
		for j, q := range list {
			if j != i {
				d = math.Min(d, abs(p.at-q.at))
			}
		}
		if k > most || k == most && d < near {
			best, most, near = i, k, d
		}
	}
	return best
}

func abs(z complex128) float64 { return math.Hypot(real(z), imag(z)) }

// cheapest looks through the null space of one pole, at each basis vector and at a
// fixed number of mixtures, for the eigenvector that needs the smallest gain. It
// returns an orthogonal matrix whose first columns span the eigenvector and the
// gain on these columns; nil where every candidate is degenerate.
func (r *robust) cheapest(at pole) (q, part *mat.Dense) {
	n, p := r.n, r.p
	r.groups = []group{{pole: at, m: 1}}
	r.nullSpaces()
	basis := append([]complex128(nil), r.frames...)
	seed := uint64(1)
	best := math.Inf(1)
	for try := range p + 40 {
		copy(r.frames, basis)
		if try < p {
			copy(r.frames[:n], basis[try*n:try*n+n])
		} else {
			r.scatter(&seed)
		}
		if qt, pt := r.fix(at, 1); qt != nil {
			if size := mat.Norm(pt, 2); size < best {
				best, q, part = size, qt, pt
			}
		}
	}
	return q, part
}

// everything is cheapest for p copies of the pole, which leaves no choice.
func (r *robust) everything(at pole) (q, part *mat.Dense) {
	r.groups = []group{{pole: at, m: 1}}
	r.nullSpaces()
	return r.fix(at, r.p)
}

// fix returns an orthogonal matrix whose first columns span the first m vectors of
// the frames and the gain on these columns that makes them eigenvectors; nil where
// they are dependent.
func (r *robust) fix(at pole, m int) (q, part *mat.Dense) {
	n, w := r.n, at.width()
	x, gamma := mat.NewDense(n, m*w, nil), mat.NewDense(r.p, m*w, nil)
	for j := range m {
		for i, v := range r.frames[j*n : j*n+n] {
			x.Set(i, j*w, real(v))
			if at.pair {
				x.Set(i, j*w+1, imag(v))
			}
		}
		r.inputs(gamma, j, at)
	}
	var qr mat.QR
	qr.Factorize(x)
	if !(qr.Cond() < 1e8) {
		return nil, nil
	}
	var upper mat.Dense
	qr.RTo(&upper)
	q, part = new(mat.Dense), new(mat.Dense)
	qr.QTo(q)
	var t mat.Dense // Γ R⁻¹
	if t.Solve(upper.Slice(0, m*w, 0, m*w).T(), gamma.T()) != nil {
		return nil, nil
	}
	part.CloneFrom(t.T())
	return q, part
}

// inputs writes Γ = Z⁻¹ U₀ᵀ (M − λI) x, real and imaginary part, for vector j of the
// frames.
func (r *robust) inputs(gamma *mat.Dense, j int, at pole) {
	n, p := r.n, r.p
	g := make([]complex128, p)
	for k := range p {
		for i, v := range r.frames[j*n : j*n+n] {
			g[k] += (complex(r.u0m[k*n+i], 0) - at.at*complex(r.q[i*n+k], 0)) * v
		}
	}
	for k := p - 1; k >= 0; k-- {
		for l := k + 1; l < p; l++ {
			g[k] -= complex(r.b[k*p+l], 0) * g[l]
		}
		g[k] /= complex(r.b[k*p+k], 0)
		gamma.Set(k, j*at.width(), real(g[k]))
		if at.pair {
			gamma.Set(k, j*at.width()+1, imag(g[k]))
		}
	}
}
