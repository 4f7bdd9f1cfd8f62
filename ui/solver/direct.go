package solver

import (
	"context"
	"fmt"

	"polewright/ui/desk"
)

// Direct answers requests in place, for a dialogue that waits for each answer.
// One goroutine at a time.
type Direct struct{ work *work }

// NewDirect is for one bench.
func NewDirect(b *desk.Bench) *Direct { return &Direct{newWork(b)} }

// Answer returns the last stage of the answer.
func (d *Direct) Answer(ctx context.Context, r desk.Request) (last desk.Answer) {
	defer func() {
		if p := recover(); p != nil {
			last = desk.Answer{Gen: r.Gen, Err: fmt.Errorf("this design broke the solver (%v): undo and go on; the work is kept", p)}
		}
	}()
	d.work.stages(ctx, r, func(a desk.Answer) { last = a })
	last.Gen = r.Gen
	return last
}
