package scenarios

import "math"

// wave is a drive laid over the steps of a run.
type wave struct {
	Drive
	first, end int // steps with a value; end is not among them
	step, to   float64
	random     stream
	source     string
	coined     float64 // what the last coin gave
}

func newWave(d Drive, source string, step float64, steps int) *wave {
	return &wave{
		Drive: d, source: source, step: step,
		first: firstStep(d.At, step, steps), end: firstStep(d.Until, step, steps),
		to: math.Min(d.Until, float64(steps)*step),
	}
}

// firstStep is the first step at or after a time, at most steps; a time within a
// millionth of a step belongs to it.
func firstStep(t, step float64, steps int) int {
	k := math.Ceil(t/step - 1e-6)
	if k >= float64(steps) {
		return steps
	}
	return max(int(k), 0)
}

func (w *wave) reset(seed uint64) {
	if w.Shape == RandomBinary {
		w.random.reset(seed, w.source)
	}
}

// add adds the wave of steps k0 to before k0+count to every stride-th value of
// dst. A random wave must be asked in order.
func (w *wave) add(dst []float64, stride, k0, count int) {
	end := w.end
	if w.Shape == Ramp {
		end = k0 + count
	}
	for k := max(w.first, k0); k < min(end, k0+count); k++ {
		dst[(k-k0)*stride] += w.value(k)
	}
}

func (w *wave) value(k int) float64 {
	t := float64(float64(k)*w.step) - w.At
	switch w.Shape {
	case Ramp:
		return w.Size * math.Max(0, math.Min(t, w.Until-w.At))
	case Sine:
		return w.Size * math.Sin(2*math.Pi*w.Frequency*t)
	case Chirp:
		rate := (w.ToFrequency - w.Frequency) / (w.to - w.At)
		return w.Size * math.Sin(2*math.Pi*(w.Frequency+rate*t/2)*t)
	case RandomBinary:
		return w.coin(k)
	}
	return w.Size
}

// coin draws anew where a new interval begins.
func (w *wave) coin(k int) float64 {
	if w.Frequency > 0 && k > w.first {
		interval := func(k int) float64 { return math.Floor(float64(float64(k-w.first)*w.step)*w.Frequency + 1e-6) }
		if interval(k) == interval(k-1) {
			return w.coined
		}
	}
	w.coined = w.Size
	if w.random.bit() {
		w.coined = -w.Size
	}
	return w.coined
}
