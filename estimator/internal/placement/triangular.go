package placement

import (
	"math"

	"gonum.org/v1/gonum/mat"
)

// triangular describes all gains with given poles, defective ones included: it places
// one pole after the other by orthogonal changes of coordinates, which bring M − B K
// to block-triangular (real Schur) form (Varga 1981). For each pole a vector [x; g] of
// the p-dimensional null space of [M − λI, −B] says K x = g. The parameters are its
// coordinates in that null space, p real numbers for a real pole, 2p for a pair.
type triangular struct {
	n, p   int
	list   []pole
	m0, b0 []float64 // M and B in randomly turned coordinates, so that no entry vanishes by structure
	turn   *mat.Dense

	m, b, q []float64 // what is left at each step, and its coordinates
	house   []complex128
	t       []complex128 // the null space's basis
	z       []complex128
	h       []float64
	k       []float64 // the gain, p×n
}

func newTriangular(m, b *mat.Dense, list []pole) *triangular {
	n, p := b.Dims()
	t := &triangular{n: n, p: p, list: list}
	seed := uint64(7)
	g := mat.NewDense(n, n, nil)
	g.Apply(func(_, _ int, _ float64) float64 { return draw(&seed) }, g)
	var qr mat.QR
	qr.Factorize(g)
	t.turn = new(mat.Dense)
	qr.QTo(t.turn)
	var half, mt, bt mat.Dense
	half.Mul(m, t.turn)
	mt.Mul(t.turn.T(), &half)
	bt.Mul(t.turn.T(), b)
	t.m0, t.b0 = mt.RawMatrix().Data, bt.RawMatrix().Data
	t.m, t.b, t.q = make([]float64, n*n), make([]float64, n*p), make([]float64, n*n)
	t.house = make([]complex128, n*(n+p))
	t.t, t.z = make([]complex128, p*(n+p)), make([]complex128, n+p)
	t.h, t.k = make([]float64, n), make([]float64, p*n)
	return t
}

// parameters counts the parameters.
func (t *triangular) parameters() int { return t.n * t.p }

// gain sets k to the gain of the parameters. It reports false where a vector has no
// part x to speak of.
func (t *triangular) gain(params []float64) bool {
	return t.sweep(func(_, at int, g pole) []complex128 {
		w := make([]complex128, t.p)
		for l := range w {
			w[l] = complex(params[at+l], 0)
			if g.pair {
				w[l] += complex(0, params[at+t.p+l])
			}
		}
		return w
	})
}

// read finds the parameters of a gain given as L = Kᵀ, which should have the listed
// poles; where it has others, those of a gain nearby.
func (t *triangular) read(l *mat.Dense) ([]float64, bool) {
	var k mat.Dense
	k.Mul(l.T(), t.turn)
	params := make([]float64, t.parameters())
	ok := t.sweep(func(done, at int, g pole) []complex128 {
		z := t.eigenvector(&k, done, g)
		w := make([]complex128, t.p)
		d := len(z)
		for j := range w {
			for i, v := range t.t[j*d : j*d+d] {
				w[j] += complex(real(v), -imag(v)) * z[i]
			}
			params[at+j] = real(w[j])
			if g.pair {
				params[at+t.p+j] = imag(w[j])
			} else {
				w[j] = complex(real(w[j]), 0)
			}
		}
		return w
	})
	return params, ok
}

// sweep places every pole with the vector that choose picks by its coordinates.
func (t *triangular) sweep(choose func(done, at int, g pole) []complex128) bool {
	n, p := t.n, t.p
	copy(t.m, t.m0)
	copy(t.b, t.b0)
	clear(t.q)
	for i := range n {
		t.q[i*n+i] = 1
	}
	clear(t.k)
	done, at := 0, 0
	for _, g := range t.list {
		t.nullSpace(done, g.at)
		w := choose(done, at, g)
		d := n - done + p
		z := t.z[:d]
		clear(z)
		for l, c := range w {
			for i, v := range t.t[l*d : l*d+d] {
				z[i] += c * v
			}
		}
		if !t.take(done, z, g.pair) {
			return false
		}
		done += g.width()
		at += p * g.width()
	}
	return true
}

// nullSpace writes a basis of the null space of [M − λI, −B] of the block that starts
// at done to t.t.
func (t *triangular) nullSpace(done int, lambda complex128) {
	n, p := t.n, t.p
	size := n - done
	d := size + p
	for i := range size {
		row := t.house[i*d : i*d+d]
		for j := range size {
			row[j] = complex(t.m[(done+i)*n+done+j], 0)
		}
		row[i] -= complex(real(lambda), -imag(lambda))
		for j := range p {
			row[size+j] = complex(-t.b[(done+i)*p+j], 0)
		}
	}
	complement(t.t, t.house, size, d)
}

