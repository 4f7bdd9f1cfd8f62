// Package plane draws the complex plane in cells: axes, lines of equal damping
// and equal natural frequency, the limits of sampling, and the marks of poles.
package plane

import (
	"math"

	"polewright/ui/plane/targets"
)

// Window is the part of a plane that is shown, W by H cells. A cell is twice as
// high as wide, so that a circle looks round. The real axis is the middle row.
type Window struct {
	targets.Grid
	W, H   int
	Period float64 // of the model; 0 in continuous time
}

// room is what the labels of the imaginary axis need on its right, in cells.
const room = 9

// Fit shows all the points, in the plane shown, with the origin and in the
// z-plane the unit circle.
func Fit(points []complex128, plane targets.Plane, period float64, w, h int) Window {
	win := Window{Grid: targets.Grid{Plane: plane}, W: w, H: h, Period: period}
	var left, right, up float64
	for _, p := range points {
		if plane == targets.Z && math.Hypot(real(p), imag(p)) > 3 {
			continue // one far pole must not squeeze the unit circle
		}
		if plane == targets.S && period > 0 && math.Abs(real(p)) > 1.2*math.Pi/period {
			continue // nor one that is gone within a sample, all the others
		}
		left, right, up = min(left, real(p)), max(right, real(p)), max(up, math.Abs(imag(p)))
	}
	if plane == targets.Z {
		left, right, up = min(left, -1), max(right, 1), max(up, 1)
	}
	if left == 0 && right == 0 && up == 0 {
		left = -1
	}
	rows := float64(max(h/2-1, 1))
	if near, ok := closeUp(points, win, rows); ok && plane == targets.Z {
		return near
	}
	dx := max((right-left)/float64(max(w-room-4, 4)), up/rows/2)
	win.setCell(step(min(max(dx, 1e-12), 1e12), 0, true))
	win.centre(complex(left, 0))
	if plane == targets.S {
		axis := w - max(room, int(math.Ceil(right/win.DX))+2)
		win.X0 = -(float64(axis) + 0.5) * win.DX
	}
	return win
}

// closeUp shows the points of a z-plane and z = 1, where slow poles crowd, with a
// piece of the unit circle; false where that is hardly closer than the whole
// circle.
func closeUp(points []complex128, win Window, rows float64) (Window, bool) {
	left, right, up := 1.0, 1.0, 0.0
	for _, p := range points {
		if math.Hypot(real(p), imag(p)) <= 3 {
			left, right, up = min(left, real(p)), max(right, real(p)), max(up, math.Abs(imag(p)))
		}
	}
	dx := max((right-left)/float64(max(win.W-room-4, 4)), up/rows/2)
	if dx < 1e-6 || dx > 0.5/rows/2 {
		return win, false
	}
	win.setCell(step(dx, 0, true))
	win.X0 = (left+right)/2 - (float64(win.W/2)+0.5)*win.DX
	return win, true
}

// WithHeight shows up to half above the real axis, and held.
func WithHeight(half float64, held complex128, plane targets.Plane, period float64, w, h int) Window {
	win := Window{Grid: targets.Grid{Plane: plane}, W: w, H: h, Period: period}
	dx := half / (float64(h) / 2) / 2
	if !(dx > 1e-12) || dx > 1e12 {
		dx = 1
	}
	win.setCell(step(dx, 0, false))
	win.centre(held)
	return win
}

// Half is the height shown above the real axis.
func (w Window) Half() float64 { return w.DY * float64(w.H) / 2 }

func (w *Window) setCell(dx float64) { w.DX, w.DY = dx, 2*dx }

// centre places the window so that held is in it, if it can be: the s-plane with
// its imaginary axis near the right edge, the z-plane with its origin in the
// middle, unless the pole held would be cut off.
func (w *Window) centre(held complex128) {
	axis := w.W - room
	if w.Plane == targets.Z {
		axis = w.W / 2
	}
	w.X0 = -(float64(axis) + 0.5) * w.DX
	if c := w.Column(real(held)); c < 1 || c >= w.W-1 {
		w.X0 += math.Round((real(held)-w.X0)/w.DX-float64(w.W)/3) * w.DX
	}
}

// Zoom shows more (steps > 0) or less (steps < 0) and keeps held in sight. Two
// steps are a factor of about 1.6.
func (w Window) Zoom(steps int, held complex128) Window {
	if next := step(w.DX, steps, false); next > 1e-9 && next < 1e9 {
		w.setCell(next)
		w.centre(held)
	}
	return w
}

// Show zooms out until p is in sight.
func (w Window) Show(p complex128) Window {
	for range 100 {
		if w.Inside(p) {
			break
		}
		w.setCell(step(w.DX, 2, false))
		axis := w.W - room
		if w.Plane == targets.Z {
			axis = w.W / 2
		}
		w.X0 = -(float64(axis) + 0.5) * w.DX
	}
	return w
}

// Inside reports whether a place is in sight.
func (w Window) Inside(p complex128) bool {
	c, r := w.Column(real(p)), w.Row(imag(p))
	return c >= 0 && c < w.W && r >= 0 && r < w.H
}

// edge, in cells, keeps what lies on the edge of a cell, as round numbers often
// do, from being rounded now to one side and now to the other.
const edge = 1e-7

// Column of a real part, Row of an imaginary part; beyond the picture they are
// bounded, but outside it.
func (w Window) Column(x float64) int {
	return int(max(min(math.Floor((x-w.X0)/w.DX+edge), 1e6), -1e6))
}

// Row is the row of an imaginary part.
func (w Window) Row(y float64) int {
	n := math.Copysign(math.Floor(math.Abs(y)/w.DY+0.5+edge), y)
	return w.H/2 - int(max(min(n, 1e6), -1e6))
}

// series are the preferred numbers R10 of ISO 3, rounded to two digits.
var series = [10]float64{1, 1.25, 1.6, 2, 2.5, 3.2, 4, 5, 6.4, 8}

// step returns the preferred number that lies n steps from v; with up the first
// that is not below v, else the nearest.
func step(v float64, n int, up bool) float64 {
	k := math.Log10(v) * 10
	if up {
		k = math.Ceil(k - 1e-9)
	}
	i := int(math.Round(k)) + n
	decade := int(math.Floor(float64(i) / 10))
	out := series[i-10*decade]
	if decade < 0 {
		out /= math.Pow10(-decade) // exact powers keep the figures short
	} else {
		out *= math.Pow10(decade)
	}
	if up && out < v*(1-1e-12) {
		return step(v*1.2, n, true)
	}
	return out
}

// tick returns a distance of 1, 2 or 5 times a power of ten, at least least.
func tick(least float64) float64 {
	p := math.Pow(10, math.Floor(math.Log10(least)))
	for _, m := range []float64{1, 2, 5, 10} {
		if m*p >= least*(1-1e-12) {
			return m * p
		}
	}
	return 10 * p
}
