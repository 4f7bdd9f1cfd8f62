package emit_test

import (
	"fmt"
	"math"
)

// stInstance is the memory of one unit. Every number is a float64; results are
// rounded to single precision where the unit computes in REAL.
type stInstance struct {
	unit   *stUnit
	values [][]float64
	inside map[string]*stInstance
	single bool
	cutOff bool // conversions to DINT cut off instead of rounding
}

func newInstance(unit *stUnit, blocks map[string]*stUnit, cutOff bool) *stInstance {
	s := &stInstance{unit: unit, inside: map[string]*stInstance{}, cutOff: cutOff}
	for _, v := range unit.variables {
		if b := blocks[v.kind]; b != nil {
			s.inside[v.name] = newInstance(b, blocks, cutOff)
		}
		s.single = s.single || v.kind == "REAL"
		value := make([]float64, max(1, v.length))
		copy(value, v.initial)
		s.values = append(s.values, value)
	}
	return s
}

func (s *stInstance) value(name string) float64 { return s.values[s.unit.index[name]][0] }

func (s *stInstance) run() { s.list(s.unit.body) }

func (s *stInstance) list(body []*stNode) {
	for _, n := range body {
		s.do(n)
	}
}

func (s *stInstance) do(n *stNode) {
	switch n.op {
	case ":=":
		*s.place(n.parts[0]) = s.eval(n.parts[1])
	case "IF":
		if s.eval(n.parts[0]) != 0 {
			s.list(n.parts[1].parts)
		} else if len(n.parts) > 2 {
			s.list(n.parts[2].parts)
		}
	case "FOR":
		at := s.place(n.parts[0])
		for *at = s.eval(n.parts[1]); *at <= s.eval(n.parts[2]); *at++ {
			s.list(n.parts[3].parts)
		}
	case "call":
		block := s.inside[n.name]
		for _, a := range n.parts {
			block.values[block.unit.index[a.op]][0] = s.eval(a.parts[0])
		}
		block.run()
	default:
		panic("statement " + n.op)
	}
}

func (s *stInstance) place(n *stNode) *float64 {
	v := s.values[s.unit.index[n.name]]
	if n.op == "name" {
		return &v[0]
	}
	i := s.eval(n.parts[0])
	if i != math.Trunc(i) || i < 0 || int(i) >= len(v) {
		panic(fmt.Sprintf("%s[%g] of %d", n.name, i, len(v)))
	}
	return &v[int(i)]
}

func (s *stInstance) eval(n *stNode) float64 {
	switch n.op {
	case "number":
		return n.value
	case "name", "index":
		return *s.place(n)
	case "output":
		return s.inside[n.name].value(n.parts[0].name)
	case "un-":
		return -s.eval(n.parts[0])
	case "unNOT":
		return 1 - s.eval(n.parts[0])
	case "ABS":
		return math.Abs(s.eval(n.parts[0]))
	case "LREAL_TO_DINT", "REAL_TO_DINT":
		x := s.eval(n.parts[0])
		if math.Abs(x) > math.MaxInt32 {
			panic("DINT overflow")
		}
		if s.cutOff {
			return math.Trunc(x)
		}
		return math.RoundToEven(x)
	case "DINT_TO_LREAL", "DINT_TO_REAL":
		return s.rounded(s.eval(n.parts[0]))
	}
	return s.binary(n.op, s.eval(n.parts[0]), s.eval(n.parts[1]))
}

func (s *stInstance) binary(op string, a, b float64) float64 {
	switch op {
	case "+":
		return s.rounded(a + b)
	case "-":
		return s.rounded(a - b)
	case "*":
		return s.rounded(a * b)
	case "/":
		return s.rounded(a / b)
	}
	var r bool
	switch op {
	case "=":
		r = a == b
	case "<>":
		r = a != b
	case "<":
		r = a < b
	case ">":
		r = a > b
	case "<=":
		r = a <= b
	case ">=":
		r = a >= b
	case "AND":
		r = a != 0 && b != 0
	case "OR":
		r = a != 0 || b != 0
	default:
		panic("operator " + op)
	}
	if r {
		return 1
	}
	return 0
}

func (s *stInstance) rounded(x float64) float64 {
	if s.single {
		return float64(float32(x))
	}
	return x
}
