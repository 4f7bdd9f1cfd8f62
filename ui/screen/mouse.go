package screen

import (
	"math"

	tea "github.com/charmbracelet/bubbletea"

	"polewright/ui/plane/targets"
)

// pointer is the mouse, which is off until asked for: it takes the terminal's own
// selection of text away.
type pointer struct {
	on       bool
	dragging bool
	moved    bool // this drag has its step of undo
}

// toggleMouse switches the mouse on or off.
func (m *Model) toggleMouse() tea.Cmd {
	m.pointer = pointer{on: !m.pointer.on}
	if !m.pointer.on {
		m.say("the mouse is the terminal's again")
		return tea.DisableMouse
	}
	m.say("the mouse drags poles; its wheel zooms; P gives it back to the terminal")
	return tea.EnableMouseCellMotion
}

// mouse takes what the mouse does in the plane.
func (m *Model) mouse(msg tea.MouseMsg) tea.Cmd {
	col, row := msg.X-m.lay.plane.x, msg.Y-1-m.lay.plane.y
	inside := col >= 0 && row >= 0 && col < m.lay.plane.w && row < m.lay.plane.h
	if !m.pointer.on || m.lay.tooSmall || m.open != none || m.prompt != nil || m.question != nil {
		return nil
	}
	switch {
	case msg.Action == tea.MouseActionRelease:
		m.pointer.dragging = false
		m.lastMove = "" // the next drag is a step of its own
	case msg.Action == tea.MouseActionMotion && m.pointer.dragging:
		return m.dragTo(min(max(col, 0), m.lay.plane.w-1), min(max(row, 0), m.lay.plane.h-1))
	case msg.Action != tea.MouseActionPress || !inside:
	case msg.Button == tea.MouseButtonWheelUp:
		return m.zoom(-2)
	case msg.Button == tea.MouseButtonWheelDown:
		return m.zoom(2)
	case msg.Button == tea.MouseButtonLeft:
		m.grab(col, row)
	}
	return nil
}

// grab takes the pole that is nearest to a cell into the hand.
func (m *Model) grab(col, row int) {
	best, least := -1, math.Inf(1)
	for i, t := range append(append([]targets.Target{}, m.now.set.List...), m.fixed...) {
		at, ok := targets.Shown(t.At, m.plane, m.period())
		if !ok {
			continue
		}
		dx := float64(m.window.Column(real(at)) - col)
		dy := 2 * math.Abs(math.Abs(float64(m.window.H/2-m.window.Row(imag(at))))-math.Abs(float64(m.window.H/2-row)))
		if d := math.Hypot(dx, dy); d < least || d == least && i == m.now.held {
			best, least = i, d
		}
	}
	if best < 0 {
		return
	}
	m.now.held, m.pointer.dragging, m.pointer.moved = best, true, false
	m.say("")
	if _, fixed, _ := m.heldTarget(); fixed {
		m.pointer.dragging = false
		m.say("fixed: the sensors do not see this mode, so no gain moves it")
	}
	m.dirty |= planeRegion | readingsRegion | statusRegion
}

// dragTo moves what is held to a cell, in whole cells, as the arrows would; below
// the axis the mirror image is dragged.
func (m *Model) dragTo(col, row int) tea.Cmd {
	at, ok := m.heldPlace()
	t, _, held := m.heldTarget()
	if !ok || !held {
		return nil
	}
	mid := m.window.H / 2
	dx := col - m.window.Column(real(at))
	dy := max(mid-row, row-mid) - (mid - m.window.Row(imag(at)))
	if !t.Pair && m.period() > 0 && m.plane == targets.S && imag(at) != 0 {
		dy = 0 // on the sampling limit
	}
	if dx == 0 && dy == 0 {
		return nil
	}
	set, index, event, err := m.now.set.Move(m.now.held, dx, dy, m.window.Grid)
	if err != nil && dy != 0 && dx != 0 {
		set, index, event, err = m.now.set.Move(m.now.held, dx, 0, m.window.Grid)
	}
	m.dirty |= statusRegion
	if err != nil {
		m.refuse(err.Error())
		return nil
	}
	m.say("")
	if event == targets.Parted || event == targets.PartedAtLimit {
		m.say("the pair reached the axis: two real poles, one of them in your hand")
	}
	next := m.now
	next.set, next.held, next.gain, next.gainCurrent = set, index, nil, nil
	if m.pointer.moved { // goes on with the step of this drag
		m.lastMove, m.lastMoved = "mouse", m.cfg.Now()
	} else {
		m.lastMove = ""
	}
	m.pointer.moved = true
	return m.change(next, "mouse")
}
