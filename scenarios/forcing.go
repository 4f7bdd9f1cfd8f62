package scenarios

import (
	"fmt"
	"math"
)

// maxKept bounds the values of forcing that are kept from run to run, so that
// the same noise is not drawn again while a pole is dragged.
const maxKept = 1 << 22

// forcing is all that acts on a run from outside, for consecutive steps: it does
// not depend on the gain.
type forcing struct {
	steps, m, nt, p int

	drives, surprises []*wave
	process           []*stream // per column of w with noise
	columns           []int
	sensor            []*stream
	names             []string // of the sensors

	bs, ds flat
	w, v   flat // roots of the covariances; factors are in them
	c0     []float64
	g0     []float64
	held   bool // surprises go into c instead of f (continuous time)

	keep             bool
	buffer           window
	surprise, normal []float64
	table            *ziggurat
}

// window is the forcing of some steps, a row per step: drives d (m), what is
// added to the real state in a step f (nt), what is added to the sensors g (p),
// and in continuous time what acts during the step c (nt).
type window struct{ d, f, g, c []float64 }

func (x *forcing) allocate() {
	x.table = normalTable()
	x.keep = x.steps*(x.m+2*x.nt+x.p) <= maxKept
	x.surprise, x.normal = make([]float64, chunk*x.m), make([]float64, chunk)
	rows := min(chunk, x.steps)
	if x.keep {
		rows = x.steps
	}
	w := window{make([]float64, rows*x.m), make([]float64, rows*x.nt), make([]float64, rows*x.p), nil}
	if x.held {
		w.c = make([]float64, rows*x.nt)
	}
	x.buffer = w
}

// seed starts all sources anew; with few enough values all are drawn at once.
func (x *forcing) seed(seed uint64) {
	for _, w := range x.drives {
		w.reset(seed)
	}
	for _, w := range x.surprises {
		w.reset(seed)
	}
	for i, s := range x.process {
		s.reset(seed, fmt.Sprintf("process %d", x.columns[i]))
	}
	for i, s := range x.sensor {
		s.reset(seed, "sensor "+x.names[i])
	}
	if x.keep {
		for k := 0; k < x.steps; k += chunk {
			x.fill(k, min(chunk, x.steps-k), x.part(k))
		}
	}
}

// part is the place of the steps from k on in what is kept.
func (x *forcing) part(k int) window {
	b := x.buffer
	w := window{d: b.d[k*x.m:], f: b.f[k*x.nt:], g: b.g[k*x.p:]}
	if x.held {
		w.c = b.c[k*x.nt:]
	}
	return w
}

// next returns the forcing of the steps k to before k+count, count ≤ chunk. It is
// asked in order after seed.
func (x *forcing) next(k, count int) window {
	if x.keep {
		return x.part(k)
	}
	x.fill(k, count, x.buffer)
	return x.buffer
}

func (x *forcing) fill(k, count int, w window) {
	clear(w.d[:count*x.m])
	clear(w.f[:count*x.nt])
	for _, v := range x.drives {
		v.add(w.d[v.Index:], x.m, k, count)
	}
	surprise := x.surprise[:count*x.m]
	clear(surprise)
	for _, v := range x.surprises {
		v.add(surprise[v.Index:], x.m, k, count)
	}
	act := w.f
	if x.held {
		act = w.c
	}
	for i := range count {
		copy(act[i*x.nt:(i+1)*x.nt], x.c0)
		copy(w.g[i*x.p:(i+1)*x.p], x.g0)
	}
	if len(x.surprises) > 0 {
		for i := range count {
			s := surprise[i*x.m : (i+1)*x.m]
			addMul(act[i*x.nt:], x.bs, s)
			addMul(w.g[i*x.p:], x.ds, s)
		}
	}
	for j, s := range x.process {
		s.addColumn(w.f, x.w, x.columns[j], count, x.normal, x.table)
	}
	for j, s := range x.sensor {
		s.addColumn(w.g, x.v, j, count, x.normal, x.table)
	}
}

// addMul adds f·v to dst.
func addMul(dst []float64, f flat, v []float64) {
	for i := range f.rows {
		for j, c := range f.row(i) {
			dst[i] += float64(c * v[j])
		}
	}
}

// addColumn draws count normal values and adds their multiples by column j of f
// to the rows of dst.
func (s *stream) addColumn(dst []float64, f flat, j, count int, normal []float64, table *ziggurat) {
	normal = normal[:count]
	for k := range normal {
		normal[k] = s.normal(table)
	}
	for i := range f.rows {
		c := f.at(i, j)
		if c == 0 {
			continue
		}
		at := i
		for _, z := range normal {
			dst[at] += float64(c * z)
			at += f.rows
		}
	}
}

// scaled multiplies a root by a factor.
func scaled(f flat, factor float64) flat {
	out := newFlat(f.rows, f.cols)
	for i, v := range f.a {
		out.a[i] = v * factor
	}
	return out
}

// columnsWithNoise lists the columns of a root that are not zero.
func columnsWithNoise(f flat) []int {
	var list []int
	for j := range f.cols {
		for i := range f.rows {
			if f.at(i, j) != 0 {
				list = append(list, j)
				break
			}
		}
	}
	return list
}

// finite reports whether all values are.
func finite(list []float64) bool {
	for _, v := range list {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return false
		}
	}
	return true
}
