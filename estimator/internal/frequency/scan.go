package frequency

import (
	"math"
	"sort"
)

// certified is the largest number of states up to which PeakGains checks every
// peak by its Hamiltonian matrix.
const certified = 8

// poleGrid returns frequencies so dense that the response cannot turn unseen
// between two: steps of a fixed part of the distance to the nearest pole.
func (r *response) poleGrid() []float64 {
	const (
		part = 0.3
		most = 20000
	)
	least, largest := math.Inf(1), 0.0
	list := []float64{0}
	for i, re := range r.re {
		size := math.Hypot(re, r.im[i])
		least, largest = min(least, size), max(largest, size)
		if r.im[i] > 0 {
			list = append(list, r.im[i])
		}
	}
	for nu := least / 10; nu < 10*largest && len(list) < most; {
		list = append(list, nu)
		near := math.Inf(1)
		for i, re := range r.re {
			near = min(near, math.Hypot(re, nu-r.im[i]))
		}
		nu += part * near
	}
	sort.Float64s(list)
	return append(list, math.Inf(1))
}

// scan fills the largest gain of each output and where it is, from one pass
// over poleGrid and a climb from every local maximum that comes near the best.
func (r *response) scan(values, nus []float64) {
	grid := r.poleGrid()
	seen := newDense(r.out, len(grid))
	for k, nu := range grid {
		g := r.at(nu)
		for i := range r.out {
			var size float64
			for _, v := range g[i*r.in : (i+1)*r.in] {
				size = math.Hypot(size, math.Hypot(real(v), imag(v)))
			}
			seen.row(i)[k] = size
		}
	}
	for i := range r.out {
		row, line := r.row(i), seen.row(i)
		var top float64
		for k, v := range line {
			if v > top || math.IsNaN(v) {
				top, nus[i] = v, grid[k]
			}
		}
		values[i] = top
		for k, v := range line {
			if v < 0.95*top || k > 0 && line[k-1] > v || k < len(line)-1 && line[k+1] > v {
				continue
			}
			p := search{gain: row.gain, best: v, where: grid[k]}
			p.climb()
			if p.best > values[i] {
				values[i], nus[i] = p.best, p.where
			}
		}
	}
}
