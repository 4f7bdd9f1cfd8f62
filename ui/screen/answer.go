package screen

import (
	"time"

	tea "github.com/charmbracelet/bubbletea"

	"polewright/estimator/poles"
	"polewright/scenarios"
	"polewright/ui/desk"
	"polewright/ui/plane/targets"
	"polewright/ui/readings"
	"polewright/ui/traces"
)

// request is what to ask for the design in hand. A gain that is known is judged
// as it stands, nothing is optimised anew behind the user's back.
func (m *Model) request() desk.Request {
	r := desk.Request{Gen: m.gen, Form: m.now.form, Method: m.now.method, Gain: m.now.gain, GainCurrent: m.now.gainCurrent, Truth: m.truth.factors}
	if m.now.design != nil {
		r.Gain, r.GainCurrent = m.now.design.Gain, m.now.design.GainCurrent
	}
	if len(m.now.set.List) > 0 {
		r.Poles = m.now.set.Poles()
	}
	if r.Gain != nil {
		return r
	}
	if m.shown != nil && m.shown.Stable && m.shown.Form == r.Form && m.shown.Method == r.Method {
		r.From = m.shown
	}
	return r
}

// answer takes what is not older than what is shown.
func (m *Model) answer(a *desk.Answer) tea.Cmd {
	if a.Gen < m.shownGen || a.Gen > m.gen {
		return nil
	}
	if a.Err != nil {
		if a.Gen == m.gen && m.refit(a) {
			return m.ask()
		}
		if a.Gen == m.gen {
			m.failure, m.pending, m.keepWanted = a.Err, time.Time{}, false
			m.refuse("no design: " + a.Err.Error())
			if m.saveWanted != nil {
				m.saveWanted = nil
				m.refuse("not saved, there is no design: " + a.Err.Error())
			}
			m.dirty |= readingsRegion | tracesRegion
		}
		return nil
	}
	if a.Design == nil {
		return nil
	}
	m.shown, m.shownGen = a.Design, a.Gen
	m.limits = mergeLimits(m.limits, a)
	first := m.analysis == nil
	if a.Analysis != nil && a.Analysis != m.analysis {
		m.analysis = a.Analysis
		m.dirty |= planeRegion
	}
	m.adopt(a)
	m.dirty |= readingsRegion
	if a.Stage >= desk.Traced {
		m.run, m.runGen = a.Run, a.Gen
		m.newRun()
		m.dirty |= tracesRegion
	}
	if a.Gen == m.gen {
		m.upToDate(a)
	} else {
		m.pending = m.cfg.Now()
	}
	if first && m.half == 0 {
		m.fitPlane()
		m.dirty |= planeRegion
	}
	return m.saveDue()
}

// upToDate notes that the newest request is answered, as far as the stage goes.
func (m *Model) upToDate(a *desk.Answer) {
	if m.late {
		m.dirty |= tracesRegion
	}
	m.late, m.failure = false, nil
	if a.Stage >= desk.Traced {
		m.pending = time.Time{}
	}
	m.now.design, m.now.limits, m.now.run, m.now.traced = a.Design, m.limits, a.Run, a.Stage >= desk.Traced
	m.now.on = m.truth.name
	if m.current == "" {
		if m.current = m.keptAs(); m.current != "" {
			m.dirty |= headerRegion
			if m.keepWanted {
				m.keepWanted = false
				m.say("this design is kept as " + m.current + " already")
			}
		}
	}
	if a.Better != nil {
		m.offerBetter(a)
	}
	m.studyDue()
	if m.keepWanted && a.Stage >= desk.Traced {
		m.keepWanted = false
		m.keep()
	}
}

