// Package readings shows the figures of the design in hand: the held pole spelled
// out, start-up, noise against the floor, limits, loop and gain.
package readings

import (
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"polewright/estimator"
	"polewright/estimator/poles"
	"polewright/scenarios"
	"polewright/ui/desk"
	"polewright/ui/plane/targets"
	"polewright/ui/theme"
)

// Held is the pole in the hand.
type Held struct {
	Index, Of int        // of all that can be held; Of is 0 with nothing to hold
	At        complex128 // own plane; the upper one of a pair
	Pair      bool
	Fixed     bool
	Here      int  // targets in this very place
	OnFloor   bool // a floor pole is in this very place
}

// Limit is one requirement; Older says that its value belongs to the design before.
type Limit struct {
	scenarios.LimitResult
	Older bool
}

// Facts are what the readings show.
type Facts struct {
	Bench    *desk.Bench
	Plane    targets.Plane
	Held     Held
	Analysis *estimator.Analysis // nil before the first answer
	Design   *estimator.Design   // nil before the first answer
	Limits   []Limit
	Cell     float64 // width of a cell of the plane: places are shown to a tenth of it
	Late     bool    // the figures are older than asked for
}

// Row is one figure.
type Row struct {
	Label, Value, Unit, Tail string
	Short                    string    // in place of a label that does not fit
	Named                    string    // label with its unit, where the unit itself does not fit
	Ink                      theme.Ink // of the tail
}

// Section is a group of rows.
type Section struct {
	Title, Note string
	Rows        []Row
	Figures     bool // depend on the design: dimmed where late
}

// Sections returns everything, in the order of importance while dragging.
func Sections(f Facts, g *theme.Glyphs) []Section {
	out := []Section{held(f, g)}
	if f.Design == nil {
		return out
	}
	out = append(out, startUp(f, g), noise(f, g))
	if len(f.Limits) > 0 {
		out = append(out, limits(f, g))
	}
	if f.Design.Loop != nil {
		out = append(out, loop(f, g))
	}
	return append(out, gain(f, g))
}

func held(f Facts, g *theme.Glyphs) Section {
	h, period := f.Held, f.Bench.Model.Period
	if h.Of == 0 {
		return Section{Title: "no poles yet"}
	}
	s := Section{Title: fmt.Sprintf("pole %d of %d", h.Index+1, h.Of)}
	if h.Pair {
		s.Title = fmt.Sprintf("pair %d of %d", h.Index+1, h.Of)
	}
	switch {
	case h.Fixed:
		s.Note = "no gain moves it"
	case h.Here > 1:
		s.Note = fmt.Sprintf("%d poles here", h.Here)
	case h.OnFloor:
		s.Note = "at a floor pole"
	}
	d := poles.Describe(h.At, period)
	fast, slow := scales(f)
	ref := min(10*f.Cell, fast)
	if f.Plane == targets.Z {
		ref = slow
	}
	place, unit := "z = 0, no s", ""
	if p, ok := targets.Shown(h.At, f.Plane, period); ok {
		if f.Plane == targets.Z {
			place = Place(p, h.Pair, min(10*f.Cell, 0.1), g)
		} else {
			place, unit = Place(p, h.Pair, ref, g), "rad/s"
		}
	}
	s.Rows = append(s.Rows, Row{Label: string(byte(f.Plane)), Value: place, Unit: unit})
	s.Rows = append(s.Rows, Row{Label: "frequency", Value: Figure(d.Frequency, ref, g), Unit: "rad/s"},
		Row{Label: "damping", Value: Fixed(d.Damping, 3, g)})
	tau := Row{Label: "time constant", Short: "decays in", Value: Figure(d.TimeConstant, 1/slow/3, g), Unit: "s"}
	if d.TimeConstant < 0 {
		tau.Label, tau.Short, tau.Value = "grows in", "", Figure(-d.TimeConstant, 1/slow/3, g)
	}
	s.Rows = append(s.Rows, tau)
	if period > 0 {
		s.Rows = append(s.Rows, Row{Label: "", Value: Fixed(math.Abs(d.TimeConstantSamples), 2, g), Unit: "samples"})
	}
	return s
}

