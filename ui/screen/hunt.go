package screen

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	tea "github.com/charmbracelet/bubbletea"

	"polewright/estimator"
	"polewright/scenarios"
	"polewright/scenarios/seek"
	"polewright/ui/study"
)

// hunt is a search for poles in the background.
type hunt struct {
	kind       study.Kind
	within     float64 // s, of the quietest
	tried, all int
	best       *estimator.Design
}

// offer is what a search found. It waits until it is taken or left.
type offer struct {
	design *estimator.Design
	text   string
}

func (m *Model) seekFastest() tea.Cmd {
	switch {
	case m.cfg.Study == nil:
		m.refuse("searching is not available here")
	case !m.cfg.Work.Bench.Scenario.Limits.Any():
		m.refuse("no limits, so faster is always possible: --scenario names one that has some")
	default:
		m.seek(&hunt{kind: study.Fastest})
	}
	return nil
}

// seekQuietest asks for the settle time first.
func (m *Model) seekQuietest() tea.Cmd {
	switch {
	case m.cfg.Study == nil:
		m.refuse("searching is not available here")
		return nil
	case m.analysis != nil && m.analysis.Floor == nil:
		m.refuse("there is no floor to hold the noise against: " + m.analysis.FloorReason)
		return nil
	}
	within := ""
	if limit := m.cfg.Work.Bench.Scenario.Limits.Settle; limit != nil {
		within = strconv.FormatFloat(*limit, 'g', -1, 64)
	} else if d := m.now.design; d != nil && d.Transient.Settle > 0 {
		within = strconv.FormatFloat(d.Transient.Settle, 'g', 4, 64)
	}
	return m.openPrompt("quietest poles that settle within, s:", within, func(m *Model, text string) (tea.Cmd, error) {
		v, err := strconv.ParseFloat(strings.TrimSpace(strings.TrimSuffix(text, "s")), 64)
		if err != nil || !(v > 0) || math.IsInf(v, 0) {
			return nil, errors.New("a settle time in seconds is needed, for instance 0.35")
		}
		m.seek(&hunt{kind: study.Quietest, within: v})
		return nil, nil
	})
}

func (m *Model) seek(h *hunt) {
	if m.now.design == nil {
		m.refuse("there is no design to start from yet")
		return
	}
	m.research.hunt, m.research.offer = h, nil
	m.askStudy(study.Request{Kind: h.kind, Design: m.now.design, SettleMax: h.within})
	m.dirty |= statusRegion
}

// hunted takes what a search has come to.
func (m *Model) hunted(a *study.Answer) {
	old := m.research.hunt
	if old == nil {
		return
	}
	h := *old
	if h.tried, h.all = a.Tried, a.All; a.Best != nil {
		h.best = a.Best
	}
	m.research.hunt = &h
	m.dirty |= statusRegion
	if !a.Done {
		return
	}
	m.research.hunt = nil
	switch {
	case a.Err != nil:
		m.refuse("the search found nothing: " + a.Err.Error())
	case a.Found == nil || a.Found.Design == nil || !a.Found.Better:
		m.say("the search found nothing better than what was in hand")
	default:
		m.research.offer = &offer{a.Found.Design, found(h.kind, a.Found)}
		m.say("")
	}
}

// found says what a search ended with.
func found(kind study.Kind, r *seek.Result) string {
	d := r.Design
	text := fmt.Sprintf("found: settles in %.3g s, %.2f x floor", d.Transient.Settle, d.Noise.OverFloorRMS)
	if math.IsNaN(d.Noise.OverFloorRMS) {
		text = fmt.Sprintf("found: settles in %.3g s", d.Transient.Settle)
	}
	switch {
	case r.Met && len(r.Limits) > 0:
		text += ", limits met"
	case len(broken(r.Limits)) > 0:
		text += "; still over: " + strings.Join(broken(r.Limits), ", ")
	case !r.Met && kind == study.Quietest:
		text += "; not as fast as asked"
	}
	return text
}

func broken(list []scenarios.LimitResult) []string {
	var out []string
	for _, l := range list {
		if !l.Met {
			words := strings.FieldsFunc(l.Name, func(r rune) bool { return r == '_' || r == ' ' })
			words = slices.DeleteFunc(words, func(w string) bool { return w == "s" || w == "deg" || w == "max" || w == "min" })
			out = append(out, strings.Join(words, " "))
		}
	}
	return out
}

// searching is what the status line says of a search or of what it found.
func (m *Model) searching() string {
	if o := m.research.offer; o != nil {
		return o.text
	}
	h := m.research.hunt
	if h == nil {
		return ""
	}
	text := "seeking the fastest"
	if h.kind == study.Quietest {
		text = fmt.Sprintf("seeking the quietest within %.3g s", h.within)
	}
	if h.all > 0 {
		text += fmt.Sprintf(", %d %%", min(h.tried*100/h.all, 100))
	}
	if h.best != nil {
		text += fmt.Sprintf(": %.3g s, %.2f x floor so far", h.best.Transient.Settle, h.best.Noise.OverFloorRMS)
	}
	return text
}

// leaveSearch stops a search, or leaves what it found.
func (m *Model) leaveSearch() tea.Cmd {
	switch {
	case m.research.hunt != nil:
		best := m.research.hunt.best
		m.research.hunt = nil
		m.askStudy(study.Request{Kind: study.None})
		m.say("the search is stopped")
		if best != nil && best != m.now.design {
			m.research.offer = &offer{best, fmt.Sprintf("the best until then settles in %.3g s, %.2f x floor", best.Transient.Settle, best.Noise.OverFloorRMS)}
			m.say("")
		}
	case m.research.offer != nil:
		m.research.offer = nil
	}
	return nil
}

// takeOffer puts what a search found in hand.
func (m *Model) takeOffer() tea.Cmd {
	o := m.research.offer
	if o == nil {
		return nil
	}
	m.research.offer = nil
	return m.takeDesign(o.design, "taken")
}
