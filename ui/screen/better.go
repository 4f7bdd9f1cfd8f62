package screen

import (
	"fmt"

	tea "github.com/charmbracelet/bubbletea"

	"polewright/estimator"
	"polewright/ui/desk"
)

// offerBetter says that the branch which the gain has followed is no longer the
// best for these poles. Nothing changes until the person takes the offer.
func (m *Model) offerBetter(a *desk.Answer) {
	m.now.better = a.Better
	if a.Better == nil {
		return
	}
	text := fmt.Sprintf("conditioning %.3g instead of %.3g", a.Better.EigenvectorCondition, a.Design.EigenvectorCondition)
	if a.Better.Method == estimator.LeastNoise {
		text = fmt.Sprintf("noise %.3f x floor instead of %.3f", a.Better.Noise.OverFloorRMS, a.Design.Noise.OverFloorRMS)
	}
	m.say("these poles have a better gain: " + text + "; g takes it")
	m.dirty |= statusRegion
}

// takeBetter takes the gain that was offered; undo goes back to the branch.
func (m *Model) takeBetter() tea.Cmd {
	better := m.now.better
	if better == nil {
		m.refuse("no better gain is known for these poles")
		return nil
	}
	next := m.now
	next.gain, next.gainCurrent = better.Gain, better.GainCurrent
	m.say("the better gain for these poles")
	return m.change(next, "")
}
