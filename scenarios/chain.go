package scenarios

import (
	"math"
	"slices"

	"polewright/plants"
)

// sensor is what happens to a measured value on its way to the firmware.
type sensor struct {
	operating  float64 // of the design's plant
	low, high  float64 // saturation
	resolution float64
	wrap       float64 // of the estimator's innovation
	last       float64 // reading before a freeze
}

// actuator is what happens to a command.
type actuator struct {
	operating  float64
	low, high  float64
	resolution float64
}

func newSensor(own, real plants.Sensor) sensor {
	low, high := bounds(real.Range)
	return sensor{operating: own.Operating, low: low, high: high, resolution: real.Resolution, wrap: own.Wrap}
}

func newActuator(own, real plants.Input) actuator {
	low, high := bounds(real.Range)
	return actuator{operating: own.Operating, low: low, high: high, resolution: real.Resolution}
}

func bounds(r *plants.Range) (low, high float64) {
	if r == nil {
		return math.Inf(-1), math.Inf(1)
	}
	return r.Low, r.High
}

// free reports a sensor that shows every value as it is.
func (s *sensor) free() bool {
	return s.resolution == 0 && s.wrap == 0 && math.IsInf(s.low, -1) && math.IsInf(s.high, 1)
}

// free reports an actuator that does whatever it is told.
func (a *actuator) free() bool {
	return a.resolution == 0 && math.IsInf(a.low, -1) && math.IsInf(a.high, 1)
}

// read turns an absolute value into a reading: saturation, then quantisation.
func (s *sensor) read(v float64) float64 {
	if v < s.low {
		v = s.low
	} else if v > s.high {
		v = s.high
	}
	if s.resolution > 0 {
		v = quantise(v, s.resolution)
	}
	return v
}

// apply turns a command, a deviation, into what the actuator does: the next step
// of its resolution, within its range.
func (a *actuator) apply(u float64) float64 {
	v := a.operating + u
	if a.resolution == 0 && v >= a.low && v <= a.high {
		return u
	}
	if a.resolution > 0 {
		v = quantise(v, a.resolution)
	}
	if v < a.low {
		v = a.low
	} else if v > a.high {
		v = a.high
	}
	return v - a.operating
}

// quantise rounds to a whole number of steps; beyond 2^53 steps a value has none.
func quantise(v, step float64) float64 {
	if k := math.RoundToEven(v / step); math.Abs(k) < 1<<53 {
		return k * step
	}
	return v
}

// wrapped takes an innovation modulo the sensor's wrap into ±wrap/2.
func (s *sensor) wrapped(e float64) float64 {
	if s.wrap > 0 && (e > s.wrap/2 || e < -s.wrap/2) {
		return math.Remainder(e, s.wrap)
	}
	return e
}

// faultSpan is a fault laid over the steps of a run.
type faultSpan struct {
	kind       FaultKind
	sensor     int // of the design
	first, end int
	size       float64
}

// faults of one run; from and to bound them all.
type faults struct {
	spans    []faultSpan
	from, to int
}

// newFaults keeps the faults of sensors in use; index maps the plant's sensors
// to the design's.
func newFaults(list []Fault, index map[int]int, step float64, steps int) faults {
	f := faults{from: steps}
	for _, v := range list {
		i, used := index[v.Index]
		if !used {
			continue
		}
		span := faultSpan{v.Kind, i, firstStep(v.From, step, steps), firstStep(v.Until, step, steps), v.Size}
		if v.Kind == Spike {
			span.end = min(span.first+1, steps)
		}
		if span.first >= span.end {
			continue
		}
		f.spans = append(f.spans, span)
		f.from, f.to = min(f.from, span.first), max(f.to, span.end)
	}
	return f
}

// state of sensor i at step k: what is added, and whether it is frozen or lost.
func (f *faults) state(k, i int) (add float64, frozen, lost bool) {
	for j := range f.spans {
		s := &f.spans[j]
		if s.sensor != i || k < s.first || k >= s.end {
			continue
		}
		switch s.kind {
		case Dropout:
			lost = true
		case Freeze:
			frozen = true
		default:
			add += s.size
		}
	}
	return add, frozen, lost
}

// lost is the set of sensors, a bit each, whose sample at step k is lost.
func (f *faults) lost(k int) uint32 {
	if k < f.from || k >= f.to {
		return 0
	}
	var set uint32
	for _, s := range f.spans {
		if s.kind == Dropout && k >= s.first && k < s.end {
			set |= 1 << s.sensor
		}
	}
	return set
}

// lostSets lists the sets that occur.
func (f *faults) lostSets() []uint32 {
	sets := []uint32{0}
	for _, s := range f.spans {
		for _, k := range []int{s.first, s.end} {
			if set := f.lost(k); !slices.Contains(sets, set) {
				sets = append(sets, set)
			}
		}
	}
	return sets
}
