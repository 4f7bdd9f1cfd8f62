package schur

import (
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/lapack"
)

// repeated writes an orthonormal basis of the left eigenspace of the group of
// size copies that starts at g to the rows of v from filled on. It returns
// how many rows it wrote: 0 where the eigenspace is too small. A complex
// group stands for itself and its conjugate.
func (c *condition) repeated(f *Form, g, size int, isReal bool, filled int) (int, error) {
	mean, spread := c.mean(f, g, size)
	limit := max(30*float64(f.n)*eps*frobenius(f.t), min(100*spread, 1e-6*cmplx.Abs(mean)))
	c.prepareRepeated(f.n)
	if isReal {
		return c.repeatedReal(f, real(mean), size, filled, limit)
	}
	return c.repeatedComplex(f, mean, size, filled, limit)
}

// repeatedReal takes the null space of Tᵀ − λI from its singular vectors.
func (c *condition) repeatedReal(f *Form, mean float64, size, filled int, limit float64) (int, error) {
	n := f.n
	d, vt := c.wide[:n*n], c.wideVT[:n*n]
	for i := range n {
		for j := range n {
			d[i*n+j] = f.t.Data[j*n+i]
		}
		d[i*n+i] -= mean
	}
	if !impl.Dgesvd(lapack.SVDNone, lapack.SVDAll, n, n, d, n, c.wideS[:n], nil, 1, vt, n, c.work, len(c.work)) {
		return 0, ErrNoConvergence
	}
	if c.wideS[n-size] > limit {
		return 0, nil
	}
	for k := range size {
		for i := range n {
			c.v.Data[(filled+k)*n+i] = vt[(n-size+k)*n+i]
		}
	}
	return size, nil
}

// repeatedComplex takes the null space of Tᵀ − λI, λ = a + ib, from the
// singular vectors of
//
//	[ Tᵀ − aI    bI     ]
//	[  −bI     Tᵀ − aI  ],
//
// which has every singular value twice: (x, y) stands for x + iy, and with it
// comes (−y, x), its multiple by i.
func (c *condition) repeatedComplex(f *Form, mean complex128, size, filled int, limit float64) (int, error) {
	n, m := f.n, 2*f.n
	d := c.wide
	clear(d)
	for i := range n {
		for j := range n {
			d[i*m+j] = f.t.Data[j*n+i]
			d[(n+i)*m+n+j] = f.t.Data[j*n+i]
		}
		d[i*m+i] -= real(mean)
		d[(n+i)*m+n+i] -= real(mean)
		d[i*m+n+i] = imag(mean)
		d[(n+i)*m+i] = -imag(mean)
	}
	if !impl.Dgesvd(lapack.SVDNone, lapack.SVDAll, m, m, d, m, c.wideS, nil, 1, c.wideVT, m, c.work, len(c.work)) {
		return 0, ErrNoConvergence
	}
	if c.wideS[2*(n-size)] > limit {
		return 0, nil
	}
	for k := range 2 * size {
		row := c.wideVT[(2*(n-size)+k)*m:]
		for i := range n {
			c.basis[k][i] = complex(row[i], row[n+i])
		}
	}
	orthonormal(c.basis[:2*size], size)
	for k := range size {
		for i, v := range c.basis[k] {
			c.v.Data[(filled+2*k)*n+i] = math.Sqrt2 * real(v)
			c.v.Data[(filled+2*k+1)*n+i] = math.Sqrt2 * imag(v)
		}
	}
	return 2 * size, nil
}

// mean returns the mean of group g and the largest distance from it.
func (c *condition) mean(f *Form, g, size int) (mean complex128, spread float64) {
	for k, v := range f.values {
		if c.group[k] == g {
			mean += v / complex(float64(size), 0)
		}
	}
	for k, v := range f.values {
		if c.group[k] == g {
			spread = max(spread, cmplx.Abs(v-mean))
		}
	}
	return mean, spread
}

func (c *condition) prepareRepeated(n int) {
	if len(c.wideS) == 2*n {
		return
	}
	c.wide, c.wideVT = make([]float64, 4*n*n), make([]float64, 4*n*n)
	c.wideS = make([]float64, 2*n)
	c.basis = make([][]complex128, 2*n)
	for i := range c.basis {
		c.basis[i] = make([]complex128, n)
	}
}

// orthonormal makes the first size vectors of list an orthonormal basis of
// the space that all of them span, which has size dimensions: Gram & Schmidt,
// the longest remainder first, each projection done twice.
func orthonormal(list [][]complex128, size int) {
	for k := range size {
		best, norm := k, -1.0
		for j := k; j < len(list); j++ {
			if v := length(list[j]); v > norm {
				best, norm = j, v
			}
		}
		list[k], list[best] = list[best], list[k]
		for i := range list[k] {
			list[k][i] /= complex(norm, 0)
		}
		for j := k + 1; j < len(list); j++ {
			for range 2 {
				var inner complex128
				for i, v := range list[k] {
					inner += cmplx.Conj(v) * list[j][i]
				}
				for i, v := range list[k] {
					list[j][i] -= inner * v
				}
			}
		}
	}
}

func length(x []complex128) float64 {
	sum := 0.0
	for _, v := range x {
		sum = math.Hypot(sum, cmplx.Abs(v))
	}
	return sum
}
