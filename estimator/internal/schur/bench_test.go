package schur_test

import (
	"fmt"
	"testing"

	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/mat"

	"polewright/estimator/internal/schur"
)

var sink float64

func BenchmarkForm(b *testing.B) {
	for _, n := range []int{4, 6, 10, 20, 50} {
		a := stable(n)
		q, p := mat.NewDense(n, n, nil), mat.NewDense(n, n, nil)
		q.Mul(a, a.T())
		var f schur.Form
		must(b, f.Factor(a.RawMatrix()))
		run := func(name string, work func() error) {
			b.Run(fmt.Sprintf("%s/n=%d", name, n), func(b *testing.B) {
				b.ReportAllocs()
				for b.Loop() {
					must(b, work())
				}
				sink += p.At(0, 0)
			})
		}
		equation := func(solve func(dst, q blas64.General) error) func() error {
			return func() error { return solve(p.RawMatrix(), q.RawMatrix()) }
		}
		run("Factor", func() error { return f.Factor(a.RawMatrix()) })
		run("Lyapunov", equation(f.Lyapunov))
		run("LyapunovAdjoint", equation(f.LyapunovAdjoint))
		run("Stein", equation(f.Stein))
		run("VectorCondition", func() error { _, err := f.VectorCondition(); return err })
	}
}
