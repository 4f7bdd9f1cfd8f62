package screen

import (
	tea "github.com/charmbracelet/bubbletea"

	"polewright/ui/measures"
)

// copiedMsg tells how copying went.
type copiedMsg struct{ err error }

// copyGain hands the gain of the design in hand to the clipboard.
func (m *Model) copyGain() tea.Cmd {
	switch {
	case m.cfg.Copy == nil:
		m.refuse("copying is not available here")
		return nil
	case m.now.design == nil:
		m.refuse("the gain is on its way: copy it once its figures are there")
		return nil
	}
	text, hand := measures.GainText(m.now.design.Gain), m.cfg.Copy
	return func() tea.Msg { return copiedMsg{hand(text)} }
}

func (m *Model) copied(msg copiedMsg) {
	m.dirty |= statusRegion
	if msg.err != nil {
		m.refuse("not copied: " + msg.err.Error())
		return
	}
	m.say("gain L sent to the terminal's clipboard; not every terminal takes it")
}
