package views

import (
	"fmt"
	"math"
	"math/cmplx"
	"slices"
	"strings"

	"polewright/estimator"
	"polewright/ui/canvas"
	"polewright/ui/plane/targets"
	"polewright/ui/readings"
	"polewright/ui/theme"
)

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
	word, sigma, parts := 22, 42, 44
	if p.narrow() {
		word, sigma, parts = 19, 36, 38
	}
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
		if own := owners(r, seen.Model); len(own) > 1 || len(own) == 1 && (r.count > 1 || !slices.Equal(lines, []string{"1.00 " + own[0]})) {
			word := "mode of "
			if len(own) > 1 {
				word = "modes of "
			}
			lines = append(lines, canvas.Wrap(word+strings.Join(own, ", "), p.w-parts-1)...)
		}
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

// owners are the unknown states, and where several modes share a place all states,
// that no other state drives or that drive no other: the mode at their diagonal
// entry is their own.
func owners(r seenRow, m *estimator.Model) []string {
	var out []string
	n, _, _ := m.Dims()
	for i := range n {
		own := complex(m.A.At(i, i), 0)
		if cmplx.Abs(own-r.mode.Eigenvalue) > 1e-9*max(cmplx.Abs(own), 1) || role(m, i) == estimator.DelayRegister {
			continue
		}
		driven, drives := false, false
		for j := range n {
			driven = driven || j != i && m.A.At(i, j) != 0
			drives = drives || j != i && m.A.At(j, i) != 0
		}
		if (!driven || !drives) && (r.count > 1 || role(m, i) == estimator.UnknownState) {
			out = append(out, m.StateNames[i])
		}
	}
	return out
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
