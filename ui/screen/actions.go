package screen

import (
	"fmt"

	"github.com/charmbracelet/bubbles/key"
	tea "github.com/charmbracelet/bubbletea"

	"polewright/estimator"
	"polewright/ui/plane/targets"
	"polewright/ui/traces"
)

// action is what a key does on the screen itself.
type action struct {
	do   func(m *Model, name string) tea.Cmd
	move bool // a repeat of it belongs to the same undo step
}

// bindings joins the keys with what they do.
func (m *Model) bindings() map[string]action {
	out := map[string]action{}
	plain := func(b key.Binding, do func(m *Model) tea.Cmd) {
		for _, k := range b.Keys() {
			out[k] = action{do: func(m *Model, _ string) tea.Cmd { return do(m) }}
		}
	}
	move := func(b key.Binding, dx, dy int) {
		for _, k := range b.Keys() {
			out[k] = action{move: true, do: func(m *Model, _ string) tea.Cmd { return m.move(b.Keys()[0], dx, dy) }}
		}
	}
	k := m.keys
	move(k.Left, -1, 0)
	move(k.Right, 1, 0)
	move(k.Up, 0, 1)
	move(k.Down, 0, -1)
	move(k.FarLeft, -5, 0)
	move(k.FarRight, 5, 0)
	move(k.FarUp, 0, 5)
	move(k.FarDown, 0, -5)
	for _, s := range []struct {
		b      key.Binding
		factor float64
	}{{k.Faster, 1.05}, {k.Slower, 1 / 1.05}} {
		for _, name := range s.b.Keys() {
			out[name] = action{move: true, do: func(m *Model, name string) tea.Cmd { return m.scale(name, s.factor) }}
		}
	}
	for _, name := range k.Recall.Keys() {
		out[name] = action{do: func(m *Model, name string) tea.Cmd { return m.recall(int(name[0] - '1')) }}
	}
	plain(k.Next, func(m *Model) tea.Cmd { return m.hold(1) })
	plain(k.Previous, func(m *Model) tea.Cmd { return m.hold(-1) })
	plain(k.Place, func(m *Model) tea.Cmd { return m.askPlace() })
	plain(k.Pattern, func(m *Model) tea.Cmd { return m.askPattern() })
	plain(k.Floor, func(m *Model) tea.Cmd { return m.snapToFloor() })
	plain(k.Undo, func(m *Model) tea.Cmd { return m.undo() })
	plain(k.Redo, func(m *Model) tea.Cmd { return m.redo() })
	plain(k.Better, func(m *Model) tea.Cmd { return m.takeBetter() })
	plain(k.Form, func(m *Model) tea.Cmd { return m.toggleForm() })
	plain(k.Method, func(m *Model) tea.Cmd { return m.toggleMethod() })
	plain(k.Plane, func(m *Model) tea.Cmd { return m.togglePlane() })
	plain(k.Map, func(m *Model) tea.Cmd { return m.toggleMap() })
	plain(k.ZoomIn, func(m *Model) tea.Cmd { return m.zoom(-2) })
	plain(k.ZoomOut, func(m *Model) tea.Cmd { return m.zoom(2) })
	plain(k.Fit, func(m *Model) tea.Cmd { return m.fitAll() })
	plain(k.NextState, func(m *Model) tea.Cmd { return m.showState(1) })
	plain(k.PreviousState, func(m *Model) tea.Cmd { return m.showState(-1) })
	plain(k.Trace, func(m *Model) tea.Cmd { m.mode = m.mode.Next(); return m.showState(0) })
	plain(k.Mouse, func(m *Model) tea.Cmd { return m.toggleMouse() })
	plain(k.Band, func(m *Model) tea.Cmd { return m.toggleBand() })
	plain(k.Clock, func(m *Model) tea.Cmd { return m.toggleCursor() })
	plain(k.Keep, func(m *Model) tea.Cmd { return m.keepWhenReady() })
	plain(k.Compare, func(m *Model) tea.Cmd { return m.openView(compareView) })
	plain(k.Readings, func(m *Model) tea.Cmd { return m.openView(readingsView) })
	plain(k.Tradeoff, func(m *Model) tea.Cmd { return m.openTradeoff() })
	plain(k.Sensors, func(m *Model) tea.Cmd { return m.openSensors() })
	plain(k.Log, func(m *Model) tea.Cmd { return m.openReplay() })
	plain(k.Stress, func(m *Model) tea.Cmd { return m.openStress() })
	plain(k.Fastest, func(m *Model) tea.Cmd { return m.seekFastest() })
	plain(k.Quietest, func(m *Model) tea.Cmd { return m.seekQuietest() })
	plain(k.Choose, func(m *Model) tea.Cmd { return m.takeOffer() })
	plain(k.Leave, func(m *Model) tea.Cmd { return m.leaveSearch() })
	plain(k.Help, func(m *Model) tea.Cmd { return m.openView(helpView) })
	plain(k.Copy, func(m *Model) tea.Cmd { return m.copyGain() })
	plain(k.Save, func(m *Model) tea.Cmd { return m.save() })
	plain(k.Quit, func(m *Model) tea.Cmd { return m.quit() })
	return out
}

