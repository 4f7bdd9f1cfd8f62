package scenarios

import "math"

// chunk is the number of steps between two looks at the context and for
// divergence.
const chunk = 128

// rows holds the signals of one chunk, a row per step, before they are laid out
// as lists. The state of the next step is written straight into the next row.
type rows struct {
	real      []float64 // (chunk+1)×(nt+m): state and input of the real plant
	estimated []float64 // (chunk+1)×(n+m+p): state, input and innovation
	read      []float64 // chunk×p: readings, of free sensors without the operating point
}

// prediction runs some steps of the prediction form: u[k] = drive − K x̂[k|k−1].
func (r *Runner) prediction(w window, k0, count int) {
	x, v := r.row(0)
	for i := range count {
		r.control(w.d[i*r.m:], v)
		carry(x[r.nt:], v[r.n:])
		r.innovate(w.g[i*r.p:], k0+i, i, x, v)
		nextX, nextV := r.row(i + 1)
		r.est.advance(nextV, v)
		r.ahead.mulAdd(nextX, x, w.f[i*r.nt:])
		x, v = nextX, nextV
	}
}

// carry copies the few inputs of a row; the call of copy costs more.
func carry(to, from []float64) {
	from = from[:len(to)]
	for j := range to {
		to[j] = from[j]
	}
}

// current runs some steps of the current form: u[k] = drive − K x̂[k|k]. A command
// that depends on the sample cannot act on it: with direct feedthrough in a
// closed loop the sample and its expectation see the command before.
func (r *Runner) current(w window, k0, count int) {
	x, v := r.row(0)
	for i := range count {
		if !r.closed {
			r.control(w.d[i*r.m:], v)
		}
		carry(x[r.nt:], v[r.n:])
		r.innovate(w.g[i*r.p:], k0+i, i, x, v)
		r.est.correct(v)
		if r.closed {
			r.control(w.d[i*r.m:], v)
			carry(x[r.nt:], v[r.n:])
		}
		nextX, nextV := r.row(i + 1)
		carry(nextV[r.n:r.n+r.m], v[r.n:])
		r.est.advance(nextV, v)
		r.ahead.mulAdd(nextX, x, w.f[i*r.nt:])
		x, v = nextX, nextV
	}
}

// row i of the chunk.
func (r *Runner) row(i int) (x, v []float64) {
	a, b := r.nt+r.m, r.n+r.m+r.p
	return r.rows.real[i*a : (i+1)*a], r.rows.estimated[i*b : (i+1)*b]
}

// control writes what the actuators do into the input of a row.
func (r *Runner) control(drive, v []float64) {
	u := v[r.n : r.n+r.m]
	drive = drive[:len(u)]
	if r.closed {
		command := r.command[:len(u)]
		r.k.mulAdd(command, v, r.nothing)
		for j, c := range command {
			u[j] = drive[j] - c
		}
	} else {
		carry(u, drive)
	}
	if r.freeInputs {
		return
	}
	for j := range u {
		u[j] = r.actuators[j].apply(u[j])
	}
}

// innovate reads the sensors at step k, row i of the chunk, and compares them
// with what is expected.
func (r *Runner) innovate(g []float64, k, i int, x, v []float64) {
	e, read := v[r.n+r.m:r.n+r.m+r.p], r.rows.read[i*r.p:(i+1)*r.p]
	r.look.mulAdd(r.y, x, g)
	r.expect.mulAdd(r.want, v, r.nothing)
	if r.freeSensors {
		y, want := r.y[:len(e)], r.want[:len(e)]
		for j := range e {
			e[j] = y[j] - want[j]
			read[j] = y[j]
		}
		return
	}
	faulty := k >= r.faults.from && k < r.faults.to
	for j := range r.sensors {
		s := &r.sensors[j]
		value := s.operating + r.y[j]
		if faulty {
			read[j], e[j] = r.fault(s, k, j, value)
			continue
		}
		s.last = s.read(value)
		read[j] = s.last
		e[j] = s.wrapped(s.last - s.operating - r.want[j])
	}
}

// fault reads a sensor while something may be wrong with it.
func (r *Runner) fault(s *sensor, k, j int, value float64) (reading, e float64) {
	add, frozen, lost := r.faults.state(k, j)
	if !frozen || k == 0 {
		s.last = s.read(value + add)
	}
	if lost {
		return math.NaN(), 0
	}
	return s.last, s.wrapped(s.last - s.operating - r.want[j])
}

// write lays a chunk out as lists and makes its last state the first of the
// next chunk. It reports whether all values are within their bounds.
func (r *Runner) write(run *Run, k0, count int) bool {
	ok := true
	a, b := r.nt+r.m, r.n+r.m+r.p
	list := func(to, from []float64, stride int, operating, bound float64) {
		to = to[k0 : k0+count]
		at := 0
		within := true
		for k := range to {
			v := operating + from[at]
			to[k] = v
			at += stride
			if !(math.Abs(v) <= bound) {
				within = false
			}
		}
		ok = ok && within
	}
	for i, place := range r.series {
		list(r.realList(run, place), r.rows.real[i:], a, r.realOp[i], r.realBound[place])
	}
	for i, op := range r.estimateOp {
		list(run.Estimate[i], r.rows.estimated[i:], b, op, r.estBound[i])
	}
	for j := range run.Inputs {
		list(run.Inputs[j], r.rows.estimated[r.n+j:], b, r.actuators[j].operating, math.MaxFloat64)
	}
	for j := range run.Innovations {
		list(run.Innovations[j], r.rows.estimated[r.n+r.m+j:], b, 0, math.MaxFloat64)
	}
	for j := range run.Measured {
		operating := 0.0 // readings are absolute but for free sensors
		if r.freeSensors {
			operating = r.sensors[j].operating
		}
		to := run.Measured[j][k0 : k0+count]
		for k := range to {
			to[k] = operating + r.rows.read[k*r.p+j]
		}
	}
	copy(r.rows.real[:a], r.rows.real[count*a:])
	copy(r.rows.estimated[:b], r.rows.estimated[count*b:])
	return ok
}

// realList is the list of a state of the real plant.
func (r *Runner) realList(run *Run, place int) []float64 {
	if place < len(run.True) {
		return run.True[place]
	}
	return run.Others[place-len(run.True)]
}