// mergeLimits keeps a row per limit: one that the answer does not judge yet keeps
// its value, marked as older.
func mergeLimits(old []readings.Limit, a *desk.Answer) []readings.Limit {
	var out []readings.Limit
	if a.Stage >= desk.Traced || len(old) == 0 {
		for _, l := range a.Limits {
			out = append(out, readings.Limit{LimitResult: l})
		}
		return out
	}
	fresh := map[string]scenarios.LimitResult{}
	for _, l := range a.Limits {
		fresh[l.Name] = l
	}
	for _, l := range old {
		if f, ok := fresh[l.Name]; ok {
			out = append(out, readings.Limit{LimitResult: f})
		} else {
			l.Older = true
			out = append(out, l)
		}
	}
	return out
}

// adopt takes over what only the background knows: the first targets, the fixed
// poles, the controller's.
func (m *Model) adopt(a *desk.Answer) {
	if a.Design.Form == m.now.form {
		m.takeFixed(a.Fixed)
	}
	if l := a.Design.Loop; l != nil && m.controller == nil {
		m.controller = poles.Without(l.Poles, a.Design.Reached)
		m.dirty |= planeRegion
	}
	if a.Gen != m.gen {
		return
	}
	if list := m.movable(m.now.set.Poles()); len(list) < m.now.set.Count() {
		if set, err := targets.From(list, m.period()); err == nil {
			m.now.set, m.now.held = set, min(m.now.held, max(len(set.List)-1, 0))
		}
	}
	if len(m.now.set.List) == 0 {
		list := a.Design.Wanted
		if list == nil {
			list = m.movable(a.Design.Reached)
		}
		if set, err := targets.From(list, m.period()); err == nil {
			m.now.set = set
			m.now.held = m.firstHeld()
			m.dirty |= planeRegion
		}
	}
}

// fixedPoles are the fixed poles, those of pairs twice.
func (m *Model) fixedPoles() []complex128 {
	return targets.Set{List: m.fixed, Period: m.period()}.Poles()
}

// movable leaves the fixed poles out of a list that has all of them.
func (m *Model) movable(list []complex128) []complex128 {
	fixed := m.fixedPoles()
	n, _, _ := m.cfg.Work.Bench.Model.Dims()
	if len(fixed) == 0 || len(list) < n {
		return list
	}
	return poles.Without(list, fixed)
}

// firstHeld is the pole to start with: the one the session held, else the first
// that has a place in the plane shown.
func (m *Model) firstHeld() int {
	if m.cfg.Work.View.Selected == 0 {
		for i, t := range m.now.set.List {
			if _, ok := targets.Shown(t.At, m.plane, m.period()); ok {
				return i
			}
		}
	}
	return min(max(m.cfg.Work.View.Selected, 0), max(len(m.now.set.List)-1, 0))
}

// newRun gives every trace that is looked at an axis, the first time; later runs
// keep it while it serves, and until the hands rest in any case. An axis that a
// run without bounds asked for goes with that run.
func (m *Model) newRun() {
	wild := m.run != nil && m.run.Diverged || m.shown != nil && !m.shown.Stable
	loose := m.wildAxes && !wild || !m.resting
	for _, key := range m.panels() {
		curves := traces.Curves(m.run, key.mode, key.index)
		axis, ok := m.axes[key]
		if curves != nil && (!ok || loose && !axis.Serves(curves)) {
			m.axes[key] = traces.Axes(curves)
		}
	}
	if m.run != nil {
		m.wildAxes = wild
	}
}

// settleAxes fits the axes that no longer serve.
func (m *Model) settleAxes() {
	for _, key := range m.panels() {
		curves := traces.Curves(m.run, key.mode, key.index)
		if axis, ok := m.axes[key]; curves != nil && (!ok || !axis.Serves(curves)) {
			m.axes[key] = traces.Axes(curves)
		}
	}
}

// panels are the traces in sight.
func (m *Model) panels() []axisKey {
	n, _, p := m.cfg.Work.Bench.Model.Dims()
	if m.mode == traces.Innovation {
		n = p
	}
	var out []axisKey
	for k := range min(m.lay.panels, n) {
		out = append(out, axisKey{m.mode, (m.trace + k) % n})
	}
	return out
}
