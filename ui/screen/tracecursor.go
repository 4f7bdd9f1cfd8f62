package screen

import (
	"github.com/charmbracelet/bubbles/key"
	tea "github.com/charmbracelet/bubbletea"
)

// timeCursor is the cursor on the traces. While it is there, the arrows are its.
type timeCursor struct {
	on   bool
	part float64 // of the run's time, 0 to 1
}

// toggleCursor enters or leaves the traces.
func (m *Model) toggleCursor() tea.Cmd {
	if m.run == nil || len(m.run.T) == 0 {
		m.refuse("there are no traces yet")
		return nil
	}
	m.clock.on = !m.clock.on
	if m.clock.part == 0 {
		m.clock.part = 0.5
	}
	m.dirty |= tracesRegion | statusRegion
	return nil
}

// cursorKey gives a key to the time cursor; false where it is none of its keys.
func (m *Model) cursorKey(name string) bool {
	k, s := m.keys, stroke(name)
	columns := float64(max(m.lay.left/max(len(m.panels()), 1)-12, 10))
	step := 0.0
	switch {
	case key.Matches(s, k.Leave):
		m.clock.on = false
	case key.Matches(s, k.Left):
		step = -1
	case key.Matches(s, k.Right):
		step = 1
	case key.Matches(s, k.FarLeft):
		step = -5
	case key.Matches(s, k.FarRight):
		step = 5
	case key.Matches(s, k.Up, k.Down, k.FarUp, k.FarDown): // not the pole's, meanwhile
	default:
		return false
	}
	m.say("")
	m.clock.part = min(max(m.clock.part+step/columns, 0), 1)
	m.dirty |= tracesRegion | statusRegion
	return true
}

// cursorTime is the cursor's time in a run that ends at end; nil without one.
func (m *Model) cursorTime(end float64) *float64 {
	if !m.clock.on {
		return nil
	}
	t := m.clock.part * end
	return &t
}

// toggleBand shows or hides the band around the estimates.
func (m *Model) toggleBand() tea.Cmd {
	m.band = !m.band
	text := "the estimate with its predicted band of two standard deviations"
	if !m.band {
		text = "no band around the estimate"
	}
	m.say(text)
	m.dirty |= tracesRegion
	return nil
}
