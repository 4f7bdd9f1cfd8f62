package plants

import "gonum.org/v1/gonum/mat"

// SampleNoise returns R (p×p over all sensors of the file, also the disabled
// ones) at a sample period in s: the covariance of one sample, or for period 0 the
// two-sided density.
//
// The variance of one sample is noise_std², or noise_density over the period,
// plus resolution²/12 unless the figure includes it. Without a period, the density is
// this variance times the period of the file. A full covariance replaces all that.
//
// With quantised true, the signal is meant to pass a quantiser afterwards: what
// the resolution gives is then left out, and taken out of figures that include it.
func (p *Plant) SampleNoise(period float64, quantised bool) *mat.SymDense {
	n := len(p.Sensors)
	r := mat.NewSymDense(n, nil)
	if p.sensorNoise != nil {
		factor := 1.0
		switch {
		case p.Period > 0 && period == 0:
			factor = p.Period
		case p.Period == 0 && period > 0:
			factor = 1 / period
		}
		for i := range n {
			for j := i; j < n; j++ {
				r.SetSym(i, j, factor*p.sensorNoise.At(i, j))
			}
		}
		return r
	}
	for i, s := range p.Sensors {
		r.SetSym(i, i, s.variance(period, p.Period, quantised))
	}
	return r
}

// variance of one sample, or the density where period is 0; file is the period
// of the file, 0 without.
func (s Sensor) variance(period, file float64, quantised bool) float64 {
	var steps float64
	if step := s.Resolution * s.Resolution / 12; quantised && s.NoiseIncludesResolution {
		steps = -step
	} else if !quantised && !s.NoiseIncludesResolution {
		steps = step
	}
	var v float64
	switch {
	case period > 0 && s.NoiseDensity != nil:
		v = *s.NoiseDensity/period + steps
	case period > 0 && s.NoiseStd != nil:
		v = *s.NoiseStd**s.NoiseStd + steps
	case period > 0:
		v = steps
	case s.NoiseDensity != nil:
		v = *s.NoiseDensity + steps*file
	case s.NoiseStd != nil:
		v = (*s.NoiseStd**s.NoiseStd + steps) * file
	default:
		v = steps * file
	}
	return max(v, 0)
}
