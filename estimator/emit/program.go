package emit

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
)

// maxSize bounds each of n, m and p: tables grow with the square.
const maxSize = 256

// program is a checked Source: flat row-major tables as the design has them
// (exact) and the limits as the target holds them.
type program struct {
	n, m, p    int
	form       estimator.Form
	arithmetic Arithmetic
	bits       int // fraction bits of signals, Fixed only
	tableBits  int // fraction bits of tables, Fixed only
	period     float64

	a, b, c, d, gain []float64 // gain: L (prediction) or Lf (current)
	k                []float64 // m×n, the controller's gain; nil without
	hasD             bool

	x0, u0, y0 []float64 // operating point
	low, high  []float64 // per sensor, in the target's arithmetic, finite
	wrap       []float64 // per sensor, 0 for none
	hasRange   []bool
	hasWrap    bool

	stateScale, sensorScale []float64
	roles                   []estimator.Role

	prefix                  string // of every identifier and file name
	states, inputs, sensors []named

	src      *Source
	cautions []string
}

// named is a signal with its identifier.
type named struct {
	id   string // unique within its kind, lower case, without class prefix
	name string // as the user wrote it
	unit string
}

// limit is the size beyond which a value counts as faulty, far from overflow.
func (p *program) limit() float64 {
	switch p.arithmetic {
	case Float:
		return float64(float32(1e30))
	case Fixed:
		return math.Ldexp(math.MaxInt32, -p.bits)
	}
	return 1e300
}

// limitText is the limit as a comment shows it.
func (p *program) limitText() string {
	switch p.arithmetic {
	case Float:
		return "1e30"
	case Fixed:
		return "2147483647"
	}
	return "1e300"
}

// round returns a signal's value as the target's arithmetic holds it.
func (p *program) round(v float64) float64 {
	switch p.arithmetic {
	case Float:
		return float64(float32(v))
	case Fixed:
		return roundTo(v, p.bits)
	}
	return v
}

// coefficient is round for an entry of a table.
func (p *program) coefficient(v float64) float64 {
	if p.arithmetic == Fixed {
		return roundTo(v, p.tableBits)
	}
	return p.round(v)
}

func newProgram(src *Source, arithmetic Arithmetic) (*program, error) {
	if arithmetic > Fixed {
		return nil, fmt.Errorf("%w: arithmetic %d", ErrTarget, arithmetic)
	}
	if arithmetic == Fixed && (src.FractionBits < 1 || src.FractionBits > 30) {
		return nil, fmt.Errorf("%w: %d fraction bits; 1 to 30", ErrValue, src.FractionBits)
	}
	m := src.Model
	if m == nil {
		return nil, fmt.Errorf("no model: %w", estimator.ErrShape)
	}
	if !(m.Period > 0) || math.IsInf(m.Period, 0) {
		return nil, fmt.Errorf("%w: the model has no sample period; give the plant a period_s", ErrContinuous)
	}
	if src.Form > estimator.Current {
		return nil, fmt.Errorf("%w: form %d", ErrTarget, src.Form)
	}
	p := &program{src: src, form: src.Form, arithmetic: arithmetic, bits: src.FractionBits, period: m.Period}
	if err := p.takeMatrices(m); err != nil {
		return nil, err
	}
	if err := p.takeSignals(m); err != nil {
		return nil, err
	}
	if err := p.checkFit(); err != nil {
		return nil, err
	}
	if arithmetic == Fixed {
		if err := p.chooseTableBits(); err != nil {
			return nil, err
		}
	}
	p.prefix = prefixOf(src.Plant, src.Candidate)
	p.cautions = cautionsOf(p)
	return p, nil
}

// takeMatrices copies the model's and the gain's tables and checks their shapes.
func (p *program) takeMatrices(m *estimator.Model) (err error) {
	if m.A == nil || m.A.IsEmpty() || m.C == nil || m.C.IsEmpty() {
		return fmt.Errorf("A or C is missing: %w", estimator.ErrShape)
	}
	p.n, _ = m.A.Dims()
	p.p, _ = m.C.Dims()
	if m.B != nil && !m.B.IsEmpty() {
		_, p.m = m.B.Dims()
	}
	if p.n > maxSize || p.m > maxSize || p.p > maxSize {
		return fmt.Errorf("%w: more than %d states, inputs or sensors", ErrValue, maxSize)
	}
	gain, gainName := gainOf(p.src)
	if gain == nil {
		return fmt.Errorf("%s is missing: %w", gainName, estimator.ErrShape)
	}
	for _, t := range []struct {
		name       string
		from       *mat.Dense
		rows, cols int
		to         *[]float64
	}{
		{"A", m.A, p.n, p.n, &p.a}, {"B", m.B, p.n, p.m, &p.b},
		{"C", m.C, p.p, p.n, &p.c}, {"D", m.D, p.p, p.m, &p.d},
		{gainName, gain, p.n, p.p, &p.gain}, {"K", m.K, p.m, p.n, &p.k},
	} {
		if *t.to, err = flat(t.name, t.from, t.rows, t.cols); err != nil {
			return err
		}
	}
	if m.K == nil || m.K.IsEmpty() {
		p.k = nil
	}
	for _, v := range p.d {
		p.hasD = p.hasD || v != 0
	}
	if m.Roles != nil && len(m.Roles) != p.n {
		return fmt.Errorf("%d roles for %d states: %w", len(m.Roles), p.n, estimator.ErrShape)
	}
	p.roles = m.Roles
	return nil
}

// gainOf returns the gain that the form uses and its name.
func gainOf(s *Source) (*mat.Dense, string) {
	if s.Form == estimator.Current {
		return s.Lf, "Lf"
	}
	return s.L, "L"
}

