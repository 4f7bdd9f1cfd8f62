package screen

import (
	"maps"

	"github.com/charmbracelet/bubbles/key"
	tea "github.com/charmbracelet/bubbletea"

	"polewright/ui/views"
)

// truth is a real plant that stands in for the scenario's own; its zero value is
// the scenario's own.
type truth struct {
	name    string
	factors map[string]float64
}

// openStress shows the worst within the tolerances.
func (m *Model) openStress() tea.Cmd {
	if m.cfg.Study == nil {
		m.refuse("the worst case is not available here")
		return nil
	}
	return m.openView(stressView)
}

func (m *Model) stress() *views.Stress {
	s := m.research.stress
	s.Controlled = m.cfg.Work.Bench.Model.K != nil
	s.Truth = m.truth.name
	s.Older = s.Older || s.Envelope != nil && !same(m.research.stressOf, m.now.design) && m.now.design != nil
	return &s
}

func (m *Model) stressKey(s stroke) tea.Cmd {
	if key.Matches(s, m.keys.Choose) {
		return m.toggleTruth()
	}
	return nil
}

// toggleTruth runs the scenario on the hardest case, or on its own real plant
// again.
func (m *Model) toggleTruth() tea.Cmd {
	if m.truth.factors != nil {
		m.truth = truth{}
		m.say("the traces run on the scenario's own real plant again")
		return m.onOtherPlant()
	}
	e := m.research.stress.Envelope
	if e == nil {
		m.refuse("the study is not done yet")
		return nil
	}
	worst, ok := e.Stress()
	if !ok {
		m.refuse("no case differs from the model: there is no harder real plant to run on")
		return nil
	}
	m.truth = truth{views.CaseText(worst), maps.Clone(worst.Truth())}
	m.say("the traces run on the hardest case now; Enter again goes back")
	return m.onOtherPlant()
}

// onOtherPlant asks for the run of the design in hand anew.
func (m *Model) onOtherPlant() tea.Cmd {
	m.keepWanted = false
	m.now.run, m.now.traced = nil, false
	m.dirty = everything
	return tea.Batch(m.ask(), m.rest())
}
