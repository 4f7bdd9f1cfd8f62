package placement_test

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/mat"

	"polewright/estimator/internal/placement"
)

func distance(x, y blas64.General) float64 {
	var d mat.Dense
	d.Sub(wrap(x), wrap(y))
	return mat.Norm(&d, 2)
}

func copyOf(g blas64.General) blas64.General {
	return mat.DenseCopyOf(wrap(g)).RawMatrix()
}

// Dragging a pole in 200 small steps moves the gain in small steps: none may exceed
// a fixed multiple of the step's size relative to the poles.
func TestDragIsContinuous(t *testing.T) {
	var s placement.Solver
	for _, c := range load(t, "robust.json", 16) {
		if len(c.A) == len(c.C) {
			continue
		}
		a, cm := general(c.A), general(c.C)
		list := c.list()
		size := 0.0
		for _, p := range list {
			size = math.Max(size, math.Hypot(real(p), imag(p)))
		}
		last := len(list) - 1
		step := size * 0.002
		var w placement.Warm
		l, before := zeros(len(c.A), len(c.C)), zeros(len(c.A), len(c.C))
		worst, steps := 0.0, 0
		for k := range 201 {
			info, err := s.Robust(l, a, cm, list, &w)
			if err != nil {
				t.Errorf("%s, step %d: %v", c.Name, k, err)
				break
			}
			if k > 0 {
				steps += info.Iterations
				j := distance(l, before) / mat.Norm(wrap(before), 2) / 0.002
				worst = math.Max(worst, j)
			}
			before = copyOf(l)
			if imag(list[last]) != 0 { // the last pair, or the last real pole, gets faster
				list[last-1] -= complex(step, 0)
			}
			list[last] -= complex(step, 0)
		}
		t.Logf("%-28s largest relative jump over relative step %.2f, %.1f steps of descent each", c.Name, worst, float64(steps)/200)
		if worst > 25 {
			t.Errorf("%s: the gain jumps by %g times the step", c.Name, worst)
		}
	}
}

// Poles that pass through each other, meet on the axis and part again keep the gain
// on its branch.
func TestDragThroughMeetings(t *testing.T) {
	var s placement.Solver
	a := general([][]float64{{0, 1, 0, 0}, {-2, -0.1, 1, 0.05}, {0, 0, 0, 1}, {1, 0.05, -2, -0.1}})
	c := general([][]float64{{1, 0, 0, 0}, {0, 0, 1, 0}})
	const h = 0.02
	path := func(k int) []complex128 {
		x := float64(k) * h
		switch {
		case k < 50: // -3 passes -3.5 on its way to -4
			return []complex128{complex(-3-x, 0), -3.5, -5, -6}
		case k < 100: // -4 and -3.5 meet
			d := 0.5 * (1 - (x-50*h)/(50*h))
			return []complex128{complex(-3.75-d/2, 0), complex(-3.75+d/2, 0), -5, -6}
		case k == 100:
			return []complex128{-3.75, -3.75, -5, -6}
		}
		y := x - 100*h // and leave the axis as a pair
		return []complex128{complex(-3.75, y), complex(-3.75, -y), -5, -6}
	}
	var w placement.Warm
	l, before := zeros(4, 2), zeros(4, 2)
	worst, at := 0.0, 0
	for k := range 151 {
		if _, err := s.Robust(l, a, c, path(k), &w); err != nil {
			t.Fatalf("step %d: %v", k, err)
		}
		if k > 0 {
			if d := distance(l, before) / h; d > worst {
				worst, at = d, k
			}
		}
		before = copyOf(l)
	}
	t.Logf("largest jump %.1f times the step, at step %d", worst, at)
	if worst > 60 {
		t.Errorf("the gain jumps by %g times the step at step %d", worst, at)
	}
}

// A clone is not touched by later calls and always leads to the same gain.
func TestWarmClone(t *testing.T) {
	var s placement.Solver
	a, c, poles := plant(6, 2, 5, 0.6)
	var w placement.Warm
	l := zeros(6, 2)
	if (&w).Clone().Empty() != true || (*placement.Warm)(nil).Clone() != nil {
		t.Error("clone of nothing")
	}
	if _, err := s.Robust(l, a, c, poles, &w); err != nil {
		t.Fatal(err)
	}
	kept := w.Clone()
	if _, err := s.Robust(l, a, c, poles, w.Clone()); err != nil {
		t.Fatal(err)
	}
	first := copyOf(l)
	faster := append([]complex128(nil), poles...)
	for i := range faster {
		faster[i] *= 1.5
	}
	if _, err := s.Robust(l, a, c, faster, &w); err != nil {
		t.Fatal(err)
	}
	if _, err := s.Robust(l, a, c, poles, kept); err != nil {
		t.Fatal(err)
	}
	if d := distance(l, first); d != 0 {
		t.Errorf("the clone leads to a gain %g away", d)
	}
}

// A warm choice for another plant size is not used.
func TestWarmOfOtherSize(t *testing.T) {
	var s placement.Solver
	var w placement.Warm
	for _, n := range []int{6, 4, 5} {
		a, c, poles := plant(n, 2, 7, 0.6)
		l := zeros(n, 2)
		if _, err := s.Robust(l, a, c, poles, &w); err != nil {
			t.Fatal(err)
		}
		if miss := poleError(closed(a, c, l), poles); miss > 1e-9 {
			t.Errorf("n = %d: poles off by %g", n, miss)
		}
	}
}

