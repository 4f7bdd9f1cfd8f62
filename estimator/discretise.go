package estimator

import (
	"errors"

	"gonum.org/v1/gonum/mat"
)

func Discretise(a, b, g *mat.Dense, q *mat.SymDense, period float64) (ad, bd *mat.Dense, qd *mat.SymDense, err error) {
	return nil, nil, nil, errors.New("not yet")
}
