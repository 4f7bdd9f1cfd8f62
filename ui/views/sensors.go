package views

import (
	"fmt"
	"math/cmplx"
	"slices"
	"strings"

	"polewright/estimator"
	"polewright/ui/canvas"
	"polewright/ui/desk"
	"polewright/ui/plane/targets"
	"polewright/ui/theme"
)

// Sensors is what the view of sensors and modes shows.
type Sensors struct {
	Bench  *desk.Bench
	Plane  targets.Plane
	Design *estimator.Design // in hand; nil before the first answer
	// All is what the sensors in use see, Rest what those that are left plugged see;
	// nil while that is on its way. They are the same where none is unplugged.
	All, Rest *Seen
	// Plugged has one entry per sensor in use; Cursor is one of these.
	Plugged []bool
	Cursor  int
}

// Lines draws it w cells wide.
func (f *Sensors) Lines(w int, t *theme.Theme) []string {
	p := sensorPage{page{w: w}, f, &t.Glyphs}
	p.sensors()
	p.left()
	p.modes()
	p.shares()
	p.blank()
	p.prose(2, "Sigma is the smallest singular value of [A - lambda I; C] in parts of the scales; the words compare it with the mode seen best. "+
		"A mode moves as the combination of states beside it, in parts of their scales. Of the noise, squares add up: together is the root of their sum.", theme.Faint)
	return p.lines(t)
}

type sensorPage struct {
	page
	f *Sensors
	g *theme.Glyphs
}

func (p *sensorPage) names() []string { return p.f.Bench.Model.SensorNames }

func (p *sensorPage) narrow() bool { return p.w < 76 }

// whole tells whether every sensor is plugged.
func (p *sensorPage) whole() bool { return !slices.Contains(p.f.Plugged, false) }

// sensors lists the sensors and what the design in hand does without each.
func (p *sensorPage) sensors() {
	p.title("sensors")
	name := min(max(p.w/3, 20), 40)
	for j, n := range p.names() {
		row := []span{{x: 2, text: canvas.Cut(n, name-3, p.g.Ellipsis)}}
		if j == p.f.Cursor {
			row[0].ink = theme.Hold
			row = append(row, span{x: 0, text: string(p.g.Right), ink: theme.Hold})
		}
		word := span{x: name, text: "plugged", ink: theme.Faint}
		if j < len(p.f.Plugged) && !p.f.Plugged[j] {
			word = span{x: name, text: "UNPLUGGED", ink: theme.Trouble}
		}
		row = append(row, word)
		if word := p.alone(j); word.text != "" {
			word.x = name + 12
			row = append(row, word)
		}
		p.row(row...)
	}
}

// alone says what this design does when only sensor j fails.
func (p *sensorPage) alone(j int) span {
	if p.f.Design == nil {
		return span{}
	}
	for _, s := range p.f.Design.SensorSets {
		if len(s.Lost) != 1 || s.Lost[0] != j {
			continue
		}
		said := span{text: "this design stays stable without it", ink: theme.Faint}
		if !s.Stable {
			said = span{text: "this design is UNSTABLE without it", ink: theme.Trouble}
		}
		if p.narrow() {
			said.text = strings.TrimPrefix(strings.TrimPrefix(said.text, "this design stays "), "this design is ")
		}
		return said
	}
	return span{}
}

// left says what is lost with the sensors that are unplugged.
func (p *sensorPage) left() {
	if p.whole() {
		return
	}
	p.blank()
	rest, all := p.f.Rest, p.f.All
	switch {
	case rest == nil || all == nil:
		p.row(span{x: 2, text: "looking at what is left", ink: theme.Faint})
		return
	case rest.Err != nil:
		p.prose(2, rest.Err.Error(), theme.Trouble)
		return
	}
	o := rest.Analysis.Observability
	switch n, _, _ := rest.Model.Dims(); {
	case o.Rank < n && unstableAmong(o.Fixed, rest.Model.Period):
		p.prose(2, fmt.Sprintf("What is left sees %d of %d states, and a mode that it loses does not die out: no estimator works without what is unplugged.", o.Rank, n), theme.Trouble)
	case o.Rank < n:
		p.prose(2, fmt.Sprintf("What is left sees %d of %d states. The modes that it loses die out by themselves, as slowly as they do.", o.Rank, n), theme.Text)
	default:
		p.prose(2, "What is left sees every state; a new design works without what is unplugged.", theme.Text)
	}
	p.floors(all, rest)
	p.together()
}

// together says what this design does when several sensors fail at once.
func (p *sensorPage) together() {
	var lost []int
	for j, on := range p.f.Plugged {
		if !on {
			lost = append(lost, j)
		}
	}
	if len(lost) < 2 || p.f.Design == nil {
		return
	}
	for _, s := range p.f.Design.SensorSets {
		if !slices.Equal(s.Lost, lost) {
			continue
		}
		if s.Stable {
			p.prose(2, "This design stays stable without all of them.", theme.Text)
		} else {
			p.prose(2, "This design is UNSTABLE without all of them.", theme.Trouble)
		}
	}
}

func unstableAmong(list []complex128, period float64) bool {
	for _, v := range list {
		if period > 0 && cmplx.Abs(v) >= 1-1e-12 || period == 0 && real(v) >= -1e-12 {
			return true
		}
	}
	return false
}

// floors compares the least possible noise with and without.
func (p *sensorPage) floors(all, rest *Seen) {
	if all.Err != nil || all.Analysis.Floor == nil {
		return
	}
	if rest.Analysis.Floor == nil {
		p.prose(2, "No floor is left: "+rest.Analysis.FloorReason, theme.Text)
		return
	}
	var words []string
	for i, name := range all.Model.StateNames {
		k := slices.Index(rest.Model.StateNames, name)
		if role(all.Model, i) == estimator.DelayRegister || k < 0 || !(all.Analysis.Floor.Std[i] > 0) {
			continue
		}
		if ratio := rest.Analysis.Floor.Std[k] / all.Analysis.Floor.Std[i]; ratio >= 1.005 {
			words = append(words, fmt.Sprintf("%s x %.3g", name, ratio))
		}
	}
	if words == nil {
		words = []string{"nothing of note"}
	}
	p.prose(2, "The least possible noise grows: "+strings.Join(words, ", ")+".", theme.Text)
}

func role(m *estimator.Model, i int) estimator.Role {
	if i < len(m.Roles) {
		return m.Roles[i]
	}
	return estimator.PlantState
}