// eigenvector returns [x; K x] with x nearest to an eigenvector of M − B K for the pole
// g in the present block: the right singular vector of the smallest singular value of
// M − B K − λI.
func (t *triangular) eigenvector(k *mat.Dense, done int, g pole) []complex128 {
	n, p := t.n, t.p
	size := n - done
	var kq mat.Dense
	kq.Mul(k, mat.NewDense(n, n, t.q).Slice(0, n, done, n))
	copies := g.width()
	f := mat.NewDense(copies*size, copies*size, nil)
	for i := range size {
		for j := range size {
			v := t.m[(done+i)*n+done+j]
			for l := range p {
				v -= t.b[(done+i)*p+l] * kq.At(l, j)
			}
			for c := range copies {
				f.Set(c*size+i, c*size+j, v)
			}
		}
		for c := range copies {
			f.Set(c*size+i, c*size+i, f.At(c*size+i, c*size+i)-real(g.at))
		}
		if g.pair {
			f.Set(i, size+i, imag(g.at))
			f.Set(size+i, i, -imag(g.at))
		}
	}
	z := make([]complex128, size+p)
	var svd mat.SVD
	if !svd.Factorize(f, mat.SVDFullV) {
		return z
	}
	var v mat.Dense
	svd.VTo(&v)
	last := copies*size - 1
	for i := range size {
		z[i] = complex(v.At(i, last), 0)
		if g.pair {
			z[i] += complex(0, v.At(size+i, last))
		}
	}
	for l := range p {
		for j := range size {
			z[size+l] += complex(kq.At(l, j), 0) * z[j]
		}
	}
	return z
}

// take makes z = [x; g] the eigenvector of the block that starts at done: it turns x to
// the front of the block and adds to k the gain that K x = g asks for.
func (t *triangular) take(done int, z []complex128, pair bool) bool {
	n, p := t.n, t.p
	size := n - done
	whole := 0.0
	for _, v := range z {
		whole = math.Hypot(whole, abs(v))
	}
	u := make([]float64, size)
	for i := range u {
		u[i] = real(z[i])
	}
	lead := t.reflect(done, u)
	if !(math.Abs(lead) > 1e-9*whole) {
		return false
	}
	first := make([]float64, p)
	for l := range p {
		first[l] = real(z[size+l]) / lead
	}
	t.add(done, first)
	if !pair {
		return true
	}
	v := make([]float64, size)
	for i := range v {
		v[i] = imag(z[i])
	}
	reflect(v, 1, t.h[:size])
	side := v[0]
	second := t.reflect(done+1, v[1:])
	if !(math.Abs(second) > 1e-9*whole) {
		return false
	}
	for l := range p {
		first[l] = (imag(z[size+l]) - side*first[l]) / second
	}
	t.add(done+1, first)
	return true
}

// reflect turns x, which it overwrites, to the front of the block that starts at done:
// m ← H m H, b ← H b, q ← q H with H x = lead e₁. The vector of H is left in t.h for the
// first of two calls and in x.
func (t *triangular) reflect(done int, x []float64) (lead float64) {
	n, p := t.n, t.p
	norm := norm2(x)
	if norm == 0 {
		return 0
	}
	lead = -math.Copysign(norm, x[0])
	x[0] -= lead
	scale(x, math.Sqrt2/norm2(x))
	copy(t.h, x)
	for i := done; i < n; i++ {
		reflect(t.m[i*n+done:], 1, x)
	}
	for j := done; j < n; j++ {
		reflect(t.m[done*n+j:], n, x)
	}
	for j := range p {
		reflect(t.b[done*p+j:], p, x)
	}
	for i := range n {
		reflect(t.q[i*n+done:], 1, x)
	}
	return lead
}

// add sets the gain on column j of q.
func (t *triangular) add(j int, part []float64) {
	for l, v := range part {
		for i := range t.n {
			t.k[l*t.n+i] += v * t.q[i*t.n+j]
		}
	}
}

// gainTo writes L = Kᵀ in the original coordinates to dst (n×p, dense).
func (t *triangular) gainTo(dst []float64) {
	l := mat.NewDense(t.n, t.p, dst)
	l.Mul(t.turn, mat.NewDense(t.p, t.n, t.k).T())
}
