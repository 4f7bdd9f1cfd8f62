package logs

import (
	"math"

	"gonum.org/v1/gonum/stat/distuv"
)

// Quantiles of the normal distribution and of the levels of a 95 % band.
const (
	normal95 = 1.959963984540054 // Φ⁻¹(0.975), scipy.stats.norm.ppf
	lower95  = 0.025
	upper95  = 0.975
)

// Band is where a figure lies in 95 of 100 logs if model and noise figures are
// true.
type Band struct{ Low, High float64 }

var noBand = Band{math.NaN(), math.NaN()}

// chiSquareQuantile is the quantile of chi-square over its degrees of freedom.
// For many degrees it is Wilson and Hilferty's (1931), whose error is then far
// below what a log can show.
func chiSquareQuantile(level, degrees float64) float64 {
	if !(degrees > 0) || math.IsInf(degrees, 0) {
		return math.NaN()
	}
	if degrees < 1e4 {
		return distuv.ChiSquared{K: degrees}.Quantile(level) / degrees
	}
	h := 2 / (9 * degrees)
	c := 1 - h + distuv.UnitNormal.Quantile(level)*math.Sqrt(h)
	return c * c * c
}

// nisBand is the band of the NIS mean over N samples. Its variance is
// (2/N)[p + 2 Σⱼ (1 − j/N) tr(S⁻¹ Γⱼ S⁻¹ Γⱼᵀ)]; the band is that of a chi-square
// scaled to the mean p and this variance (Satterthwaite 1946). At the floor gain
// that is exactly chi-square with N p degrees of freedom, over N.
func (pr *promise) nisBand(samples float64) Band {
	if pr == nil || pr.root == nil || samples < 1 {
		return noBand
	}
	p := float64(pr.p)
	variance := 2 / samples * (p + 2*pr.whitened(samples))
	degrees := 2 * p * p / variance
	return Band{p * chiSquareQuantile(lower95, degrees), p * chiSquareQuantile(upper95, degrees)}
}

// meanBand is for the mean over N samples of a signal with standard deviation std
// and correlation rho (lags 0..).
func meanBand(std float64, rho []float64, samples float64) Band {
	if samples < 1 {
		return noBand
	}
	sum := 1.0
	for j := 1; j < len(rho) && float64(j) < samples; j++ {
		sum += 2 * (1 - float64(j)/samples) * rho[j]
	}
	w := normal95 * std * math.Sqrt(math.Max(sum, 0)/samples)
	return Band{-w, w}
}

// stdBand is for the standard deviation over N samples: the variance's own
// variance is 2σ⁴/N Σ (1 − |j|/N) ρⱼ².
func stdBand(std float64, rho []float64, samples float64) Band {
	if samples < 2 {
		return noBand
	}
	sum := 1.0
	for j := 1; j < len(rho) && float64(j) < samples; j++ {
		sum += 2 * (1 - float64(j)/samples) * rho[j] * rho[j]
	}
	degrees := samples / sum
	return Band{std * math.Sqrt(chiSquareQuantile(lower95, degrees)), std * math.Sqrt(chiSquareQuantile(upper95, degrees))}
}

// correlationBand is for the autocorrelation at lag j ≥ 1 over N samples with the
// mean removed. Its variance is by Bartlett's formula (1946),
// (1/N) Σ_{m ≥ 1} (ρ_{m+j} + ρ_{m−j} − 2 ρⱼ ρₘ)². Its centre is ρⱼ but for what a
// slow estimator makes felt, of order 1/N: the removed mean, fewer pairs, and the
// quotient of two random figures (Marriott & Pope 1954).
func correlationBand(rho []float64, j int, samples float64) Band {
	if samples <= float64(j) {
		return noBand
	}
	at := func(k int) float64 {
		if k = max(k, -k); k < len(rho) {
			return rho[k]
		}
		return 0
	}
	here := at(j)
	variance, mean, own, cross := 0.0, 0.0, 0.0, 0.0
	for m := 1 - len(rho) - j; m < len(rho)+j; m++ {
		if m > 0 {
			d := at(m+j) + at(m-j) - 2*here*at(m)
			variance += d * d / samples
		}
		mean += math.Max(0, 1-math.Abs(float64(m))/samples) * at(m) / samples
		own += 2 * at(m) * at(m) / samples
		cross += 2 * at(m) * at(m+j) / samples
	}
	centre := here
	if mean < 0.5 {
		centre = (here*(1-float64(j)/samples)-mean)/(1-mean) + here*own - cross
	}
	w := normal95 * math.Sqrt(variance)
	return Band{math.Max(centre-w, -1), math.Min(centre+w, 1)}
}

// ljungBox is the statistic of Ljung & Box 1978 over 20 lags and its level under
// chi-square with 20 degrees of freedom. Lost samples count by the pairs that are
// left.
func ljungBox(m *moments) (q, p float64) {
	r := m.autocorrelation()
	n := float64(m.count)
	for j, v := range r {
		if m.pairs[j+1] == 0 {
			return math.NaN(), math.NaN()
		}
		q += v * v / float64(m.pairs[j+1])
	}
	q *= n * (n + 2)
	if math.IsNaN(q) {
		return q, q
	}
	return q, distuv.ChiSquared{K: lags}.Survival(q)
}
