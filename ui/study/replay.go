package study

import (
	"context"
	"errors"

	"polewright/ui/replays"
)

// replay runs the design in hand over the log, then the rivals one by one.
func (s *Student) replay(ctx context.Context, r Request, send func(Answer)) Answer {
	if r.Log == nil {
		return Answer{Err: errors.New("there is no log to replay")}
	}
	if s.runner == nil {
		runner, err := replays.NewRunner(s.bench.Model)
		if err != nil {
			return Answer{Err: err}
		}
		s.runner = runner
	}
	var a Answer
	if a.Replay, a.Err = s.runner.Run(ctx, r.Log, r.Design); a.Err != nil {
		return a
	}
	due := often()
	for k, rival := range r.Rivals {
		if k == 0 || due() {
			send(a)
		}
		if ctx.Err() != nil {
			break
		}
		list := make([]replays.Rival, k, k+1) // answers are immutable
		copy(list, a.Rivals)
		a.Rivals = append(list, s.runner.Rival(ctx, r.Log, rival.Name, rival.Design))
	}
	return a
}
