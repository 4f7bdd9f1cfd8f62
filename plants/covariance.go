package plants

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// processNoise takes the diagonal, or the full matrix that replaces it.
func (r *reader) processNoise() *Error {
	raw, p := r.raw.Process, r.plant
	q, columns := r.n, fmt.Sprintf("one per state, without G: %d", r.n)
	if p.g != nil {
		q = len(p.g[0])
		columns = fmt.Sprintf("one per column of G: %d", q)
	}
	p.process = mat.NewSymDense(q, nil)
	switch {
	case raw.Density != nil && raw.Std != nil:
		return &Error{Where: "process_noise", Wrong: "both density and std", Expected: "expected one of them"}
	case raw.Density != nil && !p.Continuous:
		return &Error{Where: "process_noise, density", Wrong: "a density for a discrete plant", Expected: "expected std, per step"}
	case raw.Std != nil && p.Continuous:
		return &Error{Where: "process_noise, std", Wrong: "a standard deviation per step for a continuous plant", Expected: "expected density"}
	}
	if raw.Covariance != nil {
		c, bad := r.covariance("process_noise, covariance", raw.Covariance, q, columns)
		p.process = c
		return bad
	}
	key, list := "density", raw.Density
	if raw.Std != nil {
		key, list = "std", raw.Std
	}
	if list == nil {
		return nil
	}
	at := where("process_noise", key)
	if len(list) != q {
		return &Error{Where: at, Wrong: count(len(list), "entry"), Expected: "expected " + columns}
	}
	for i, v := range list {
		if v < 0 {
			return &Error{Where: fmt.Sprintf("%s, entry %d", at, i+1), Wrong: fmt.Sprintf("negative noise %g", v), Expected: "expected 0 or above"}
		}
		if raw.Std != nil {
			v *= v
		}
		p.process.SetSym(i, i, v)
	}
	return nil
}

// sensorNoise takes the full matrix that replaces the sensors' own figures.
func (r *reader) sensorNoise() *Error {
	raw := r.raw.Sensor.Covariance
	if raw == nil {
		return nil
	}
	c, bad := r.covariance("sensor_noise, covariance", raw, r.p, "one per sensor")
	r.plant.sensorNoise = c
	return bad
}

// covariance checks a full matrix: square, symmetric, without a negative
// direction beyond rounding.
func (r *reader) covariance(at string, raw [][]entry, size int, because string) (*mat.SymDense, *Error) {
	if bad := r.matrix(at, raw, size, size, because); bad != nil {
		return nil, bad
	}
	d, bad := r.nominal(at, raw, size, size)
	if bad != nil {
		return nil, bad
	}
	s, scaled := mat.NewSymDense(size, nil), mat.NewSymDense(size, nil)
	for i := range size {
		if v := d.At(i, i); v < 0 {
			return nil, &Error{Where: fmt.Sprintf("%s, row %d, column %d", at, i+1, i+1), Wrong: fmt.Sprintf("negative noise %g", v), Expected: "expected 0 or above"}
		}
	}
	for i := range size {
		for j := i; j < size; j++ {
			v, w := d.At(i, j), d.At(j, i)
			size := math.Sqrt(d.At(i, i)) * math.Sqrt(d.At(j, j))
			place := fmt.Sprintf("%s, row %d, column %d", at, i+1, j+1)
			if math.Abs(v-w) > 1e-9*math.Max(math.Abs(v), math.Abs(w)) {
				return nil, &Error{Where: place, Wrong: fmt.Sprintf("%g, but %g across the diagonal", v, w), Expected: "expected a symmetric matrix"}
			}
			if math.Abs(v) > size*(1+1e-9) {
				return nil, &Error{Where: place, Wrong: fmt.Sprintf("%g is more than its variances allow", v), Expected: fmt.Sprintf("expected at most %g in size", size)}
			}
			s.SetSym(i, j, v/2+w/2)
			if size > 0 {
				scaled.SetSym(i, j, v/2/size+w/2/size)
			}
		}
	}
	var e mat.EigenSym
	if !e.Factorize(scaled, false) || e.Values(nil)[0] < -1e-10*float64(size) {
		return nil, &Error{Where: at, Wrong: "noise with a negative variance in some direction", Expected: "expected a positive semidefinite matrix"}
	}
	return s, nil
}
