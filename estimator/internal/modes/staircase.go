package modes

import "gonum.org/v1/gonum/mat"

// staircase returns orthogonal q whose first rank columns span what the sensors
// see: starting from the row space of C, each step adds the directions of the
// rest that feed the newest block through A.
func staircase(a, c *mat.Dense, tol float64) (q *mat.Dense, rank int, err error) {
	n, _ := a.Dims()
	q = identity(n)
	work := mat.DenseCopyOf(a)
	link := mat.DenseCopyOf(c) // how the newest block sees the rest
	limit := tol * mat.Norm(c, 2)
	for rank < n {
		v, r, err := rowSpace(link, limit)
		if err != nil {
			return nil, 0, err
		}
		if r == 0 {
			break
		}
		rotate(work, q, v, rank)
		rank += r
		if rank == n {
			break
		}
		link = mat.DenseCopyOf(work.Slice(rank-r, rank, rank, n))
		limit = tol * mat.Norm(a, 2)
	}
	return q, rank, nil
}

// rowSpace returns an orthogonal matrix whose first r columns span the row space
// of m, singular values at or below limit counting as zero.
func rowSpace(m *mat.Dense, limit float64) (v *mat.Dense, r int, err error) {
	var svd mat.SVD
	if !svd.Factorize(m, mat.SVDFullV) {
		return nil, 0, ErrNoConvergence
	}
	for _, s := range svd.Values(nil) {
		if s > limit {
			r++
		}
	}
	v = new(mat.Dense)
	svd.VTo(v)
	return v, r, nil
}

// rotate applies v to the coordinates from k on: a ← Vᵀ a V, q ← q V.
func rotate(a, q, v *mat.Dense, k int) {
	n, _ := a.Dims()
	var t mat.Dense
	cols := a.Slice(0, n, k, n).(*mat.Dense)
	t.Mul(cols, v)
	cols.Copy(&t)
	t.Reset()
	rows := a.Slice(k, n, 0, n).(*mat.Dense)
	t.Mul(v.T(), rows)
	rows.Copy(&t)
	t.Reset()
	cols = q.Slice(0, n, k, n).(*mat.Dense)
	t.Mul(cols, v)
	cols.Copy(&t)
}

// unseen returns Aū, the part of A that acts on the unobservable coordinates.
func unseen(a, q *mat.Dense, rank int) *mat.Dense {
	n, _ := a.Dims()
	q2 := q.Slice(0, n, rank, n)
	var t, u mat.Dense
	t.Mul(a, q2)
	u.Mul(q2.T(), &t)
	return &u
}
