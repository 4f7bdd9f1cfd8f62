package poles_test

import (
	"math"
	"math/cmplx"
	"math/rand/v2"
	"slices"
	"testing"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"

	"polewright/estimator/poles"
)

// least tries every assignment.
func least(wanted, have []complex128, used int) float64 {
	if len(wanted) == 0 {
		return 0
	}
	best := math.Inf(1)
	for k, h := range have {
		if used>>k&1 == 0 {
			best = min(best, cmplx.Abs(wanted[0]-h)+least(wanted[1:], have, used|1<<k))
		}
	}
	return best
}

func TestMatchIsTheLeast(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		grid := rapid.IntRange(-3, 3)
		draw := func(n int, name string) []complex128 {
			list := make([]complex128, n)
			for i := range list {
				list[i] = complex(float64(grid.Draw(t, name)), float64(grid.Draw(t, name)))
			}
			return list
		}
		n := rapid.IntRange(0, 5).Draw(t, "n")
		wanted, have := draw(n, "wanted"), draw(rapid.IntRange(n, 6).Draw(t, "m"), "have")
		index := poles.Match(wanted, have)
		var sum float64
		seen := map[int]bool{}
		for i, k := range index {
			if seen[k] {
				t.Fatalf("%v uses one twice", index)
			}
			seen[k] = true
			sum += cmplx.Abs(wanted[i] - have[k])
		}
		if want := least(wanted, have, 0); sum > want+1e-9 {
			t.Fatalf("%v to %v: sum %v, least %v", wanted, have, sum, want)
		}
		back := poles.Match(have, wanted)
		sum = 0
		var left int
		for i, k := range back {
			if k < 0 {
				left++
			} else {
				sum += cmplx.Abs(have[i] - wanted[k])
			}
		}
		if left != len(have)-len(wanted) || sum > least(wanted, have, 0)+1e-9 {
			t.Fatalf("back: %v", back)
		}
	})
}

func TestMatchDegenerate(t *testing.T) {
	nan, inf := cmplx.NaN(), cmplx.Inf()
	for _, c := range []struct {
		wanted, have []complex128
		want         []int
	}{
		{nil, nil, []int{}},
		{[]complex128{1}, nil, []int{-1}},
		{[]complex128{1, 1, 1}, []complex128{1, 1, 1}, []int{0, 1, 2}},
		{[]complex128{nan, 2}, []complex128{2, inf}, []int{1, 0}},
		{[]complex128{nan}, []complex128{nan}, []int{0}},
	} {
		if diff := cmp.Diff(c.want, poles.Match(c.wanted, c.have)); diff != "" {
			t.Errorf("%v to %v: %s", c.wanted, c.have, diff)
		}
	}
}

func random(n int, seed uint64) []complex128 {
	r := rand.New(rand.NewPCG(seed, 1))
	list := make([]complex128, n)
	for i := range list {
		list[i] = complex(r.NormFloat64(), r.NormFloat64())
	}
	return list
}

var sink []int

func BenchmarkMatch(b *testing.B) {
	for name, n := range map[string]int{"4": 4, "10": 10, "50": 50, "200": 200} {
		b.Run(name, func(b *testing.B) {
			wanted, have := random(n, 1), random(n, 2)
			b.ReportAllocs()
			for b.Loop() {
				sink = poles.Match(wanted, have)
			}
		})
	}
}

func TestWithoutTakesTheNearestOnce(t *testing.T) {
	list := []complex128{-1, -1, -2 + 1i, -2 - 1i, 5}
	got := poles.Without(list, []complex128{-1.1, -2 + 0.9i, 4})
	if want := []complex128{-1, -2 - 1i}; !slices.Equal(got, want) {
		t.Errorf("%v is left, expected %v", got, want)
	}
	if list[4] != 5 {
		t.Error("the list itself was changed")
	}
	if got := poles.Without(list[:1], []complex128{0, 0}); len(got) != 0 {
		t.Errorf("%v is left of one", got)
	}
}
