package screen

import (
	"fmt"

	"github.com/charmbracelet/bubbles/key"
	tea "github.com/charmbracelet/bubbletea"
	"gonum.org/v1/gonum/mat"

	"polewright/scenarios"
	"polewright/ui/desk"
	"polewright/ui/plane/targets"
	"polewright/ui/readings"
	"polewright/ui/views"
)

// keepWhenReady keeps the design in hand, at once or as soon as its figures are
// there.
func (m *Model) keepWhenReady() tea.Cmd {
	switch {
	case m.current != "":
		m.say("this design is kept as " + m.current + " already")
	case m.truth.factors != nil:
		m.refuse("the traces run on a harder real plant: w, Enter go back, then a keeps")
	case m.failure != nil:
		m.refuse("there is no design to keep: " + m.failure.Error())
	case m.freeLetter() == "":
		m.refuse("all letters A to Z are taken; v and x delete a candidate")
	case !m.now.traced:
		m.keepWanted = true
		m.say("kept as soon as its figures are there")
	default:
		m.keep()
	}
	return nil
}

func (m *Model) freeLetter() string {
	for c := 'A'; c <= 'Z'; c++ {
		free := true
		for _, k := range m.candidates {
			free = free && k.Letter != string(c)
		}
		if free {
			return string(c)
		}
	}
	return ""
}

// keep adds the design in hand, whose figures are all there, to the candidates.
func (m *Model) keep() {
	letter := m.freeLetter()
	if letter == "" {
		return
	}
	c := desk.Candidate{Letter: letter, Form: m.now.form, Method: m.now.method, Poles: m.now.set.Poles(),
		Design: m.now.design, Limits: results(m.now.limits), Run: m.now.run}
	m.candidates = append(m.candidates[:len(m.candidates):len(m.candidates)], c)
	m.current = letter
	m.revision++
	m.dirty |= headerRegion | statusRegion
	m.say("kept as " + letter + "; v shows the candidates side by side")
	m.studyDue()
}

// recall takes a candidate into the hand, with its stored gain.
func (m *Model) recall(i int) tea.Cmd {
	if i < 0 || i >= len(m.candidates) {
		m.refuse(fmt.Sprintf("there is no candidate %d yet; a keeps this design", i+1))
		return nil
	}
	c := m.candidates[i]
	set, err := m.candidateSet(c)
	if err != nil {
		m.refuse("candidate " + c.Letter + ": " + err.Error())
		return nil
	}
	next := m.now
	next.set, next.form, next.method = set, c.Form, c.Method
	next.held = min(next.held, max(len(set.List)-1, 0))
	next.gain, next.gainCurrent = nil, nil
	if c.Design != nil {
		next.gain, next.gainCurrent = c.Design.Gain, c.Design.GainCurrent
	}
	cmd := m.change(next, "")
	m.current = c.Letter
	if c.Design != nil {
		m.shown, m.shownGen = c.Design, m.gen
		m.limits = nil
		for _, l := range c.Limits {
			m.limits = append(m.limits, readings.Limit{LimitResult: l})
		}
		if c.Run != nil && m.truth.factors == nil {
			m.run, m.runGen = c.Run, m.gen
			m.newRun()
			m.dirty |= tracesRegion
		}
	}
	m.say("candidate " + c.Letter)
	m.follow()
	return cmd
}

// candidateSet are the targets of a candidate: what was wanted, or for a gain
// found elsewhere what it reaches.
func (m *Model) candidateSet(c desk.Candidate) (targets.Set, error) {
	list := c.Poles
	if list == nil && c.Design != nil {
		list = m.movable(c.Design.Reached)
	}
	return targets.From(list, m.period())
}

func (m *Model) openView(v view) tea.Cmd {
	m.open, m.scroll, m.cursor = v, 0, 0
	m.dirty |= viewRegion | statusRegion
	m.studyDue()
	return nil
}

// closeView leaves what is open.
func (m *Model) closeView() {
	m.open = none
	m.dirty = everything
	m.stopStudy()
}

// opener is the key that opens a view, and closes it again.
func (m *Model) opener() key.Binding {
	switch m.open {
	case helpView:
		return m.keys.Help
	case compareView:
		return m.keys.Compare
	case readingsView:
		return m.keys.Readings
	case tradeoffView:
		return m.keys.Tradeoff
	case sensorsView:
		return m.keys.Sensors
	case stressView:
		return m.keys.Stress
	case replayView:
		return m.keys.Log
	}
	return key.Binding{}
}

