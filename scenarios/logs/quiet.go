package logs

import (
	"context"
	"io"
	"math"
	"slices"
)

const (
	quietBlock  = 128 // second differences in a block, at first
	quietBlocks = 512 // blocks kept; when there are as many, neighbours are joined
)

// QuietNoise is what a stretch of a log says about the sensors' noise.
type QuietNoise struct {
	// Samples used, and the stretch in s.
	Samples int64  `json:"samples"`
	From    Number `json:"from_s"`
	To      Number `json:"to_s"`
	// Sensors has the variance of one sample per sensor; undefined where too few
	// samples follow each other.
	Sensors []Estimate `json:"sensor_variance"`
}

// Quiet finds the variance of the sensors' noise from the second differences
// y[k] − 2 y[k−1] + y[k−2] between the times from and to: white noise of variance σ²
// gives them 6σ² (the mean square successive difference of von Neumann 1941, taken
// twice so that a steady drift falls out). The median over blocks makes it stand
// movement in less than half of the stretch, and single spikes.
//
// What moves within three samples counts as noise: where the plant shakes, it is an
// upper bound.
func Quiet(ctx context.Context, log Recording, from, to float64) (*QuietNoise, error) {
	l := log.Layout()
	source, err := log.Samples()
	if err != nil {
		return nil, err
	}
	sensors := make([]differences, len(l.Sensors))
	for i, s := range l.Sensors {
		sensors[i].wrap = s.Wrap
	}
	out := &QuietNoise{From: Number(math.NaN()), To: Number(math.NaN())}
	for k := 0; ; k++ {
		if k%4096 == 0 && ctx.Err() != nil {
			return nil, ctx.Err()
		}
		s, err := source.Next()
		if err == io.EOF {
			break
		}
		if err != nil {
			return nil, err
		}
		if s.T < from || s.T > to {
			continue
		}
		if out.Samples == 0 {
			out.From = Number(s.T)
		}
		out.To = Number(s.T)
		out.Samples++
		for i := range sensors {
			if s.Missing > 0 {
				sensors[i].run = 0
			}
			sensors[i].add(s.Y[i])
		}
	}
	for i := range sensors {
		out.Sensors = append(out.Sensors, sensors[i].variance())
	}
	return out, nil
}

// differences collects mean squares of second differences in blocks.
type differences struct {
	wrap        float64
	run         int // samples that follow each other, up to 2
	last, slope float64
	sum         float64
	terms       int
	size        int // terms of a full block; 0 is quietBlock
	blocks      []float64
}

func (d *differences) add(y float64) {
	if y != y {
		d.run = 0
		return
	}
	slope := y - d.last
	if d.wrap > 0 {
		slope = math.Remainder(slope, d.wrap)
	}
	d.last = y
	switch d.run {
	case 0:
		d.run = 1
		return
	case 1:
		d.run, d.slope = 2, slope
		return
	}
	second := slope - d.slope
	if d.wrap > 0 {
		second = math.Remainder(second, d.wrap)
	}
	d.slope = slope
	d.sum += second * second
	d.terms++
	if d.size == 0 {
		d.size = quietBlock
	}
	if d.terms < d.size {
		return
	}
	d.blocks = append(d.blocks, d.sum/float64(d.terms))
	d.sum, d.terms = 0, 0
	if len(d.blocks) < quietBlocks {
		return
	}
	for k := range quietBlocks / 2 {
		d.blocks[k] = (d.blocks[2*k] + d.blocks[2*k+1]) / 2
	}
	d.blocks = d.blocks[:quietBlocks/2]
	d.size *= 2
}

// variance is the median of the blocks, one sixth of it. Second differences of
// white noise are correlated, −2/3 and 1/6 at lags 1 and 2: m of them count as
// m / (1 + 2 (4/9 + 1/36)) independent squares.
func (d *differences) variance() Estimate {
	blocks, size := d.blocks, d.size
	if len(blocks) == 0 {
		if d.terms < 8 {
			nan := Number(math.NaN())
			return Estimate{nan, nan, nan}
		}
		blocks, size = []float64{d.sum / float64(d.terms)}, d.terms
	}
	list := slices.Sorted(slices.Values(blocks))
	n := len(list)
	middle := (list[(n-1)/2] + list[n/2]) / 2
	degrees := float64(size) / (1 + 2*(4.0/9+1.0/36))
	total := degrees * float64(n)
	if n > 2 {
		// The median of a chi-square lies below its mean (Wilson & Hilferty 1931);
		// that of many blocks knows 2/π of what their mean would.
		h := 1 - 2/(9*degrees)
		middle /= h * h * h
		total *= 2 / math.Pi
	}
	v := middle / 6
	return Estimate{
		Number(v),
		Number(v / chiSquareQuantile(upper95, total)),
		Number(v / chiSquareQuantile(lower95, total)),
	}
}
