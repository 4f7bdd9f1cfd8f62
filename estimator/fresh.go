package estimator

import (
	"context"
	"math"
)

// Bounds on the movable poles for which Fresh looks: a search from cold may take
// as long as a person waits for the next key.
const (
	freshRobust     = 25
	freshLeastNoise = 10
	freshGain       = 0.02 // what counts as better
)

// Fresh looks from cold for a better gain at the poles of a design that followed
// its branch while poles moved: better conditioned for Robust, quieter for
// LeastNoise, by more than 2 %. It returns nil where there is none, where one sensor
// leaves no choice, and for more poles than a search from cold is quick for. What it
// returns is offered, never taken unasked.
func (d *Designer) Fresh(ctx context.Context, design *Design) (_ *Design, err error) {
	defer guard(&err)
	if err := d.owns(design); err != nil {
		return nil, err
	}
	most, measure := freshRobust, func(x *Design) float64 { return x.EigenvectorCondition }
	if d.opt.Method == LeastNoise {
		most, measure = freshLeastNoise, func(x *Design) float64 { return x.Noise.OverFloorRMS }
	}
	if d.pair.rank == 0 || d.pair.rank > most || len(design.Wanted) < d.pair.rank {
		return nil, nil
	}
	if sensors, _ := d.pair.c.Dims(); sensors < 2 {
		return nil, nil
	}
	cold, err := d.QuickPlace(design.Wanted[:d.pair.rank], nil)
	if err != nil || ctx.Err() != nil {
		return nil, ctx.Err() // without a gain from cold there is nothing better
	}
	have, found := measure(design), measure(cold)
	if math.IsNaN(have) || !(found < have*(1-freshGain)) {
		return nil, nil
	}
	return d.Complete(ctx, cold)
}
