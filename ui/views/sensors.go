package views

import (
	"fmt"
	"math"
	"math/cmplx"
	"slices"
	"strings"

	"polewright/estimator"
	"polewright/ui/canvas"
	"polewright/ui/desk"
	"polewright/ui/plane/targets"
	"polewright/ui/readings"
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
		if s.Stable {
			return span{text: "this design stays stable without it", ink: theme.Faint}
		}
		return span{text: "this design is UNSTABLE without it", ink: theme.Trouble}
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

// seenRow is one mode, or several at the same place.
type seenRow struct {
	mode  estimator.Mode
	parts []complex128
	pair  bool
	count int
}

// rows gathers the modes of one place and puts the least seen first.
func (s *Seen) rows() []seenRow {
	var out []seenRow
	for i, mode := range s.Analysis.Observability.Modes {
		v := mode.Eigenvalue
		if imag(v) < 0 {
			continue
		}
		same := slices.IndexFunc(out, func(r seenRow) bool {
			return cmplx.Abs(r.mode.Eigenvalue-v) <= 1e-9*max(cmplx.Abs(v), 1) && r.mode.Observable == mode.Observable
		})
		if same >= 0 {
			out[same].count++
			continue
		}
		out = append(out, seenRow{mode, s.Parts[i], imag(v) > 0, 1})
	}
	slices.SortStableFunc(out, func(a, b seenRow) int {
		switch {
		case a.mode.Sigma < b.mode.Sigma*(1-1e-9):
			return -1
		case b.mode.Sigma < a.mode.Sigma*(1-1e-9):
			return 1
		}
		return 0
	})
	return out
}

func (p *sensorPage) modes() {
	seen := p.f.Rest
	if p.whole() {
		seen = p.f.All
	}
	switch {
	case seen == nil && p.whole():
		p.blank()
		p.row(span{x: 2, text: "looking at what the sensors see", ink: theme.Faint})
	case seen == nil:
	case seen.Err != nil && p.whole():
		p.blank()
		p.prose(2, seen.Err.Error(), theme.Trouble)
	case seen.Err != nil:
	default:
		p.table(seen)
	}
}

// table lists the modes, the least seen first.
func (p *sensorPage) table(seen *Seen) {
	n, _, _ := seen.Model.Dims()
	title := fmt.Sprintf("modes, %d of %d states seen", seen.Analysis.Observability.Rank, n)
	if !p.whole() {
		title = "modes, as " + strings.Join(seen.Model.SensorNames, " + ") + " would see them"
	}
	p.title(canvas.Cut(title, p.w, p.g.Ellipsis))
	const word, sigma, parts = 22, 42, 44
	unit := "z-plane"
	if p.f.Plane == targets.S || seen.Model.Period == 0 {
		unit = "rad/s"
	}
	p.row(span{x: 2, text: "place, " + unit, ink: theme.Faint}, span{x: word, text: "seen", ink: theme.Faint},
		span{x: sigma, text: "sigma", ink: theme.Faint, right: true}, span{x: parts, text: "moves as", ink: theme.Faint})
	rows := seen.rows()
	best := 0.0
	for _, r := range rows {
		best = max(best, r.mode.Sigma)
	}
	for _, r := range rows {
		place := p.place(r, seen.Model.Period)
		said, ink := seenWord(r.mode, best)
		lines := combination(r.parts, seen.Model, p.w-parts, p.g)
		for i := range max(len(lines), 1) {
			var row []span
			if i == 0 {
				row = append(row, span{x: 2, text: canvas.Cut(place, word-3, p.g.Ellipsis)}, span{x: word, text: said, ink: ink},
					span{x: sigma, text: sigmaText(r.mode.Sigma), right: true, ink: theme.Faint})
			}
			if i < len(lines) {
				row = append(row, span{x: parts, text: lines[i], ink: ink})
			}
			p.row(row...)
		}
	}
}

func sigmaText(v float64) string {
	if v < 1e-12 {
		return "0"
	}
	return fmt.Sprintf("%.2g", v)
}

// seenWord compares how well a mode is seen with the mode that is seen best.
func seenWord(m estimator.Mode, best float64) (string, theme.Ink) {
	switch share := m.Sigma / best; {
	case !m.Observable:
		return "NOT: fixed", theme.Trouble
	case share >= 0.3:
		return "well", theme.Text
	case share >= 0.03:
		return "less well", theme.Text
	case share >= 1e-3:
		return "weakly", theme.Text
	}
	return "hardly", theme.Text
}

func (p *sensorPage) place(r seenRow, period float64) string {
	at, ok := targets.Shown(r.mode.Eigenvalue, p.f.Plane, period)
	text := "z = 0"
	if ok {
		ref := max(math.Abs(real(at)), cmplx.Abs(at)/30)
		if cmplx.Abs(at) < 1e-9 {
			at, ref = 0, 1
		}
		text = readings.Place(at, r.pair, ref, p.g)
	}
	if r.count > 1 {
		text += fmt.Sprintf(", %d times", r.count)
	}
	return text
}

// combination spells the largest parts out, in lines of w cells. Parts that are
// not in phase have their angle against the first. Delay registers repeat another
// state's past and are left out.
func combination(parts []complex128, m *estimator.Model, w int, g *theme.Glyphs) []string {
	var order []int
	phased, held := false, 0.0
	for i := range parts {
		if role(m, i) == estimator.DelayRegister {
			continue
		}
		order = append(order, i)
		held = math.Hypot(held, cmplx.Abs(parts[i]))
	}
	switch {
	case parts == nil:
		return []string{g.Undefined}
	case held < 1e-3:
		return []string{"samples on their way"}
	}
	slices.SortStableFunc(order, func(a, b int) int {
		switch x, y := cmplx.Abs(parts[a]), cmplx.Abs(parts[b]); {
		case x > y*(1+1e-6):
			return -1
		case y > x*(1+1e-6):
			return 1
		}
		return 0
	})
	turn := cmplx.Conj(parts[order[0]]) / complex(cmplx.Abs(parts[order[0]])*held, 0)
	for _, i := range order {
		phased = phased || math.Abs(imag(parts[i]*turn)) > 0.01
	}
	const most, least = 4, 0.05
	var lines []string
	for k, i := range order {
		part := parts[i] * turn
		if k >= most || cmplx.Abs(part) < least {
			break
		}
		text := fmt.Sprintf("%.2f %s", cmplx.Abs(part), m.StateNames[i])
		switch {
		case k > 0 && phased:
			text = ", " + text + fmt.Sprintf(" at %.0f deg", cmplx.Phase(part)*180/math.Pi)
		case k > 0 && real(part) < 0:
			text = " - " + text
		case k > 0:
			text = " + " + text
		}
		if last := len(lines) - 1; last >= 0 && canvas.TextWidth(lines[last]+text) < w {
			lines[last] += text
		} else {
			if k > 0 && phased {
				lines[last] += ","
			}
			lines = append(lines, canvas.Cut(strings.TrimLeft(text, " ,"), w-1, g.Ellipsis))
		}
	}
	return lines
}

// shares shows which sensor each state's noise comes from, for the design in
// hand.
func (p *sensorPage) shares() {
	d := p.f.Design
	if d == nil || d.Noise.SensorToState == nil || d.Noise.Std == nil {
		return
	}
	m := p.f.Bench.Model
	n, _, sensors := m.Dims()
	p.title("where the noise of the design in hand comes from, std")
	name := min(max(p.w-(sensors+2)*13, 20), 40)
	width := min(max((p.w-name)/(sensors+2), 13), 20)
	fit := max((p.w-name)/width, 1)
	from := max(p.f.Cursor-fit+3, 0) // the sensor under the cursor is in sight, and two columns more
	to := min(from+max(fit-2, 1), sensors)
	head := []span{}
	column := func(k int) int { return name + (k+1)*width }
	for j := from; j < to; j++ {
		ink := theme.Faint
		if j == p.f.Cursor {
			ink = theme.Hold
		}
		head = append(head, span{x: column(j - from), text: canvas.Cut(p.names()[j], width-1, p.g.Ellipsis), ink: ink, right: true})
	}
	head = append(head, span{x: column(to - from), text: "process", ink: theme.Faint, right: true}, span{x: column(to - from + 1), text: "together", ink: theme.Faint, right: true})
	p.row(head...)
	for i := range n {
		if role(m, i) == estimator.DelayRegister {
			continue
		}
		label := readings.StateName(p.f.Bench, i)
		if u := readings.StateUnit(p.f.Bench, i); u != "" {
			label += ", " + u
		}
		row := []span{{x: 2, text: canvas.Cut(label, name-3, p.g.Ellipsis), ink: theme.Faint}}
		share, rest := Shares(m, d, i)
		ref := d.Noise.Std[i]
		for j := from; j < to; j++ {
			row = append(row, span{x: column(j - from), text: readings.Figure(share[j], ref, p.g), right: true})
		}
		row = append(row, span{x: column(to - from), text: readings.Figure(rest, ref, p.g), right: true},
			span{x: column(to - from + 1), text: readings.Figure(ref, ref, p.g), right: true})
		p.row(row...)
	}
}

// Shares splits the noise of state i of a design: the standard deviation that
// each sensor alone would leave, and the process noise alone. The latter is NaN
// where the sensors' noises are correlated, which leaves no share to each.
func Shares(m *estimator.Model, d *estimator.Design, i int) (sensor []float64, process float64) {
	_, _, p := m.Dims()
	sensor = make([]float64, p)
	total := d.Noise.Std[i] * d.Noise.Std[i]
	process = total
	correlated := false
	for j := range p {
		v := m.R.At(j, j)
		sensor[j] = d.Noise.SensorToState.At(i, j) * math.Sqrt(v)
		process -= sensor[j] * sensor[j]
		for k := range j {
			correlated = correlated || m.R.At(j, k) != 0
		}
	}
	switch {
	case correlated:
		return sensor, math.NaN()
	case process < total*1e-9: // nothing but rounding
		return sensor, 0
	}
	return sensor, math.Sqrt(process)
}
