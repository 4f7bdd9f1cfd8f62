package views

import (
	"math"

	"polewright/estimator"
	"polewright/estimator/sweep"
	"polewright/ui/canvas"
	"polewright/ui/theme"
)

// Curve is one of the curves of the trade-off.
type Curve uint8

const (
	// Speeds scales all poles of the design in hand.
	Speeds Curve = iota
	// Floors is the family of the best linear estimators.
	Floors
)

// Kept is a candidate on the trade-off.
type Kept struct {
	Letter string
	Design *estimator.Design
}

// Tradeoff is what the trade-off shows: noise over the floor against settle time.
type Tradeoff struct {
	Scaling, Family []sweep.Point
	Running         bool
	Trouble         string // why there is no floor or no curve; empty where all is well
	Kept            []Kept
	Design          *estimator.Design // in hand; nil before the first answer
	Settle, Over    *float64          // limits; nil without
	Curve           Curve             // that is walked along
	At              int               // its point under the cursor
}

// Points are those of the curve that is walked along.
func (f *Tradeoff) Points() []sweep.Point {
	if f.Curve == Floors {
		return f.Family
	}
	return f.Scaling
}

// Point is the one under the cursor; false where there is none.
func (f *Tradeoff) Point() (sweep.Point, bool) {
	list := f.Points()
	if f.At < 0 || f.At >= len(list) || !shows(list[f.At]) {
		return sweep.Point{}, false
	}
	return list[f.At], true
}

// shows tells whether a point has a place on the trade-off.
func shows(p sweep.Point) bool {
	return p.Settle() > 0 && p.OverFloor() > 0 && !math.IsInf(p.Settle(), 0) && !math.IsInf(p.OverFloor(), 0)
}

// Unchanged is the index of the point with the factor nearest to 1 that has a
// place, −1 where none has.
func Unchanged(list []sweep.Point) int {
	best, least := -1, math.Inf(1)
	for i, p := range list {
		if d := math.Abs(math.Log(p.Factor)); shows(p) && d < least {
			best, least = i, d
		}
	}
	return best
}

// Along goes from point at to the next one that has a place, up or down the
// factors by step; at the end it stays.
func Along(list []sweep.Point, at, step int) int {
	for i := at + step; i >= 0 && i < len(list); i += step {
		if shows(list[i]) {
			return i
		}
	}
	return at
}

// tradeBelow are the rows below the plot: ticks, the point, how it compares.
const tradeBelow = 4

// Lines draws the trade-off into w by h cells.
func (f *Tradeoff) Lines(w, h int, t *theme.Theme) []string {
	var c canvas.Canvas
	c.Reset(w, h)
	p := tradePlot{f: f, c: &c, g: &t.Glyphs, x: tradeGutter, y: 1, w: w - tradeGutter - 1, h: h - 1 - tradeBelow}
	p.heading(w)
	switch ok := p.axes(); {
	case f.Trouble != "" && !ok:
		for i, l := range canvas.Wrap(f.Trouble, w-4) {
			c.Text(2, 2+i, l, theme.Text)
		}
	case !ok:
		c.Text(2, 2, "the curves are on their way", theme.Faint)
	default:
		p.draw()
		p.words(w, h)
	}
	return c.Lines(t, true)
}
