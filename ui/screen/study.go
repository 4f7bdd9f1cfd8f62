package screen

import (
	"slices"

	tea "github.com/charmbracelet/bubbletea"
	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/ui/study"
	"polewright/ui/views"
)

// StudyMsg brings what the background studied, as far as it has come.
type StudyMsg struct{ study.Answer }

// research is what the background studies beside the design in hand.
type research struct {
	gen  uint64
	kind study.Kind        // that runs; None at rest
	of   *estimator.Design // that it studies

	trade    views.Tradeoff
	tradeOf  *estimator.Design
	stress   views.Stress
	stressOf *estimator.Design
	replay   replaying
	hunt     *hunt
	offer    *offer
	sensing  sensing
}

// studied is the kind of study that the open view shows.
func (m *Model) studied() study.Kind {
	switch m.open {
	case tradeoffView:
		return study.Tradeoff
	case stressView:
		return study.Tolerances
	case replayView:
		return study.Replay
	}
	return study.None
}

// studyDue starts the study that the open view shows, unless it is there, on its
// way, or a search would have to give way.
func (m *Model) studyDue() {
	kind, d := m.studied(), m.now.design
	if kind == study.None || m.cfg.Study == nil || d == nil || m.research.hunt != nil {
		return
	}
	if m.research.kind == kind && same(m.research.of, d) {
		return
	}
	switch {
	case kind == study.Tradeoff && !same(m.research.tradeOf, d):
		m.research.trade.Running, m.research.trade.Trouble = true, ""
	case kind == study.Tolerances && !same(m.research.stressOf, d):
		m.research.stress.Older = m.research.stress.Envelope != nil
		m.research.stress.Tried, m.research.stress.All, m.research.stress.Trouble = 0, 0, ""
	case kind == study.Replay && m.replayDue(d):
		m.askReplay(d)
		return
	default:
		return
	}
	m.askStudy(study.Request{Kind: kind, Design: d})
}

// same tells whether two designs give the same study.
func same(a, b *estimator.Design) bool {
	if a == b || a == nil || b == nil {
		return a == b
	}
	return a.Form == b.Form && a.Method == b.Method && slices.Equal(a.Wanted, b.Wanted) &&
		a.Gain != nil && b.Gain != nil && mat.Equal(a.Gain, b.Gain)
}

func (m *Model) askStudy(r study.Request) {
	if m.research.trade.Running && r.Kind != study.Tradeoff { // half of it is not kept
		m.research.trade.Running, m.research.tradeOf = false, nil
	}
	m.research.gen++
	r.Gen = m.research.gen
	m.research.kind, m.research.of = r.Kind, r.Design
	m.cfg.Study(r)
}

// stopStudy stops what runs for a view that is left; a search goes on.
func (m *Model) stopStudy() {
	switch m.research.kind {
	case study.Tradeoff, study.Tolerances, study.Replay:
		m.askStudy(study.Request{Kind: study.None})
	}
}

// studyAnswer takes what belongs to the newest study.
func (m *Model) studyAnswer(a *study.Answer) tea.Cmd {
	if a.Gen != m.research.gen || a.Kind != m.research.kind {
		return nil
	}
	switch a.Kind {
	case study.Tradeoff:
		m.curves(a)
	case study.Tolerances:
		m.envelope(a)
	case study.Replay:
		m.replayed(a)
	case study.Fastest, study.Quietest:
		m.hunted(a)
	}
	if a.Done {
		m.research.kind = study.None
		m.studyDue() // what had to wait for a search
	}
	if m.open != none {
		m.dirty |= viewRegion
	}
	return nil
}

// curves takes the trade-off as far as it has come.
func (m *Model) curves(a *study.Answer) {
	t := &m.research.trade
	fresh := !same(m.research.tradeOf, m.research.of)
	if a.Scaling != nil {
		t.Scaling = a.Scaling
	}
	if a.Family != nil {
		t.Family = a.Family
	}
	if fresh {
		if a.Family == nil {
			t.Family = nil
		}
		t.At = views.Unchanged(t.Points())
		m.research.tradeOf = m.research.of
	}
	if t.At < 0 {
		t.At = views.Unchanged(t.Points())
	}
	t.Running = !a.Done
	switch {
	case a.Err != nil:
		t.Trouble = "no curve: " + a.Err.Error()
	case m.analysis != nil && m.analysis.Floor == nil:
		t.Trouble = "There is nothing to hold the noise against: " + m.analysis.FloorReason
	}
}

func (m *Model) envelope(a *study.Answer) {
	s := &m.research.stress
	s.Tried, s.All = a.Tried, a.All
	if !a.Done {
		return
	}
	m.research.stressOf, s.Older = m.research.of, false
	if s.Envelope = a.Envelope; a.Err != nil {
		s.Trouble = a.Err.Error()
	}
}

// begun asks for the first design, and for what a view shows that was open when
// the session was saved.
func (m *Model) begun() tea.Cmd {
	if m.open == sensorsView {
		return tea.Batch(m.ask(), m.openSensors())
	}
	return m.ask()
}