// scales are the fastest natural frequency and the slowest rate, in rad/s and 1/s,
// of the floor's poles, else of the plant's. They do not depend on the design.
func scales(f Facts) (fast, slow float64) {
	var list []complex128
	if f.Analysis != nil {
		for _, m := range f.Analysis.Observability.Modes {
			list = append(list, m.Eigenvalue)
		}
		if f.Analysis.Floor != nil {
			list = f.Analysis.Floor.Poles
		}
	}
	slow = math.Inf(1)
	for _, p := range list {
		d := poles.Describe(p, f.Bench.Model.Period)
		if !math.IsInf(d.Frequency, 0) {
			fast = max(fast, d.Frequency)
		}
		if d.TimeConstant > 0 && !math.IsInf(d.TimeConstant, 0) {
			slow = min(slow, 1/d.TimeConstant)
		}
	}
	if fast == 0 {
		fast = 1
	}
	if math.IsInf(slow, 0) {
		slow = fast
	}
	return fast, slow
}

func startUp(f Facts, g *theme.Glyphs) Section {
	t := f.Design.Transient
	_, slow := scales(f)
	s := Section{Title: "start-up", Figures: true, Rows: []Row{
		{Label: "settle", Value: Figure(t.Settle, 4/slow, g), Unit: "s"},
		{Label: "peak", Value: Fixed(t.Peak, 2, g), Unit: "x"},
	}}
	if !f.Design.Stable {
		s.Note = "unstable"
	}
	return s
}

func noise(f Facts, g *theme.Glyphs) Section {
	n := f.Design.Noise
	s := Section{Title: "noise", Note: "std, times the floor", Figures: true}
	floor := (*estimator.Floor)(nil)
	if f.Analysis != nil {
		floor = f.Analysis.Floor
	}
	switch {
	case !f.Design.Stable:
		s.Note = "undefined: unstable"
	case floor == nil:
		s.Note = "std; no floor exists"
	}
	states, _, _ := f.Bench.Model.Dims()
	for i := range states {
		if r := f.Bench.Model.Roles; r != nil && r[i] == estimator.DelayRegister {
			continue
		}
		row := Row{Label: StateName(f.Bench, i), Unit: StateUnit(f.Bench, i), Value: g.Undefined, Tail: g.Undefined}
		if i < len(n.Std) {
			ref := n.Std[i]
			if floor != nil && floor.Std[i] > 0 {
				ref = floor.Std[i]
			}
			row.Value = Figure(n.Std[i], ref, g)
		}
		if i < len(n.OverFloor) {
			row.Tail = times(n.OverFloor[i], g)
		}
		s.Rows = append(s.Rows, row)
	}
	for i, o := range n.Outputs {
		ref := o.FloorStd
		if !(ref > 0) {
			ref = o.Std
		}
		row := Row{Value: Figure(o.Std, ref, g), Tail: times(o.Std/o.FloorStd, g)}
		if i < len(f.Bench.Plant.Outputs) {
			row.Label, row.Unit = f.Bench.Plant.Outputs[i].Name, f.Bench.Plant.Outputs[i].Unit
		}
		s.Rows = append(s.Rows, row)
	}
	over := n.OverFloorRMS
	if n.Std == nil {
		over = math.NaN()
	}
	s.Rows = append(s.Rows, Row{Label: "all together", Tail: times(over, g)})
	return s
}

func times(v float64, g *theme.Glyphs) string {
	if math.IsNaN(v) || math.IsInf(v, 0) {
		return g.Undefined
	}
	return Fixed(v, 2, g)
}

// limitWords are the scenario's limits in words.
var limitWords = map[string]string{
	"settle_s": "settle", "peak_max": "peak", "over_floor_max": "over floor", "gain_max": "gain",
	"sensitivity_max": "sensitivity", "phase_margin_deg": "phase margin", "delay_margin_s": "delay margin",
}

// LimitWords is the name of a limit in words.
func LimitWords(name string) string {
	if words, ok := limitWords[name]; ok {
		return words
	}
	return strings.NewReplacer("_", " ", ".", " ").Replace(name)
}

