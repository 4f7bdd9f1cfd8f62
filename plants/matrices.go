package plants

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// matrices checks the shapes, which follow from A (n×n), C (p×n) and B (n×m).
func (r *reader) matrices() *Error {
	raw := r.raw.Model
	for _, needed := range []struct {
		name string
		have [][]entry
	}{{"A", raw.A}, {"C", raw.C}} {
		if len(needed.have) == 0 || len(needed.have[0]) == 0 {
			return &Error{Where: "model, " + needed.name, Wrong: "missing or empty", Expected: "expected a list of rows"}
		}
	}
	r.n, r.p = len(raw.A), len(raw.C)
	if r.n > maxStates {
		return tooMany("model, A", r.n, maxStates)
	}
	if r.p > maxSignals {
		return tooMany("model, C", r.p, maxSignals)
	}
	if len(raw.B) > 0 {
		r.m = len(raw.B[0])
	}
	if r.m > maxSignals {
		return tooMany("model, B", r.m, maxSignals)
	}
	states := count(r.n, "state")
	q := r.n
	if len(raw.G) > 0 {
		if q = len(raw.G[0]); q > maxStates {
			return tooMany("model, G", q, maxStates)
		} else if q == 0 {
			return &Error{Where: "model, G", Wrong: "no columns", Expected: "expected one per process noise, or no G"}
		}
	}
	for _, s := range []struct {
		name       string
		have       [][]entry
		into       *[][]entry
		rows, cols int
		because    string
	}{
		{"A", raw.A, &r.plant.a, r.n, r.n, "square"},
		{"B", raw.B, &r.plant.b, r.n, r.m, states},
		{"C", raw.C, &r.plant.c, r.p, r.n, states},
		{"D", raw.D, &r.plant.d, r.p, r.m, count(r.p, "sensor") + ", " + count(r.m, "input")},
		{"G", raw.G, &r.plant.g, r.n, q, states},
	} {
		if s.have == nil {
			continue
		}
		if bad := r.matrix("model, "+s.name, s.have, s.rows, s.cols, s.because); bad != nil {
			return bad
		}
		if s.rows > 0 && s.cols > 0 {
			*s.into = s.have
		}
	}
	return nil
}

// matrix checks the shape of a matrix and the arithmetic of its entries.
func (r *reader) matrix(at string, m [][]entry, rows, cols int, because string) *Error {
	expected := fmt.Sprintf("expected %d×%d (%s)", rows, cols, because)
	if len(m) != rows || len(m) > 0 && len(m[0]) != cols {
		width := 0
		if len(m) > 0 {
			width = len(m[0])
		}
		return &Error{Where: at, Wrong: fmt.Sprintf("%d×%d", len(m), width), Expected: expected}
	}
	for i := range m {
		if len(m[i]) != cols {
			return &Error{Where: fmt.Sprintf("%s, row %d", at, i+1), Wrong: count(len(m[i]), "entry"), Expected: expected}
		}
		for j := range m[i] {
			if bad := r.arithmetic(fmt.Sprintf("%s, row %d, column %d", at, i+1, j+1), &m[i][j]); bad != nil {
				return bad
			}
		}
	}
	return nil
}

func (r *reader) arithmetic(at string, e *entry) *Error {
	if e.text == "" {
		return nil
	}
	parsed, wrong, expected := parseArithmetic(e.text, r.known)
	if wrong != "" {
		return &Error{Where: at, Wrong: wrong, Expected: expected}
	}
	e.parsed = parsed
	return nil
}

// nominal evaluates a matrix at the file's own parameters.
func (r *reader) nominal(at string, m [][]entry, rows, cols int) (*mat.Dense, *Error) {
	values, bad := r.plant.values(nil)
	if bad != nil {
		return nil, bad
	}
	return evaluate(at, m, rows, cols, values)
}

// evaluable makes sure that every matrix has finite entries at the file's own
// parameters.
func (r *reader) evaluable() *Error {
	p := r.plant
	for _, s := range []struct {
		name       string
		have       [][]entry
		rows, cols int
	}{
		{"model, A", p.a, r.n, r.n}, {"model, B", p.b, r.n, r.m}, {"model, C", p.c, r.p, r.n},
		{"model, D", p.d, r.p, r.m}, {"model, G", p.g, r.n, p.process.SymmetricDim()},
	} {
		if s.have == nil {
			continue
		}
		if _, bad := r.nominal(s.name, s.have, s.rows, s.cols); bad != nil {
			return bad
		}
	}
	return nil
}

// evaluate computes a matrix of entries at the given parameters; at is its place
// in the file.
func evaluate(at string, entries [][]entry, rows, cols int, values map[string]float64) (*mat.Dense, *Error) {
	m := mat.NewDense(rows, cols, nil)
	for i, row := range entries {
		for j, e := range row {
			v := e.number
			if e.text != "" {
				v = e.parsed.eval(values)
			}
			if math.IsNaN(v) || math.IsInf(v, 0) {
				return nil, &Error{Where: fmt.Sprintf("%s, row %d, column %d", at, i+1, j+1), Wrong: fmt.Sprintf("%s is %g", quoted(e.text), v), Expected: "expected a finite number"}
			}
			m.Set(i, j, v)
		}
	}
	return m, nil
}
