package screen

import (
	"fmt"

	"github.com/charmbracelet/bubbles/key"
	tea "github.com/charmbracelet/bubbletea"

	"polewright/estimator"
	"polewright/ui/desk"
	"polewright/ui/views"
)

// sensing is what the view of sensors and modes goes by.
type sensing struct {
	gen       uint64
	form      estimator.Form // that all is of
	plugged   []bool         // one entry per sensor in use
	cursor    int
	all, rest *views.Seen
}

// seenMsg brings what a set of sensors sees.
type seenMsg struct {
	gen   uint64
	form  estimator.Form
	whole bool
	seen  *views.Seen
}

// openSensors shows what the sensors see, all of them plugged.
func (m *Model) openSensors() tea.Cmd {
	s := &m.research.sensing
	_, _, p := m.cfg.Work.Bench.Model.Dims()
	s.plugged, s.cursor, s.rest = make([]bool, p), 0, nil
	for j := range s.plugged {
		s.plugged[j] = true
	}
	s.gen++
	cmd := m.openView(sensorsView)
	if s.all != nil && s.form == m.now.form {
		return cmd
	}
	s.all = nil
	return tea.Batch(cmd, m.look(s.plugged, true))
}

// look judges in the background what the plugged ones of the sensors in use see.
func (m *Model) look(plugged []bool, whole bool) tea.Cmd {
	bench, form, gen := m.cfg.Work.Bench, m.now.form, m.research.sensing.gen
	mask, k := bench.Plant.Enabled(), 0
	for i, on := range mask {
		if on && k < len(plugged) {
			mask[i] = plugged[k]
			k++
		}
	}
	return func() tea.Msg { return seenMsg{gen, form, whole, see(bench, form, mask)} }
}

// see is views.See whose panic is an error: it runs outside the program's guard.
func see(b *desk.Bench, form estimator.Form, mask []bool) (seen *views.Seen) {
	defer func() {
		if p := recover(); p != nil {
			seen = &views.Seen{Plugged: mask, Err: fmt.Errorf("what these sensors see could not be found: %v", p)}
		}
	}()
	return views.See(b, form, mask)
}

func (m *Model) seenAnswer(msg seenMsg) tea.Cmd {
	s := &m.research.sensing
	switch {
	case msg.form != m.now.form:
		return nil
	case msg.whole:
		s.all, s.form = msg.seen, msg.form
	case msg.gen == s.gen:
		s.rest = msg.seen
	default:
		return nil
	}
	m.dirty |= viewRegion
	return nil
}

func (m *Model) sensors() *views.Sensors {
	s := &m.research.sensing
	return &views.Sensors{Bench: m.cfg.Work.Bench, Plane: m.plane, Design: m.shown, All: s.all, Rest: s.rest, Plugged: s.plugged, Cursor: s.cursor}
}

func (m *Model) sensorsKey(s stroke) tea.Cmd {
	k, f := m.keys, &m.research.sensing
	n := len(f.plugged)
	switch {
	case n == 0:
	case key.Matches(s, k.ViewLeft):
		f.cursor = (f.cursor + n - 1) % n
	case key.Matches(s, k.ViewRight):
		f.cursor = (f.cursor + 1) % n
	case key.Matches(s, k.Choose), key.Matches(s, k.Delete):
		return m.unplug()
	}
	return nil
}

// unplug unplugs the sensor under the cursor, or plugs it in again. One has to
// stay.
func (m *Model) unplug() tea.Cmd {
	f := &m.research.sensing
	plugged, left := append([]bool(nil), f.plugged...), 0
	plugged[f.cursor] = !plugged[f.cursor]
	for _, on := range plugged {
		if on {
			left++
		}
	}
	if left == 0 {
		m.refuse("one sensor has to stay: without any there is nothing to estimate from")
		return nil
	}
	f.plugged, f.rest = plugged, nil
	f.gen++
	if left == len(plugged) {
		return nil
	}
	return m.look(plugged, false)
}
