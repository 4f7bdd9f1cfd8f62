package placement

import (
	"math"
	"slices"

	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/mat"
)

// normal serves as many sensors as states: A − L C can be any matrix, so it is made
// a normal one, whose eigenvectors are orthogonal.
func (s *Solver) normal(dst, a, c blas64.General, warm *Warm) (Info, error) {
	r := &s.robust
	r.normalVectors(warm)
	if !r.gain(dst) {
		return Info{}, ErrSensors
	}
	if warm != nil {
		warm.keep(r)
	}
	info := Info{Condition: r.condition(), Converged: true}
	if r.reached(dst, a, c) {
		return info, nil
	}
	return info, s.check.eigenvalues(dst, a, c, s.list)
}

// normalVectors fills the frames with orthogonal eigenvectors: those stored in
// warm where they fit, else the choice that changes a symmetric M least, the
// eigenvectors of (M + Mᵀ)/2 in ascending order given to the poles in ascending
// order of real parts.
func (r *robust) normalVectors(warm *Warm) {
	r.nullSpaces()
	if ok, _ := warm.project(r); ok && r.orthogonal() {
		return
	}
	n := r.n
	sym := mat.NewSymDense(n, nil)
	for i := range n {
		for j := i; j < n; j++ {
			sym.SetSym(i, j, (r.m[i*n+j]+r.m[j*n+i])/2)
		}
	}
	v := mat.NewDense(n, n, nil)
	var eig mat.EigenSym
	if eig.Factorize(sym, true) {
		eig.VectorsTo(v)
	} else {
		for i := range n {
			v.Set(i, i, 1)
		}
	}
	order := make([]int, len(r.groups))
	for i := range order {
		order[i] = i
	}
	slices.SortStableFunc(order, func(i, j int) int {
		switch a, b := real(r.groups[i].at), real(r.groups[j].at); {
		case a < b:
			return -1
		case a > b:
			return 1
		}
		return 0
	})
	basis := slices.Clone(r.groups[0].t) // any basis of the whole space
	at := 0
	for _, i := range order {
		g := &r.groups[i]
		for j := range g.m {
			x := g.t[j*n : j*n+n]
			if !g.pair {
				for k := range x {
					x[k] = complex(v.At(k, at), 0)
				}
				at++
				continue
			}
			s := math.Copysign(1, r.skew(v, at))
			for k := range x {
				x[k] = complex(v.At(k, at)/math.Sqrt2, s*v.At(k, at+1)/math.Sqrt2)
			}
			at += 2
		}
		complete(g.t, basis, g.m, n, n)
	}
}

// skew returns uᵀ (M − Mᵀ) w for the columns at, at+1 of v: it tells which way M
// turns their plane.
func (r *robust) skew(v *mat.Dense, at int) float64 {
	n, sum := r.n, 0.0
	for i := range n {
		for j := range n {
			sum += v.At(i, at) * (r.m[i*n+j] - r.m[j*n+i]) * v.At(j, at+1)
		}
	}
	return sum
}

// orthogonal tells whether the present eigenvectors are orthonormal to rounding.
func (r *robust) orthogonal() bool {
	n := r.n
	r.fillX()
	gramian(r.gram, r.xt, n)
	for i := range n {
		for j := range n {
			want := 0.0
			if i == j {
				want = 1
			}
			if math.Abs(r.gram[i*n+j]-want) > 1e-10 {
				return false
			}
		}
	}
	return true
}