const limitsTitle = "limits"

func limits(f Facts, g *theme.Glyphs) Section {
	s := Section{Title: limitsTitle, Figures: true}
	over := 0
	for _, l := range f.Limits {
		relation := g.AtMost
		if l.AtLeast {
			relation = g.AtLeast
		}
		row := Row{Label: LimitWords(l.Name), Value: Figure(l.Value, l.Limit, g), Unit: relation + " " + strconv.FormatFloat(l.Limit, 'g', 4, 64), Tail: "ok"}
		if l.Unit != "" {
			row.Unit += " " + l.Unit
			row.Named = row.Label + ", " + l.Unit
		}
		if !l.Met {
			row.Tail, row.Ink = "OVER", theme.Trouble
			if l.AtLeast {
				row.Tail = "UNDER"
			}
			over++
		}
		if room := (l.Limit - l.Value) / l.Limit * 100; !math.IsNaN(room) && !math.IsInf(room, 0) && math.Abs(room) < 1000 {
			row.Tail = fmt.Sprintf("%s %3.0f%%", row.Tail, math.Abs(room))
		}
		if l.Older {
			row.Ink = theme.Faint
		}
		s.Rows = append(s.Rows, row)
	}
	s.Note = "all met"
	if over > 0 {
		s.Note = fmt.Sprintf("%d of %d broken", over, len(f.Limits))
	}
	return s
}

func loop(f Facts, g *theme.Glyphs) Section {
	l := f.Design.Loop
	s := Section{Title: "margins of the loop", Figures: true}
	if !l.Stable {
		s.Note = "unstable"
	}
	db := func(v float64) string {
		switch {
		case math.IsNaN(v):
			return g.Undefined
		case math.IsInf(v, 0):
			return fmt.Sprintf("%+.0f", v)[:1] + g.Infinite
		}
		return fmt.Sprintf("%+.1f", v)
	}
	gain := db(l.GainMarginBelow) + " " + db(l.GainMarginAbove)
	if strings.Contains(gain, g.Infinite) { // shorter
		gain = db(l.GainMarginBelow) + " to " + db(l.GainMarginAbove)
	}
	s.Rows = []Row{
		{Label: "phase", Value: Fixed(l.PhaseMargin, 1, g), Unit: "deg"},
		{Label: "gain", Value: gain, Unit: "dB"},
		{Label: "delay", Value: Fixed(l.DelayMargin*1000, 2, g), Unit: "ms"},
		{Label: "sensitivity", Value: Fixed(l.SensitivityPeak, 2, g), Unit: "peak"},
	}
	if l.DelayMarginSamples >= 0 {
		samples := Row{Value: strconv.Itoa(l.DelayMarginSamples), Unit: "samples"}
		s.Rows = slices.Insert(s.Rows, 3, samples)
	}
	return s
}

func gain(f Facts, g *theme.Glyphs) Section {
	d := f.Design
	return Section{Title: "gain", Figures: true, Rows: []Row{
		{Label: "norm", Value: Figure(d.GainNorm, d.GainNorm, g)},
		{Label: "conditioning", Value: Fixed(d.EigenvectorCondition, 1, g)},
	}}
}

func plural(n int) string {
	if n == 1 {
		return ""
	}
	return "s"
}

// StateName names state i of the design model.
func StateName(b *desk.Bench, i int) string {
	if i < len(b.Model.StateNames) {
		return b.Model.StateNames[i]
	}
	return fmt.Sprintf("x%d", i+1)
}

// StateUnit returns the unit of state i of the design model: lags and delays
// have that of the signal they are named after.
func StateUnit(b *desk.Bench, i int) string {
	if i < len(b.Plant.States) {
		return b.Plant.States[i].Unit
	}
	name, unit, longest := StateName(b, i), "", 0
	match := func(signal, u string) {
		if len(signal) > longest && strings.HasPrefix(name, signal) {
			unit, longest = u, len(signal)
		}
	}
	for _, s := range b.Plant.Inputs {
		match(s.Name, s.Unit)
	}
	for _, s := range b.Plant.Sensors {
		match(s.Name, s.Unit)
	}
	return unit
}
