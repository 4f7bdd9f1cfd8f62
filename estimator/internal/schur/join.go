package schur

import (
	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
)

// Join sets f to the Schur form of [A X; 0 B] from those of A (n×n) and B (m×m);
// x is n×m. It costs no iteration.
func (f *Form) Join(a, b *Form, x blas64.General) error {
	f.valid = false
	if !a.valid || !b.valid {
		return ErrEmpty
	}
	n, m := a.n, b.n
	if x.Rows != n || x.Cols != m || x.Stride < m || n > 0 && len(x.Data) < (n-1)*x.Stride+m {
		return ErrShape
	}
	f.reset(n + m)
	clear(f.t.Data)
	clear(f.z.Data)
	for i := range n {
		copy(f.t.Data[i*(n+m):], a.t.Data[i*n:i*n+n])
		copy(f.z.Data[i*(n+m):], a.z.Data[i*n:i*n+n])
	}
	for i := range m {
		copy(f.t.Data[(n+i)*(n+m)+n:], b.t.Data[i*m:i*m+m])
		copy(f.z.Data[(n+i)*(n+m)+n:], b.z.Data[i*m:i*m+m])
	}
	if n > 0 && m > 0 {
		xz := blas64.General{Rows: n, Cols: m, Stride: m, Data: make([]float64, n*m)}
		blas64.Gemm(blas.NoTrans, blas.NoTrans, 1, x, b.z, 0, xz)
		corner := blas64.General{Rows: n, Cols: m, Stride: n + m, Data: f.t.Data[n:]}
		blas64.Gemm(blas.Trans, blas.NoTrans, 1, a.z, xz, 0, corner)
	}
	copy(f.values, a.values)
	copy(f.values[n:], b.values)
	f.valid = true
	return nil
}
