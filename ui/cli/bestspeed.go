package cli

import (
	"context"
	"fmt"
	"math"

	"polewright/estimator/sweep"
	"polewright/scenarios/logs"
)

// The sweep of replay: how far the speed of the poles and the assumed process noise
// go to either side, and in how many steps.
const (
	bestSpeedSpan, bestSpeedCount = 4.0, 13
	bestFloorSpan, bestFloorCount = 1e3, 13
)

// swept is how well speeds and floors predict the log one step ahead: "best speed
// for this log".
type swept struct {
	// Counted is how many samples the errors are over, the same for all of them.
	Counted int64      `json:"counted"`
	Present logs.Point `json:"present"`

	Speeds     []speedPoint `json:"speeds"`
	SpeedsNote string       `json:"speeds_missing,omitempty"` // why there are none
	// BestSpeed is the factor of the least error, null without one. At an end of the
	// range the best may lie beyond.
	BestSpeed      logs.Number `json:"best_speed_factor"`
	BestSpeedAtEnd bool        `json:"best_speed_at_end"`

	Floors         []floorPoint `json:"floors"`
	BestFloor      logs.Number  `json:"best_floor_process_factor"`
	BestFloorAtEnd bool         `json:"best_floor_at_end"`

	// Longest is the longest settle time, of the slowest gain.
	Longest logs.Number `json:"longest_settle_s"`
}

// speedPoint is the design with all its poles Factor times as fast.
type speedPoint struct {
	Factor logs.Number `json:"factor"`
	Settle logs.Number `json:"settle_s"`
	logs.Point
}

// floorPoint is the best linear estimator for Factor times the process noise.
type floorPoint struct {
	Factor logs.Number `json:"process_factor"`
	Settle logs.Number `json:"settle_s"`
	logs.Point
}

// bestSpeed runs the design, its speeds and the floor's family over the log in one
// pass.
func bestSpeed(ctx context.Context, log logs.Recording, t *task, q logs.Request) (*swept, error) {
	s := &swept{Speeds: []speedPoint{}, Floors: []floorPoint{}}
	gains := []logs.Gain{q.Gain}
	longest := q.Gain.Settle
	add := func(g logs.Gain) {
		gains = append(gains, g)
		if g.Settle > longest || math.IsNaN(longest) {
			longest = g.Settle
		}
	}
	speeds, err := sweep.Speeds(ctx, t.designer, t.design, t.Model.Period, sweep.Factors(bestSpeedSpan, bestSpeedCount))
	switch {
	case ctx.Err() != nil:
		return nil, ctx.Err()
	case err != nil:
		s.SpeedsNote = err.Error()
	}
	for _, p := range speeds {
		if p.Design != nil {
			g := logs.GainOf(p.Design)
			s.Speeds = append(s.Speeds, speedPoint{Factor: logs.Number(p.Factor), Settle: logs.Number(g.Settle)})
			add(g)
		}
	}
	family, used, err := logs.FloorFamily(ctx, t.Model, sweep.Factors(bestFloorSpan, bestFloorCount))
	if err != nil {
		return nil, err
	}
	for i, g := range family {
		s.Floors = append(s.Floors, floorPoint{Factor: logs.Number(used[i]), Settle: logs.Number(g.Settle)})
		add(g)
	}
	s.Longest = logs.Number(longest)
	points, err := logs.Sweep(ctx, log, q, gains)
	if err != nil {
		return nil, err
	}
	s.fill(points)
	return s, nil
}

