package emit

import (
	"fmt"
	"math"
	"math/cmplx"
	"strings"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
)

// cautionsOf returns the sentences that every emitted file carries: the general
// ones, what this design's stability says, then the caller's.
func cautionsOf(p *program) []string {
	list := []string{
		"Try it first at low energy, with independent limits and stops that do not depend on the estimate.",
		"Feed it the input that is really applied, after saturation and rate limits.",
		fmt.Sprintf("Call it once per sample, every %s s; another rate is another estimator.", full(p.period)),
		"Start from the first measurement, or wait out the settle time before a loop is closed on the estimate.",
		"A sample that is missing, not a number or outside its range is left out and the estimate runs on the model alone; watch the used flags.",
		"An input that is not a number is replaced by its last good value.",
		"Compilers must keep NaN comparisons (no fast-math).",
		"Local codes and licensed practice decide.",
	}
	if p.arithmetic == Float {
		list = append(list, "Single precision: the tolerance of the self-test says how far rounding may move each state.")
	}
	if p.arithmetic == Fixed {
		list = append(list, fmt.Sprintf("Fixed point Q%d.%d: a signal of one unit is %d counts, signals saturate at 2147483647 counts; tables have %d fraction bits. The tolerance of the self-test says how far rounding may move each state.", 31-p.bits, p.bits, 1<<p.bits, p.tableBits))
	}
	if p.hasWrap {
		list = append(list, "An innovation of a wrapping sensor is taken modulo its period; the state itself is not wrapped and loses digits as it grows.")
	}
	list = append(list, p.stabilityCautions()...)
	for _, c := range p.src.Cautions {
		if strings.TrimSpace(c) != "" {
			list = append(list, c)
		}
	}
	return list
}

// stabilityCautions judges F with all sensors and with each one lost.
func (p *program) stabilityCautions() []string {
	var list []string
	radius := p.radius(-1)
	switch {
	case math.IsNaN(radius):
		return []string{"The stability of the estimator could not be computed."}
	case radius >= 1:
		list = append(list, fmt.Sprintf("THE ESTIMATOR IS NOT STABLE: its largest eigenvalue has the size %.6g.", radius))
	}
	if p.p == 1 {
		if r := p.radius(0); !(r < 1) {
			list = append(list, fmt.Sprintf("Without sensor %s the estimate drifts: the model alone is not strictly stable.", p.sensors[0].name))
		}
		return list
	}
	for j := range p.p {
		if r := p.radius(j); !(r < 1) {
			list = append(list, fmt.Sprintf("Losing sensor %s makes the estimator unstable (largest eigenvalue %.6g).", p.sensors[j].name, r))
		}
	}
	return list
}

// radius returns the spectral radius of F with one sensor lost (-1: none); NaN
// where an entry of F is 1e50 or more or the eigenvalue iteration fails.
func (p *program) radius(lost int) float64 {
	used := make([]bool, p.p)
	for j := range used {
		used[j] = j != lost
	}
	f := make([]float64, p.n*p.n)
	p.transition(f, used)
	// gonum's balancing does not end on entries that are not finite or that
	// overflow while it scales them.
	for i, v := range f {
		if !(math.Abs(v) < 1e50) {
			return math.NaN()
		}
		if math.Abs(v) < 1e-100 {
			f[i] = 0
		}
	}
	var eigen mat.Eigen
	if !eigen.Factorize(mat.NewDense(p.n, p.n, f), mat.EigenNone) {
		return math.NaN()
	}
	largest := 0.0
	for _, v := range eigen.Values(nil) {
		largest = max(largest, cmplx.Abs(v))
	}
	return largest
}

// transition writes the error's transition matrix with the sensors in use:
// A − L C in prediction, A (I − Lf C) in current form.
func (p *program) transition(f []float64, used []bool) {
	if p.form == estimator.Prediction {
		p.subtractGain(f, p.a, used)
		return
	}
	n := p.n
	g := make([]float64, n*n)
	p.correction(g, used)
	for i := range n {
		for j := range n {
			sum := 0.0
			for k := range n {
				sum += p.a[i*n+k] * g[k*n+j]
			}
			f[i*n+j] = sum
		}
	}
}

// correction writes I − Lf C with the sensors in use.
func (p *program) correction(g []float64, used []bool) {
	one := make([]float64, p.n*p.n)
	for i := range p.n {
		one[i*p.n+i] = 1
	}
	p.subtractGain(g, one, used)
}

// subtractGain writes base − gain·C with the sensors in use.
func (p *program) subtractGain(to, base []float64, used []bool) {
	for i := range p.n {
		for j := range p.n {
			sum := base[i*p.n+j]
			for s := range p.p {
				if used[s] {
					sum -= p.gain[i*p.p+s] * p.c[s*p.n+j]
				}
			}
			to[i*p.n+j] = sum
		}
	}
}
