package transient

import (
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/lapack"
	lapackgonum "gonum.org/v1/gonum/lapack/gonum"
)

// spectral computes 2-norms through the largest eigenvalue of XᵀX, which loses
// no accuracy for the largest one.
type spectral struct {
	gram, values, work []float64
}

func (g *spectral) reset(n int) {
	g.gram, g.values = make([]float64, n*n), make([]float64, n)
	g.work = make([]float64, max(1, 3*n))
}

// norm returns the 2-norm of the rows and columns keep of the n×n matrix x.
func (g *spectral) norm(n int, x []float64, keep []int) float64 {
	m := len(keep)
	var scale float64
	for _, i := range keep {
		for _, k := range keep {
			scale = max(scale, math.Abs(x[i*n+k]))
		}
	}
	if scale == 0 || math.IsInf(scale, 0) || math.IsNaN(scale) {
		return scale
	}
	a := g.gram[:m*m]
	clear(a)
	for _, i := range keep {
		row := x[i*n : i*n+n]
		for p, k := range keep {
			v := row[k] / scale
			for q := p; q < m; q++ {
				a[p*m+q] += v * (row[keep[q]] / scale)
			}
		}
	}
	switch m {
	case 1:
		return scale * math.Sqrt(a[0])
	case 2:
		half, off := (a[0]-a[3])/2, a[1]
		return scale * math.Sqrt((a[0]+a[3])/2+math.Hypot(half, off))
	}
	var impl lapackgonum.Implementation
	if !impl.Dsyev(lapack.EVNone, blas.Upper, m, a, m, g.values[:m], g.work, len(g.work)) {
		return math.NaN()
	}
	return scale * math.Sqrt(max(g.values[m-1], 0))
}
