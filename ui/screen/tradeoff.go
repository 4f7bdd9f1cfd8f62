package screen

import (
	"fmt"

	"github.com/charmbracelet/bubbles/key"
	tea "github.com/charmbracelet/bubbletea"

	"polewright/estimator"
	"polewright/ui/views"
)

// openTradeoff shows noise against settle time.
func (m *Model) openTradeoff() tea.Cmd {
	if m.cfg.Study == nil {
		m.refuse("the trade-off is not available here")
		return nil
	}
	return m.openView(tradeoffView)
}

// tradeoff is what the view shows now.
func (m *Model) tradeoff() *views.Tradeoff {
	t := m.research.trade
	t.Design, t.Kept = m.shown, nil
	for _, c := range m.candidates {
		if c.Design != nil {
			t.Kept = append(t.Kept, views.Kept{Letter: c.Letter, Design: c.Design})
		}
	}
	limits := m.cfg.Work.Bench.Scenario.Limits
	t.Settle, t.Over = limits.Settle, limits.OverFloor
	return &t
}

// tradeoffKey walks along the curves and takes a point. Both curves become slower
// to the right.
func (m *Model) tradeoffKey(s stroke) tea.Cmd {
	k, t := m.keys, &m.research.trade
	list := t.Points()
	far := func(step int) {
		for range 4 {
			t.At = views.Along(list, t.At, step)
		}
	}
	switch {
	case key.Matches(s, k.OtherCurve):
		t.Curve = views.Floors - t.Curve
		t.At = views.Unchanged(t.Points())
	case key.Matches(s, k.Left):
		t.At = views.Along(list, t.At, 1)
	case key.Matches(s, k.Right):
		t.At = views.Along(list, t.At, -1)
	case key.Matches(s, k.FarLeft):
		far(1)
	case key.Matches(s, k.FarRight):
		far(-1)
	case key.Matches(s, k.Choose):
		return m.takePoint()
	}
	return nil
}

// takePoint puts the point under the cursor in hand.
func (m *Model) takePoint() tea.Cmd {
	t := &m.research.trade
	point, ok := t.Point()
	if !ok {
		m.refuse("there is no point to take yet")
		return nil
	}
	text := fmt.Sprintf("all speeds x %.3g", point.Factor)
	if t.Curve == views.Floors {
		text = fmt.Sprintf("poles and gain of the best estimator for process noise x %.3g", point.Factor)
	}
	return m.takeDesign(point.Design, text)
}

// takeDesign puts a design that was found in the background in hand, with its
// gain, as one step of undo, and leaves what is open.
func (m *Model) takeDesign(d *estimator.Design, text string) tea.Cmd {
	list := d.Wanted
	if list == nil {
		list = d.Reached
	}
	next, err := m.replaceAll(list)
	if err != nil {
		m.refuse(err.Error())
		return nil
	}
	next.form, next.method = d.Form, d.Method
	next.gain, next.gainCurrent = d.Gain, d.GainCurrent
	m.closeView()
	m.say(text + "; u goes back")
	cmd := m.change(next, "")
	m.follow()
	return cmd
}
