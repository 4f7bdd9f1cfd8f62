package logs

import (
	"math"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
)

// Result is what a replay comes to; its JSON is part of `replay --json`. A figure
// that is not defined is null there, and Warnings says why. Lists per sensor are in
// the order of the design model's sensors.
type Result struct {
	Samples int64 `json:"samples"`
	// Counted is how many samples are in the statistics.
	Counted int64   `json:"counted"`
	Missing int64   `json:"missing_rows"`
	Held    int64   `json:"held_inputs"`
	Lost    []int64 `json:"lost"`
	Period  Number  `json:"period_s"`
	Jitter  Number  `json:"period_jitter"`

	Resampled   bool         `json:"resampled"`
	Innovations []Innovation `json:"innovations"`
	// Whiteness is of the floor gain's innovations; empty without a floor.
	Whiteness []Whiteness `json:"whiteness"`

	NISMean Number `json:"nis_mean"`
	NISLow  Number `json:"nis_low"`
	NISHigh Number `json:"nis_high"`

	References []Comparison `json:"reference"`
	Warnings   []string     `json:"warnings"`

	// What NoiseFigures works on.
	model   *estimator.Model
	gain    *mat.Dense
	moments []moments
}

// Innovation is one sensor's innovations of the gain, beside what this gain should
// give. Low and high enclose 95 of 100 logs of a true model.
type Innovation struct {
	Name string `json:"name"`
	Unit string `json:"unit"`

	Mean     Number `json:"mean"`
	MeanLow  Number `json:"mean_low"`
	MeanHigh Number `json:"mean_high"`

	Std         Number `json:"std"` // about the mean, over the count
	StdExpected Number `json:"std_expected"`
	StdLow      Number `json:"std_low"`
	StdHigh     Number `json:"std_high"`

	// Autocorrelation at lags 1 to 20, the mean removed.
	Autocorrelation         []Number `json:"autocorrelation"`
	AutocorrelationExpected []Number `json:"autocorrelation_expected"`
	AutocorrelationLow      []Number `json:"autocorrelation_low"`
	AutocorrelationHigh     []Number `json:"autocorrelation_high"`
}

// Whiteness is the test of Ljung & Box 1978 on one sensor's innovations of the
// floor gain. P is how often a true model gives a larger Q. In a long log it rejects
// trifles: EffectSize is the largest |autocorrelation|.
type Whiteness struct {
	Name       string `json:"name"`
	Lags       int    `json:"lags"`
	Q          Number `json:"q"`
	P          Number `json:"p"`
	EffectSize Number `json:"effect_size"`
}

// Comparison is estimate − reference of one state or output.
type Comparison struct {
	Name  string `json:"name"`
	Unit  string `json:"unit"`
	Count int64  `json:"count"`
	RMS   Number `json:"rms"`
	Bias  Number `json:"bias"` // mean of estimate − reference
}

func (r *run) result() *Result {
	v := r.survey
	out := &Result{
		Samples: r.clock.index, Missing: v.Missing, Held: v.Held, Lost: append([]int64{}, v.Lost...),
		Period: Number(v.Period), Jitter: Number(v.Jitter), Resampled: v.Resampled,
		NISMean: Number(math.NaN()), NISLow: Number(math.NaN()), NISHigh: Number(math.NaN()),
		Whiteness: []Whiteness{}, References: []Comparison{}, Warnings: []string{},
		model: r.q.Model, gain: r.q.Gain.L,
	}
	for i := range r.main.sensors {
		m := r.main.sensors[i].finish()
		out.Counted = m.count
		out.moments = append(out.moments, m)
		out.Innovations = append(out.Innovations, r.innovation(i, &m))
	}
	if r.promise != nil && r.promise.root != nil && out.Counted > 0 {
		band := r.promise.nisBand(float64(out.Counted))
		out.NISMean = Number(r.nis.value() / float64(out.Counted))
		out.NISLow, out.NISHigh = Number(band.Low), Number(band.High)
	}
	if r.floor != nil {
		for i := range r.floor.sensors {
			m := r.floor.sensors[i].finish()
			out.Whiteness = append(out.Whiteness, whiteness(r.layout.Sensors[i].Name, &m))
		}
	}
	for k := range r.references {
		c, ref := &r.references[k], v.References[k]
		n := float64(c.count) // none gives 0/0, which is undefined indeed
		out.References = append(out.References, Comparison{
			Name: ref.Name, Unit: ref.Unit, Count: c.count,
			RMS: Number(math.Sqrt(c.squares.value() / n)), Bias: Number(c.bias.value() / n),
		})
	}
	r.warn(out)
	return out
}

func (r *run) innovation(i int, m *moments) Innovation {
	s := r.layout.Sensors[i]
	out := Innovation{
		Name: s.Name, Unit: s.Unit, Mean: Number(m.mean), Std: Number(math.Sqrt(m.variance)),
		Autocorrelation: numbers(m.autocorrelation()),
	}
	std, rho, n := math.NaN(), []float64(nil), float64(m.count)
	if r.promise != nil {
		std, rho = math.Sqrt(r.promise.s.At(i, i)), r.promise.correlation(i)
	}
	out.StdExpected = Number(std)
	mean, spread := noBand, noBand
	if rho != nil {
		mean, spread = meanBand(std, rho, n), stdBand(std, rho, n)
	}
	out.MeanLow, out.MeanHigh = Number(mean.Low), Number(mean.High)
	out.StdLow, out.StdHigh = Number(spread.Low), Number(spread.High)
	for j := 1; j <= lags; j++ {
		expected, band := math.NaN(), noBand
		if rho != nil {
			expected, band = 0, correlationBand(rho, j, n)
			if j < len(rho) {
				expected = rho[j]
			}
		}
		out.AutocorrelationExpected = append(out.AutocorrelationExpected, Number(expected))
		out.AutocorrelationLow = append(out.AutocorrelationLow, Number(band.Low))
		out.AutocorrelationHigh = append(out.AutocorrelationHigh, Number(band.High))
	}
	return out
}

func whiteness(name string, m *moments) Whiteness {
	q, p := ljungBox(m)
	largest := 0.0
	for _, v := range m.autocorrelation() {
		largest = math.Max(largest, math.Abs(v)) // Max keeps a NaN
	}
	return Whiteness{Name: name, Lags: lags, Q: Number(q), P: Number(p), EffectSize: Number(largest)}
}

func (r *run) warn(out *Result) {
	say := func(s string) { out.Warnings = append(out.Warnings, s) }
	if r.promise == nil {
		say("The estimator is not stable: there is nothing to hold its innovations against.")
	} else if r.promise.root == nil {
		say("The expected covariance of the innovations is singular: the normalised innovation squared is not defined.")
	}
	if r.floor == nil {
		say("Without a best linear estimator there is no test for whiteness.")
	}
	switch {
	case out.Counted == 0:
		say("No sample is left for the statistics: all are in the skipped start or too soon after a loss.")
	case out.Counted < 10*lags:
		say("Few samples are left for the statistics: their bands are rough.")
	}
	if out.Jitter > 0.1 {
		say("The log's period jitters by more than a tenth: the model counts on even samples.")
	}
	for i, s := range r.layout.Sensors {
		if r.q.Model.R.At(i, i) == 0 {
			say("The model has no noise on the sensor " + s.Name + ".")
		}
	}
}