// fill takes the points in the order of the gains.
func (s *swept) fill(points []logs.Point) {
	s.Present, s.Counted, points = points[0], points[0].Counted, points[1:]
	errs := make([]float64, len(s.Speeds))
	for i := range s.Speeds {
		s.Speeds[i].Point = points[i]
		errs[i] = float64(points[i].Error)
	}
	s.BestSpeed = logs.Number(math.NaN())
	if best := least(errs); best >= 0 {
		s.BestSpeed, s.BestSpeedAtEnd = s.Speeds[best].Factor, best == 0 || best == len(errs)-1
	}
	points = points[len(s.Speeds):]
	errs = make([]float64, len(s.Floors))
	for i := range s.Floors {
		s.Floors[i].Point = points[i]
		errs[i] = float64(points[i].Error)
	}
	s.BestFloor = logs.Number(math.NaN())
	if best := least(errs); best >= 0 {
		s.BestFloor, s.BestFloorAtEnd = s.Floors[best].Factor, best == 0 || best == len(errs)-1
	}
}

// least is the index of the least number, −1 where there is none.
func least(list []float64) int {
	best := -1
	for i, v := range list {
		if !math.IsNaN(v) && (best < 0 || v < list[best]) {
			best = i
		}
	}
	return best
}

// print writes the tables; unit is that of the only sensor's error, skipped the time
// in s before the statistics.
func (s *swept) print(line func(string, ...any), unit string, skipped float64) {
	line("")
	line("best speed for this log: one-step-ahead error over %d samples", s.Counted)
	line("(one sensor: rms; several: 2p-th root of the determinant of their second moments)")
	s.printSpeeds(line, unit)
	line("")
	s.printFloors(line, unit)
	if longest := float64(s.Longest); longest > skipped {
		line("note: the slowest of these takes %s s to settle, the statistics begin after %s s: its start is in its error (--skip, --start)", figure4(longest), figure4(skipped))
	}
}

// row writes one gain.
func (s *swept) row(line func(string, ...any), factor, settle logs.Number, p logs.Point, mark string) {
	v := float64(p.Error)
	line("%s\t%s\t%s\t%s\t%s", figure4(float64(factor)), figure4(float64(settle)), figure(v), against(v, float64(s.Present.Error)), mark)
}

func (s *swept) printSpeeds(line func(string, ...any), unit string) {
	if s.SpeedsNote != "" {
		line("speeds\tnone: %s", s.SpeedsNote)
		return
	}
	line("all poles times\tsettle [s]\terror%s\tto the present\t", unit)
	seen := false
	for _, p := range s.Speeds {
		mark := ""
		if p.Factor == 1 {
			mark, seen = "PRESENT", true
		}
		s.row(line, p.Factor, p.Settle, p.Point, marks(mark, p.Factor == s.BestSpeed, s.BestSpeedAtEnd))
	}
	if !seen {
		s.printPresent(line)
	}
}

func (s *swept) printFloors(line func(string, ...any), unit string) {
	if len(s.Floors) == 0 {
		line("floors\tnone: this model has no floor")
		return
	}
	line("floor for Q times\tsettle [s]\terror%s\tto the present\t", unit)
	for _, p := range s.Floors {
		mark := ""
		if p.Factor == 1 {
			mark = "floor of the plant file"
		}
		s.row(line, p.Factor, p.Settle, p.Point, marks(mark, p.Factor == s.BestFloor, s.BestFloorAtEnd))
	}
	if s.SpeedsNote != "" {
		s.printPresent(line)
	}
}

func (s *swept) printPresent(line func(string, ...any)) {
	line("present\t\t%s\t\tPRESENT", figure(float64(s.Present.Error)))
}

// marks joins what stands behind a row.
func marks(mark string, best, atEnd bool) string {
	if !best {
		return mark
	}
	text := "best"
	if atEnd {
		text = "best, at the end of the range: it may lie beyond"
	}
	if mark == "" {
		return text
	}
	return mark + ", " + text
}

// against is an error relative to the present one.
func against(v, present float64) string {
	if math.IsNaN(v) || !(present > 0) {
		return "–"
	}
	return fmt.Sprintf("%+.2f %%", 100*(v/present-1))
}

func figure4(v float64) string {
	if math.IsNaN(v) || math.IsInf(v, 0) {
		return figure(v)
	}
	return fmt.Sprintf("%.4g", v)
}
