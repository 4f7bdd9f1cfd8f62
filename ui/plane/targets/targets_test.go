package targets_test

import (
	"math"
	"math/cmplx"
	"testing"

	"pgregory.net/rapid"

	"polewright/ui/plane/targets"
)

var grid = targets.Grid{Plane: targets.S, X0: -20, DX: 0.5, DY: 1}

func set(t *testing.T, period float64, list ...complex128) targets.Set {
	t.Helper()
	s, err := targets.From(list, period)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

func TestPairMovesAsOne(t *testing.T) {
	s := set(t, 0, -4+3i, -4-3i, -6)
	s, sel, event, err := s.Move(0, -1, 1, grid)
	if err != nil || sel != 0 || event != targets.Moved {
		t.Fatal(sel, event, err)
	}
	want := []complex128{-4.5 + 4i, -4.5 - 4i, -6}
	for i, v := range s.Poles() {
		if v != want[i] {
			t.Errorf("pole %d at %v, expected %v", i, v, want[i])
		}
	}
}

func TestPairPartsOnTheAxisAndJoinsAgain(t *testing.T) {
	s := set(t, 0, -4+1.5i, -4-1.5i)
	s, _, _, _ = s.Move(0, 0, -1, grid)
	s, sel, event, err := s.Move(0, 0, -1, grid) // crosses the axis, stops on it
	if err != nil || event != targets.Parted || s.Count() != 2 || len(s.List) != 2 || s.List[0].At != -4 {
		t.Fatal(s, event, err)
	}
	s, sel, _, _ = s.Move(sel, -3, 0, grid)
	if s.List[0].At != -5.5 || s.List[1].At != -4 {
		t.Fatal(s)
	}
	if _, _, _, err = s.Move(sel, 0, 1, grid); err != targets.ErrAlone {
		t.Fatalf("a lone real pole was lifted: %v", err)
	}
	s, sel, _, _ = s.Move(sel, 3, 0, grid)
	s, sel, event, err = s.Move(sel, 0, 1, grid)
	if err != nil || event != targets.Joined || sel != 0 || len(s.List) != 1 || s.List[0] != (targets.Target{At: -4 + 1i, Pair: true}) {
		t.Fatal(s, sel, event, err)
	}
}

func TestJoinTakesTheMeanOfOneCell(t *testing.T) {
	s := set(t, 0, -3.9, -8, -3.6) // cells are half a unit wide, edges at -4, -3.5
	s, sel, event, err := s.Move(2, 0, 2, grid)
	if err != nil || event != targets.Joined || sel != 1 {
		t.Fatal(s, sel, event, err)
	}
	if got := s.List[1].At; cmplx.Abs(got-(-3.75+2i)) > 1e-12 {
		t.Errorf("joined at %v, expected -3.75+2i", got)
	}
}

func TestSamplingLimit(t *testing.T) {
	const T = 0.1 // limit 31.4 rad/s
	up := cmplx.Exp(complex(-5, 30) * T)
	s := set(t, T, up, cmplx.Conj(up))
	s, sel, event, err := s.Move(0, 0, 5, grid)
	if err != nil || event != targets.PartedAtLimit || len(s.List) != 2 {
		t.Fatal(s, event, err)
	}
	if got, want := s.List[0].At, complex(-math.Exp(-0.5), 0); cmplx.Abs(got-want) > 1e-12 {
		t.Errorf("at the limit z = %v, expected %v", got, want)
	}
	if _, _, _, err := s.Move(sel, 0, 1, grid); err != targets.ErrLimit {
		t.Errorf("moved beyond the limit: %v", err)
	}
	s, _, event, err = s.Move(sel, 0, -2, grid)
	if err != nil || event != targets.Joined {
		t.Fatal(s, event, err)
	}
	p, _ := targets.Shown(s.List[0].At, targets.S, T)
	if want := complex(-5, math.Pi/T-2); cmplx.Abs(p-want) > 1e-9 {
		t.Errorf("left the limit to %v, expected %v", p, want)
	}
}

func TestOriginHasNoPlaceInS(t *testing.T) {
	s := set(t, 0.1, 0, 0.5)
	if _, _, _, err := s.Move(0, 1, 0, grid); err != targets.ErrOrigin {
		t.Error(err)
	}
	z := grid
	z.Plane, z.DX = targets.Z, 0.05
	s, _, _, err := s.Move(0, 2, 0, z)
	if err != nil || s.List[0].At != 0.1 {
		t.Error(s, err)
	}
}

func TestPlace(t *testing.T) {
	three := []complex128{-4 + 3i, -4 - 3i, -6}
	for _, c := range []struct {
		name string
		from []complex128
		i    int
		at   []complex128
		want []complex128
		sel  int
		bad  bool
	}{
		{"real for real", three, 1, []complex128{-7}, []complex128{-4 + 3i, -4 - 3i, -7}, 1, false},
		{"pair for pair", three, 0, []complex128{-1 - 2i, -1 + 2i}, []complex128{-1 + 2i, -1 - 2i, -6}, 0, false},
		{"real for pair", three, 0, []complex128{-7}, nil, 0, true},
		{"pair for the only real", three, 1, []complex128{-1 + 1i, -1 - 1i}, nil, 0, true},
		{"pair for real with another", []complex128{-1, -2, -9}, 2, []complex128{-3 + 1i, -3 - 1i}, []complex128{-1, -3 + 1i, -3 - 1i}, 1, false},
		{"two reals for pair", three, 0, []complex128{-1, -2}, []complex128{-1, -2, -6}, 0, false},
		{"not finite", three, 1, []complex128{complex(math.Inf(1), 0)}, nil, 0, true},
	} {
		t.Run(c.name, func(t *testing.T) {
			s, sel, err := set(t, 0, c.from...).Place(c.i, c.at, targets.S)
			if c.bad {
				if err == nil {
					t.Fatal("accepted", s)
				}
				return
			}
			if err != nil || sel != c.sel {
				t.Fatal(sel, err)
			}
			for i, v := range s.Poles() {
				if v != c.want[i] {
					t.Errorf("pole %d at %v, expected %v", i, v, c.want[i])
				}
			}
		})
	}
}

// Any sequence of edits keeps the number of poles, their conjugates and their
// being finite, and the targets within the sampling limit.
func TestEditsKeepTheSetWhole(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		period := rapid.SampledFrom([]float64{0, 0.01, 1}).Draw(t, "period")
		var list []complex128
		for range rapid.IntRange(0, 3).Draw(t, "pairs") {
			v := complex(rapid.Float64Range(-0.9, 0.9).Draw(t, "re"), rapid.Float64Range(0.01, 0.9).Draw(t, "im"))
			list = append(list, v, cmplx.Conj(v))
		}
		for range rapid.IntRange(1, 4).Draw(t, "reals") {
			list = append(list, complex(rapid.Float64Range(-0.9, 0.9).Draw(t, "real"), 0))
		}
		s, err := targets.From(list, period)
		if err != nil {
			t.Fatal(err)
		}
		sel := 0
		for range rapid.IntRange(1, 60).Draw(t, "steps") {
			g := targets.Grid{Plane: targets.S, X0: -5, DX: rapid.SampledFrom([]float64{0.01, 0.3, 20}).Draw(t, "dx")}
			g.DY = 2 * g.DX
			if period > 0 && rapid.Bool().Draw(t, "z") {
				g.Plane = targets.Z
			}
			switch rapid.IntRange(0, 5).Draw(t, "kind") {
			case 0:
				sel = rapid.IntRange(0, len(s.List)-1).Draw(t, "select")
			case 1:
				s, _ = s.Scale(rapid.Float64Range(0.5, 2).Draw(t, "factor"))
			case 2:
				v := complex(rapid.Float64Range(-3, 3).Draw(t, "x"), rapid.Float64Range(0, 3).Draw(t, "y"))
				at := []complex128{v, cmplx.Conj(v)}
				if imag(v) == 0 || rapid.Bool().Draw(t, "one") {
					at = []complex128{complex(real(v), 0)}
				}
				s, sel, _ = s.Place(sel, at, g.Plane)
			default:
				s, sel, _, _ = s.Move(sel, rapid.IntRange(-5, 5).Draw(t, "mx"), rapid.IntRange(-5, 5).Draw(t, "my"), g)
			}
			if sel < 0 || sel >= len(s.List) {
				t.Fatalf("holds %d of %d", sel, len(s.List))
			}
			if s.Count() != len(list) || len(s.Poles()) != len(list) {
				t.Fatalf("%d poles, expected %d", s.Count(), len(list))
			}
			for _, target := range s.List {
				if cmplx.IsNaN(target.At) || cmplx.IsInf(target.At) || target.Pair != (imag(target.At) > 0) || imag(target.At) < 0 {
					t.Fatalf("target %v", target)
				}
			}
		}
	})
}
