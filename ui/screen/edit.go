package screen

import (
	"math"
	"time"

	tea "github.com/charmbracelet/bubbletea"

	"polewright/ui/plane/targets"
)

// A key that comes again within firstRepeat is held down; once it repeats, the
// gaps are shorter. The first covers the usual delays of keyboards (250 to
// 660 ms), the second a slow link.
const (
	firstRepeat = 700 * time.Millisecond
	nextRepeat  = 300 * time.Millisecond
)

// repeated notes a move and tells whether it goes on with the one before.
func (m *Model) repeated(name string) bool {
	now := m.cfg.Now()
	limit := firstRepeat
	if m.repeats > 0 {
		limit = nextRepeat
	}
	same := name != "" && name == m.lastMove && now.Sub(m.lastMoved) <= limit
	m.lastMove, m.lastMoved = name, now
	if same {
		m.repeats++
	} else {
		m.repeats = 0
	}
	return same
}

// change puts a new state in hand and asks for its figures. A move with the name
// of a key goes on with the same step of undo while that key is held.
func (m *Model) change(next state, held string) tea.Cmd {
	if !m.repeated(held) {
		m.past = m.past.push(m.now)
	}
	m.future = nil
	next.design, next.run, next.limits, next.traced, next.better = nil, nil, nil, false, nil
	m.now = next
	return m.changed()
}

// changed follows any change of the design in hand.
func (m *Model) changed() tea.Cmd {
	m.current, m.keepWanted = "", false
	m.revision++
	m.dirty |= planeRegion | readingsRegion | headerRegion
	return tea.Batch(m.ask(), m.rest())
}

// move moves what is held by cells.
func (m *Model) move(name string, dx, dy int) tea.Cmd {
	_, fixed, ok := m.heldTarget()
	switch {
	case !ok:
		m.refuse("no poles yet: their first figures are on the way")
		return nil
	case fixed:
		m.refuse("this pole stays: the sensors do not see its mode, so no gain moves it")
		return nil
	}
	if name == m.stopped && m.cfg.Now().Sub(m.stoppedAt) <= firstRepeat {
		m.stoppedAt = m.cfg.Now()
		m.say("on the axis: let go, then lift the two poles off it again")
		return nil
	}
	m.stopped = ""
	set, held, event, err := m.now.set.Move(m.now.held, dx, dy, m.window.Grid)
	if err != nil {
		m.refuse(err.Error())
		return nil
	}
	next := m.now
	next.set, next.held, next.gain, next.gainCurrent = set, held, nil, nil
	switch event {
	case targets.Parted:
		m.say("the pair reached the axis: two real poles, one of them in your hand")
	case targets.PartedAtLimit:
		m.say("the pair reached the sampling limit: two poles on it, one of them in your hand")
	case targets.Joined:
		m.say("two real poles became a pair")
	}
	if event == targets.Parted || event == targets.PartedAtLimit {
		m.stopped, m.stoppedAt = name, m.cfg.Now()
	}
	if event != targets.Moved { // a step of its own, and of the keys after it
		name = ""
	}
	cmd := m.change(next, name)
	m.follow()
	return cmd
}

// follow keeps what moved in sight, and warns of unstable places.
func (m *Model) follow() {
	if p, ok := m.heldPlace(); ok && !m.window.Inside(p) {
		m.window = m.window.Show(p)
		if m.half > 0 {
			m.half = m.window.Half()
		}
		m.say("zoomed out to keep the pole in sight; 0 fits")
	}
	t, _, _ := m.heldTarget()
	if unstable(t.At, m.period()) {
		m.refuse("an estimator with a pole here is unstable")
	}
}

func unstable(own complex128, period float64) bool {
	if period > 0 {
		return math.Hypot(real(own), imag(own)) >= 1
	}
	return real(own) >= 0
}

func (m *Model) scale(name string, factor float64) tea.Cmd {
	if len(m.now.set.List) == 0 {
		m.refuse("no poles yet")
		return nil
	}
	set, err := m.now.set.Scale(factor)
	if err != nil {
		m.refuse(err.Error())
		return nil
	}
	next := m.now
	next.set, next.gain, next.gainCurrent = set, nil, nil
	cmd := m.change(next, name)
	m.follow()
	return cmd
}

// replaceAll puts a whole list of poles in hand.
func (m *Model) replaceAll(list []complex128) (state, error) {
	set, err := targets.From(m.movable(list), m.period())
	if err != nil {
		return m.now, err
	}
	next := m.now
	next.set, next.gain, next.gainCurrent = set, nil, nil
	next.held = min(next.held, max(len(set.List)-1, 0))
	return next, nil
}

// snapToFloor takes the floor's poles with the floor's own gain.
func (m *Model) snapToFloor() tea.Cmd {
	switch {
	case m.analysis == nil:
		m.refuse("the floor is not known yet")
		return nil
	case m.analysis.Floor == nil:
		m.refuse("there is no floor: " + m.analysis.FloorReason)
		return nil
	}
	next, err := m.replaceAll(m.analysis.Floor.Poles)
	if err != nil {
		m.refuse(err.Error())
		return nil
	}
	next.gain, next.gainCurrent = m.analysis.Floor.Gain, nil
	m.say("on the floor: poles and gain of the best linear estimator for this noise")
	cmd := m.change(next, "")
	m.follow()
	return cmd
}

func (m *Model) undo() tea.Cmd {
	if m.past == nil {
		m.refuse("nothing to undo")
		return nil
	}
	m.future = m.future.push(m.now)
	m.now, m.past = m.past.state, m.past.next
	return m.restore()
}

func (m *Model) redo() tea.Cmd {
	if m.future == nil {
		m.refuse("nothing to redo")
		return nil
	}
	m.past = m.past.push(m.now)
	m.now, m.future = m.future.state, m.future.next
	return m.restore()
}

// restore shows a state that was in hand before, with its stored figures where
// all are there; else it asks for them, with the stored gain if there is one.
func (m *Model) restore() tea.Cmd {
	m.now.held = min(m.now.held, max(m.holdable()-1, 0))
	if m.now.on != m.truth.name { // its run was on another real plant
		m.now.run, m.now.traced = nil, false
	}
	cmd := m.changed()
	m.current = m.keptAs()
	if m.now.design == nil {
		return cmd
	}
	m.shown, m.shownGen, m.limits = m.now.design, m.gen, m.now.limits
	if m.now.run != nil {
		m.run, m.runGen = m.now.run, m.gen
		m.newRun()
		m.dirty |= tracesRegion
	}
	return cmd
}