// With as many sensors as states a drag keeps the eigenvectors that it started with,
// even where the poles change their order.
func TestDragWithFullMeasurement(t *testing.T) {
	var s placement.Solver
	a, _, _ := plant(3, 1, 9, 0.6)
	c := general([][]float64{{1, 0, 0}, {0.5, 1, 0}, {0, 0.3, 1}})
	var w placement.Warm
	l, before := zeros(3, 3), zeros(3, 3)
	for k := range 101 {
		x := 0.02 * float64(k)
		if _, err := s.Robust(l, a, c, []complex128{complex(-1-x, 0), -2, -4}, &w); err != nil {
			t.Fatal(err)
		}
		// The change of A − L C is 0.02 along one unit vector; ‖C⁻¹‖ is below 2.
		if d := distance(l, before); k > 0 && d > 0.04 {
			t.Errorf("step %d: the gain moves by %g", k, d)
		}
		before = copyOf(l)
	}
}

// A drag allocates nothing once the workspaces are there.
func TestDragDoesNotAllocate(t *testing.T) {
	a, c, poles := plant(6, 2, 3, 0.6)
	there := append([]complex128(nil), poles...)
	there[0] *= 1.02
	if imag(there[0]) != 0 {
		there[1] *= 1.02
	}
	l := zeros(6, 2)
	var s placement.Solver
	var w placement.Warm
	k := 0
	got := testing.AllocsPerRun(50, func() {
		list := poles
		if k++; k%2 == 1 {
			list = there
		}
		if _, err := s.Robust(l, a, c, list, &w); err != nil {
			t.Fatal(err)
		}
	})
	if got > 0 {
		t.Errorf("%g allocations a step", got)
	}
}

// The least-noise gain follows a drag as well.
func TestDragOfLeastNoise(t *testing.T) {
	var s placement.Solver
	for _, seed := range []uint64{1, 2, 3, 4} {
		const n = 5
		a, c, poles := plant(n, 2, seed, 0.6)
		wn, r := zeros(n, n), general([][]float64{{0.1, 0}, {0, 0.3}})
		weights := make([]float64, n)
		for i := range n {
			wn.Data[i*n+i], weights[i] = 1, 1
		}
		var w placement.Warm
		l, before := zeros(n, 2), zeros(n, 2)
		worst, rise := 0.0, 0.0
		cost := 0.0
		for k := range 201 {
			info, err := s.LeastNoise(l, a, c, wn, r, weights, poles, false, &w)
			if err != nil {
				t.Fatal(err)
			}
			if k > 0 {
				worst = math.Max(worst, distance(l, before)/mat.Norm(wrap(before), 2)/0.002)
				rise = math.Max(rise, math.Abs(info.Cost/cost-1)/0.002)
			}
			before, cost = copyOf(l), info.Cost
			for i, p := range poles { // the pole or pair at the end of the list
				if i >= n-1 || (imag(poles[n-1]) != 0 && i == n-2) {
					poles[i] = p * 1.002
				}
			}
		}
		cold, err := s.LeastNoise(l, a, c, wn, r, weights, poles, false, nil)
		if err != nil {
			t.Fatal(err)
		}
		t.Logf("largest relative jump over relative step: gain %.2f, cost %.2f; at the end %.3f of the cold optimum", worst, rise, cost/cold.Cost)
		if worst > 25 || rise > 25 {
			t.Errorf("seed %d: the gain jumps by %g, the cost by %g times the step", seed, worst, rise)
		}
	}
}

// A drag of all poles at once, equal ones in long chains, keeps the gain continuous.
func TestDragOfEqualPoles(t *testing.T) {
	var s placement.Solver
	for n := 3; n <= 7; n++ {
		a, c, _ := plant(n, 2, uint64(n), 0.6)
		wn, r, weights := zeros(n, n), general([][]float64{{0.1, 0}, {0, 0.3}}), make([]float64, n)
		for i := range n {
			wn.Data[i*n+i], weights[i] = 1, 1
		}
		for _, quiet := range []bool{false, true} {
			if quiet && n > 4 {
				continue // slow
			}
			var w placement.Warm
			l, before := zeros(n, 2), zeros(n, 2)
			worst := 0.0
			count := 100
			if quiet {
				count = 10
			}
			poles := make([]complex128, n)
			for k := range count {
				for i := range poles {
					poles[i] = complex(-2*math.Pow(1.002, float64(k)), 0)
				}
				var err error
				if quiet {
					_, err = s.LeastNoise(l, a, c, wn, r, weights, poles, false, &w)
				} else {
					_, err = s.Robust(l, a, c, poles, &w)
				}
				if err != nil {
					t.Fatal(err)
				}
				if k > 0 {
					worst = math.Max(worst, distance(l, before)/mat.Norm(wrap(before), 2)/0.002)
				}
				before = copyOf(l)
			}
			t.Logf("n = %d, least noise %v: largest relative jump over relative step %.2f", n, quiet, worst)
			if worst > 25 {
				t.Errorf("n = %d, least noise %v: the gain jumps by %g times the step", n, quiet, worst)
			}
		}
	}
}
