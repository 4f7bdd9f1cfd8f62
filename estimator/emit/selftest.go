package emit

import (
	"fmt"
	"math"
	"math/rand/v2"
	"strconv"
)

// selfTest is a short run with its expected estimates: inputs, samples with
// losses, values that must be rejected, and wraps.
type selfTest struct {
	steps    int
	u, y     [][]float64 // NaN where the code under test must make one
	missing  [][]bool
	expected [][]float64
	used     [][]bool
	// tolerance per state, absolute: the bound on the target's rounding plus
	// that of the expected values.
	tolerance []float64
}

// shortSteps is the length of a self-test of a small design.
const shortSteps = 32

// testSeed makes every self-test the same run.
const testSeed = 0x9e3779b97f4a7c15

func newSelfTest(p *program) (*selfTest, error) {
	steps := shortSteps
	if p.n > 12 {
		steps = 12
	}
	if p.n > 60 {
		steps = 6
	}
	return runSelfTest(p, steps, steps)
}

// runSelfTest makes a run of any length, with the bound on rounding followed
// over its first samples. The samples are chosen so that every
// innovation is a moderate, known amount; then no decision (range, wrap) hangs
// on rounding.
func runSelfTest(p *program, steps, follow int) (*selfTest, error) {
	t := &selfTest{steps: steps, tolerance: make([]float64, p.n)}
	rng := rand.New(rand.NewPCG(testSeed, uint64(p.n)))
	r, b := newRunner(p), newBound(p)
	if steps <= shortSteps {
		b.most = steps
	}
	amplitude := p.inputSizes()
	x := make([]float64, p.n)
	for k := range steps {
		u := make([]float64, p.m)
		for j := range u {
			u[j] = p.short(p.u0[j] + amplitude[j]*(2*rng.Float64()-1))
		}
		if k%11 == 9 && p.m > 0 {
			u[k%p.m] = math.NaN()
		}
		r.takeInput(u)
		y, missing := t.samples(r, rng, k)
		copy(x, r.x)
		r.step(u, y, missing)
		if k < follow {
			b.step(r, x)
			if err := b.wrapsAreSure(); err != nil {
				return nil, err
			}
		}
		t.u, t.y, t.missing = append(t.u, u), append(t.y, y), append(t.missing, missing)
		t.used = append(t.used, append([]bool(nil), r.used...))
		t.expected = append(t.expected, append([]float64(nil), r.estimate...))
		for i := range t.tolerance {
			t.tolerance[i] = max(t.tolerance[i], t.allowed(r, b, i))
			if !(math.Abs(r.estimate[i]) < p.limit()) || !(t.tolerance[i] < p.limit()) {
				return nil, fmt.Errorf("%w: state %d leaves the range of the arithmetic within %d samples", ErrValue, i+1, k+1)
			}
		}
		if r.fault {
			return nil, fmt.Errorf("%w: a state leaves the range of the arithmetic within %d samples", ErrValue, k+1)
		}
	}
	return t, nil
}

// allowed is how far the target may be from the expected value of state i: its
// own rounding, that of the expected value here (in double precision the same
// bound, beside single precision less than a millionth of it), and that of
// printing the expected value and of the comparison.
func (t *selfTest) allowed(r *runner, b *bound, i int) float64 {
	reference := 1.0
	if r.p.arithmetic == Float {
		reference = 1e-6
	}
	// in fixed point the reference rounds far less than 2b.half
	return (1+reference)*b.out[i] + 2*b.unit*math.Abs(r.estimate[i]) + 2*b.half
}

// wrapsAreSure fails where rounding could decide the whole wraps of a sample
// that undecided has let pass.
func (b *bound) wrapsAreSure() error {
	for s, w := range b.p.wrap {
		if w > 0 && b.off[s] > 0.02*w {
			return fmt.Errorf("%w: rounding moves the innovation of sensor %d by up to %.2g of its wrap", ErrValue, s+1, b.off[s]/w)
		}
	}
	return nil
}

// samples chooses this step's samples; r holds the state and the input.
func (t *selfTest) samples(r *runner, rng *rand.Rand, k int) (y []float64, missing []bool) {
	p := r.p
	y, missing = make([]float64, p.p), make([]bool, p.p)
	for s := range y {
		size := 0.2 * p.sensorScale[s]
		if p.wrap[s] > 0 {
			size = min(size, p.wrap[s]/4)
		}
		v := p.y0[s] + dot(row(p.c, s, p.n), r.x) + dot(row(p.d, s, p.m), r.du) + size*(2*rng.Float64()-1)
		if p.wrap[s] > 0 {
			v += p.wrap[s] * float64(rng.IntN(3)-1)
		}
		if p.hasRange[s] {
			inner := 0.01 * (p.high[s] - p.low[s])
			v = min(max(v, p.low[s]+inner), p.high[s]-inner)
		}
		lost := rng.Float64() < 0.12
		if !(math.Abs(v) <= p.limit()) { // no such sample exists
			v, lost = p.y0[s], true
		}
		y[s] = p.short(v)
		missing[s] = lost || t.undecided(r, s, y[s])
	}
	if s := k % p.p; k%7 == 5 {
		y[s], missing[s] = math.NaN(), false
	} else if k%7 == 3 {
		y[s], missing[s] = p.outside(s), false
	}
	return y, missing
}

// undecided tells whether rounding could decide a sample's whole wraps.
func (t *selfTest) undecided(r *runner, s int, y float64) bool {
	p := r.p
	if p.wrap[s] == 0 {
		return false
	}
	e := y - p.y0[s] - dot(row(p.c, s, p.n), r.x) - dot(row(p.d, s, p.m), r.du)
	q := e / p.wrap[s]
	return math.Abs(q-math.Floor(q)-0.5) < 0.02
}

// outside returns a finite sample that must be rejected.
func (p *program) outside(s int) float64 {
	if p.hasRange[s] {
		if v := p.short(2*p.high[s] - p.low[s]); v > p.high[s] && v < p.limit() {
			return v
		}
	}
	return p.beyond()
}

// beyond is a finite value past the limit of the arithmetic.
func (p *program) beyond() float64 {
	if p.arithmetic == Fixed {
		return math.Ldexp(math.MinInt32, -p.bits)
	}
	return p.round(4 * p.limit())
}

// inputSizes chooses how far each input swings: a fifth of what moves the most
// responsive state by its scale in one step.
func (p *program) inputSizes() []float64 {
	sizes := make([]float64, p.m)
	for j := range sizes {
		least := math.Inf(1)
		for i := range p.n {
			if v := math.Abs(p.b[i*p.m+j]); v > 0 {
				least = min(least, p.stateScale[i]/v)
			}
		}
		if !(least < 1e12) {
			least = 1
		}
		sizes[j] = 0.2 * least
	}
	return sizes
}

// short rounds to seven digits, then to the arithmetic, so that every target
// reads the same number.
func (p *program) short(v float64) float64 {
	f, err := strconv.ParseFloat(strconv.FormatFloat(v, 'e', 6, 64), 64)
	if err != nil {
		f = v
	}
	if p.arithmetic == Fixed {
		f = min(max(f, -p.limit()), p.limit())
	}
	return p.round(f)
}