// keptAs is the letter of the candidate with the gain in hand, empty for none. What
// rounding does to a gain that is reached on another way makes no other design.
func (m *Model) keptAs() string {
	gain, current := m.now.gain, m.now.gainCurrent
	if d := m.now.design; d != nil {
		gain, current = d.Gain, d.GainCurrent
	}
	for _, c := range m.candidates {
		d := c.Design
		if d != nil && gain != nil && c.Form == m.now.form && c.Method == m.now.method && sameGain(d.Gain, gain) && sameGain(d.GainCurrent, current) {
			return c.Letter
		}
	}
	return ""
}

// sameGain says that two gains differ by at most 1e-9 of their norm.
func sameGain(a, b *mat.Dense) bool {
	if a == nil || b == nil {
		return a == b
	}
	n, p := a.Dims()
	if r, c := b.Dims(); r != n || c != p {
		return false
	}
	var d mat.Dense
	d.Sub(a, b)
	return mat.Norm(&d, 2) <= 1e-9*mat.Norm(a, 2)
}

// columns are the candidates and, where it is none of them, the design in hand.
func (m *Model) columns() []views.Column {
	var out []views.Column
	for _, c := range m.candidates {
		set, err := m.candidateSet(c)
		if err != nil {
			set = targets.Set{}
		}
		name := c.Letter
		if c.Letter == m.current {
			name += ", in hand"
		}
		out = append(out, views.Column{Name: name, Poles: set, Form: c.Form, Design: c.Design, Limits: c.Limits})
	}
	if m.current == "" && m.shown != nil && len(out) > 0 {
		out = append(out, views.Column{Name: "in hand", Poles: m.now.set, Form: m.now.form, Design: m.shown, Limits: results(m.limits)})
	}
	return out
}

func results(list []readings.Limit) []scenarios.LimitResult {
	var out []scenarios.LimitResult
	for _, l := range list {
		out = append(out, l.LimitResult)
	}
	return out
}

type stroke string

func (s stroke) String() string { return string(s) }

// viewKey gives a key to the open view.
func (m *Model) viewKey(name string) tea.Cmd {
	k, s := m.keys, stroke(name)
	m.dirty |= viewRegion | statusRegion
	m.say("")
	page := max(m.lay.body-2, 1)
	switch {
	case key.Matches(s, k.Leave, k.Close, m.opener()):
		m.closeView()
	case key.Matches(s, k.ViewUp):
		m.scroll--
	case key.Matches(s, k.ViewDown):
		m.scroll++
	case key.Matches(s, k.PageUp):
		m.scroll -= page
	case key.Matches(s, k.PageDown):
		m.scroll += page
	case m.open == compareView:
		return m.compareKey(s)
	case m.open == tradeoffView:
		return m.tradeoffKey(s)
	case m.open == sensorsView:
		return m.sensorsKey(s)
	case m.open == stressView:
		return m.stressKey(s)
	case m.open == replayView:
		return m.replayKey(s)
	}
	return nil
}

func (m *Model) compareKey(s stroke) tea.Cmd {
	k, n := m.keys, len(m.columns())
	switch {
	case n == 0:
	case key.Matches(s, k.ViewLeft):
		m.cursor = max(m.cursor-1, 0)
	case key.Matches(s, k.ViewRight):
		m.cursor = min(m.cursor+1, n-1)
	case m.cursor >= len(m.candidates): // the design in hand
	case key.Matches(s, k.Choose):
		m.open = none
		m.dirty |= everything
		return m.recall(m.cursor)
	case key.Matches(s, k.Delete):
		m.deleteCandidate()
	}
	return nil
}

func (m *Model) deleteCandidate() {
	c := m.candidates[m.cursor]
	m.question = &question{
		text: "delete candidate " + c.Letter + "?  y delete   n keep",
		choices: map[string]func(m *Model) tea.Cmd{"n": stay, "y": func(m *Model) tea.Cmd {
			list := append([]desk.Candidate(nil), m.candidates[:m.cursor]...)
			m.candidates = append(list, m.candidates[m.cursor+1:]...)
			if m.current == c.Letter {
				m.current = ""
			}
			m.cursor = max(min(m.cursor, len(m.columns())-1), 0)
			m.revision++
			m.dirty |= everything
			m.say("candidate " + c.Letter + " is deleted")
			return nil
		}},
	}
}