// flat copies a matrix row by row; nil or empty is zero.
func flat(name string, from *mat.Dense, rows, cols int) ([]float64, error) {
	to := make([]float64, rows*cols)
	if from == nil || from.IsEmpty() {
		return to, nil
	}
	if r, c := from.Dims(); r != rows || c != cols {
		return nil, fmt.Errorf("%s is %d x %d where %d x %d is needed: %w", name, r, c, rows, cols, estimator.ErrShape)
	}
	for i := range rows {
		for j := range cols {
			v := from.At(i, j)
			if math.IsNaN(v) || math.IsInf(v, 0) {
				return nil, fmt.Errorf("%s row %d column %d: %w", name, i+1, j+1, estimator.ErrNotFinite)
			}
			to[i*cols+j] = v
		}
	}
	return to, nil
}

// takeSignals names the signals and takes their operating points and ranges.
func (p *program) takeSignals(m *estimator.Model) (err error) {
	for _, t := range []struct {
		kind   string
		given  []Signal
		names  []string
		letter string
		count  int
		to     *[]named
		offset *[]float64
	}{
		{"state", p.src.States, m.StateNames, "x", p.n, &p.states, &p.x0},
		{"input", p.src.Inputs, m.InputNames, "u", p.m, &p.inputs, &p.u0},
		{"sensor", p.src.Sensors, m.SensorNames, "y", p.p, &p.sensors, &p.y0},
	} {
		if t.given != nil && len(t.given) != t.count {
			return fmt.Errorf("%d %ss described where the model has %d: %w", len(t.given), t.kind, t.count, estimator.ErrShape)
		}
		if t.names != nil && len(t.names) != t.count {
			return fmt.Errorf("%d %s names where the model has %d: %w", len(t.names), t.kind, t.count, estimator.ErrShape)
		}
		*t.to = make([]named, t.count)
		*t.offset = make([]float64, t.count)
		for i := range *t.to {
			var s Signal
			if t.given != nil {
				s = t.given[i]
			}
			if s.Name == "" && t.names != nil {
				s.Name = t.names[i]
			}
			if s.Name == "" {
				s.Name = fmt.Sprintf("%s%d", t.letter, i+1)
			}
			if math.IsNaN(s.Offset) || math.IsInf(s.Offset, 0) {
				return fmt.Errorf("operating point of %s %d: %w", t.kind, i+1, estimator.ErrNotFinite)
			}
			(*t.to)[i] = named{name: s.Name, unit: s.Unit}
			(*t.offset)[i] = s.Offset
		}
		giveIDs(*t.to, t.kind)
	}
	if p.stateScale, err = scales("state", m.StateScale, p.n); err != nil {
		return err
	}
	if p.sensorScale, err = scales("sensor", m.SensorScale, p.p); err != nil {
		return err
	}
	return p.takeRanges()
}

func (p *program) takeRanges() error {
	p.low, p.high = make([]float64, p.p), make([]float64, p.p)
	p.wrap, p.hasRange = make([]float64, p.p), make([]bool, p.p)
	for i := range p.p {
		p.low[i], p.high[i] = -p.limit(), p.limit()
		if p.src.Sensors == nil {
			continue
		}
		s := p.src.Sensors[i]
		if s.Wrap < 0 || math.IsNaN(s.Wrap) || math.IsInf(s.Wrap, 0) {
			return fmt.Errorf("%w: wrap of sensor %d must be finite and not negative", ErrValue, i+1)
		}
		if p.round(s.Wrap) == 0 && s.Wrap != 0 {
			return fmt.Errorf("%w: wrap %g of sensor %d is zero in this arithmetic", ErrValue, s.Wrap, i+1)
		}
		p.wrap[i] = s.Wrap
		p.hasWrap = p.hasWrap || s.Wrap > 0
		if len(s.Range) == 0 {
			continue
		}
		if len(s.Range) != 2 || !(s.Range[0] < s.Range[1]) || math.IsInf(s.Range[0], 0) || math.IsInf(s.Range[1], 0) {
			return fmt.Errorf("%w: range of sensor %d must be a lower and a higher finite number", ErrValue, i+1)
		}
		p.low[i] = max(p.low[i], p.round(s.Range[0]))
		p.high[i] = min(p.high[i], p.round(s.Range[1]))
		p.hasRange[i] = true
	}
	return nil
}

func scales(kind string, given []float64, count int) ([]float64, error) {
	s := make([]float64, count)
	if given != nil && len(given) != count {
		return nil, fmt.Errorf("%d %s scales where the model has %d: %w", len(given), kind, count, estimator.ErrShape)
	}
	for i := range s {
		s[i] = 1
		if given != nil {
			s[i] = given[i]
		}
		if !(s[i] > 0) || math.IsInf(s[i], 0) {
			return nil, fmt.Errorf("%w: scale of %s %d must be above zero", ErrValue, kind, i+1)
		}
	}
	return s, nil
}

// checkFit refuses numbers that the code's arithmetic cannot hold.
func (p *program) checkFit() error {
	for _, t := range []struct {
		name string
		v    []float64
	}{
		{"A", p.a}, {"B", p.b}, {"C", p.c}, {"D", p.d}, {"gain", p.gain},
		{"operating point of states", p.x0}, {"operating point of inputs", p.u0},
		{"operating point of sensors", p.y0}, {"wrap", p.wrap},
	} {
		for _, v := range t.v {
			isTable := len(t.name) == 1 || t.name == "gain"
			if math.Abs(v) > p.limit() && !(isTable && p.arithmetic == Fixed) {
				return fmt.Errorf("%w: %s holds %g, beyond the %g that this arithmetic allows", ErrValue, t.name, v, p.limit())
			}
		}
	}
	return nil
}
