package scenarios

import "math"

// prediction runs some steps of the prediction form: u[k] = drive − K x̂[k|k−1].
func (r *Runner) prediction(run *Run, w window, k0, count int) {
	v := r.est.v
	for i := range count {
		r.control(w.d[i*r.m:], v)
		copy(r.x[r.nt:], v[r.n:r.n+r.m])
		r.innovate(run, w.g[i*r.p:], k0+i, v)
		copy(v[r.n+r.m:], r.e)
		r.record(run, k0+i, v)
		r.est.advance()
		r.advance(w.f[i*r.nt:])
	}
}

// current runs some steps of the current form: u[k] = drive − K x̂[k|k]. A command
// that depends on the sample cannot act on it: with direct feedthrough in a
// closed loop the sample and its expectation see the command before.
func (r *Runner) current(run *Run, w window, k0, count int) {
	v := r.est.v
	for i := range count {
		if !r.closed {
			r.control(w.d[i*r.m:], v)
		}
		copy(r.x[r.nt:], v[r.n:r.n+r.m])
		r.innovate(run, w.g[i*r.p:], k0+i, v)
		r.est.correct(r.e)
		if r.closed {
			r.control(w.d[i*r.m:], v)
			copy(r.x[r.nt:], v[r.n:r.n+r.m])
		}
		r.record(run, k0+i, v)
		r.est.advance()
		r.advance(w.f[i*r.nt:])
	}
}

// control writes what the actuators do into the estimator's input.
func (r *Runner) control(drive, v []float64) {
	u := v[r.n : r.n+r.m]
	if r.closed {
		r.k.mul(r.command, v)
	}
	for j := range u {
		c := drive[j]
		if r.closed {
			c -= r.command[j]
		}
		u[j] = r.actuators[j].apply(c)
	}
}

// innovate reads the sensors and compares them with what is expected. The real
// state with its input is in r.x, the estimate with its input in v.
func (r *Runner) innovate(run *Run, g []float64, k int, v []float64) {
	r.look.mul(r.y, r.x)
	r.expect.mul(r.want, v)
	faulty := k >= r.faults.from && k < r.faults.to
	for i := range r.sensors {
		s := &r.sensors[i]
		value := s.operating + (r.y[i] + g[i])
		if faulty {
			run.Measured[i][k], r.e[i] = r.fault(s, k, i, value, r.want[i])
			continue
		}
		reading := s.read(value)
		s.last = reading
		run.Measured[i][k] = reading
		r.e[i] = s.wrapped(reading - s.operating - r.want[i])
	}
}

// fault reads a sensor while something may be wrong with it.
func (r *Runner) fault(s *sensor, k, i int, value, expected float64) (reading, e float64) {
	add, frozen, lost := r.faults.state(k, i)
	if !frozen || k == 0 {
		s.last = s.read(value + add)
	}
	if lost {
		return math.NaN(), 0
	}
	return s.last, s.wrapped(s.last - s.operating - expected)
}

// advance takes the real plant to the next step.
func (r *Runner) advance(f []float64) {
	next := r.xNext[:r.nt]
	r.ahead.mul(next, r.x)
	for i := range next {
		r.x[i] = next[i] + f[i]
	}
}

// record writes down step k.
func (r *Runner) record(run *Run, k int, v []float64) {
	own := len(run.True)
	for i, at := range r.series {
		if at < own {
			run.True[at][k] = r.realOp[i] + r.x[i]
		} else {
			run.Others[at-own][k] = r.realOp[i] + r.x[i]
		}
	}
	for i, op := range r.estimateOp {
		run.Estimate[i][k] = op + v[i]
	}
	for j, u := range v[r.n : r.n+r.m] {
		run.Inputs[j][k] = r.actuators[j].operating + u
	}
	for i, e := range r.e {
		run.Innovations[i][k] = e
	}
}