// hold takes the next or the previous pole into the hand.
func (m *Model) hold(step int) tea.Cmd {
	n := m.holdable()
	if n == 0 {
		m.refuse("no poles yet")
		return nil
	}
	m.now.held = ((m.now.held+step)%n + n) % n
	if _, fixed, _ := m.heldTarget(); fixed {
		m.say("fixed: the sensors do not see this mode, so no gain moves it")
	}
	m.dirty |= planeRegion | readingsRegion
	return nil
}

func (m *Model) togglePlane() tea.Cmd {
	if m.period() == 0 {
		m.refuse("this estimator is continuous: it has no z-plane without a sample period")
		return nil
	}
	if m.plane == targets.S {
		m.plane = targets.Z
	} else {
		m.plane = targets.S
	}
	m.half = 0
	m.fitPlane()
	m.dirty |= planeRegion | readingsRegion
	return nil
}

func (m *Model) zoom(steps int) tea.Cmd {
	held, ok := m.heldPlace()
	if !ok {
		held = 0
	}
	m.window = m.window.Zoom(steps, held)
	m.half = m.window.Half()
	m.say(fmt.Sprintf("one cell is %g wide and %g high", m.window.DX, m.window.DY))
	m.dirty |= planeRegion
	return nil
}

func (m *Model) fitAll() tea.Cmd {
	m.half = 0
	m.fitPlane()
	for _, k := range m.panels() {
		if curves := traces.Curves(m.run, k.mode, k.index); curves != nil {
			m.axes[k] = traces.Axes(curves)
		}
	}
	m.dirty |= planeRegion | tracesRegion
	return nil
}

func (m *Model) showState(step int) tea.Cmd {
	n, _, p := m.cfg.Work.Bench.Model.Dims()
	if m.mode == traces.Innovation {
		n = p
	}
	if step != 0 {
		m.trace = ((m.trace+step)%n + n) % n
	}
	m.newRun()
	m.dirty |= tracesRegion
	return nil
}

func (m *Model) toggleForm() tea.Cmd {
	if m.period() == 0 {
		m.refuse("the current form needs a sample period")
		return nil
	}
	next := m.now
	next.form, next.gain, next.gainCurrent = estimator.Current, nil, nil
	text := "current form: this step's sample counts for this step's estimate"
	if m.now.form == estimator.Current {
		next.form, text = estimator.Prediction, "prediction form: this step's sample counts for the next estimate"
	}
	m.say(text)
	return m.change(next, "")
}

func (m *Model) toggleMethod() tea.Cmd {
	if _, _, p := m.cfg.Work.Bench.Model.Dims(); p == 1 {
		m.refuse("with one sensor the poles leave no choice of gain")
		return nil
	}
	next := m.now
	next.method, next.gain = estimator.LeastNoise, nil
	text := "least-noise gain: of all gains with these poles, the one with the least noise"
	if m.now.method == estimator.LeastNoise {
		next.method, text = estimator.Robust, "robust gain: of all gains with these poles, the one with the best-conditioned eigenvectors"
	}
	m.say(text)
	return m.change(next, "")
}
