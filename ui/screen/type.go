package screen

import (
	"errors"
	"strings"

	tea "github.com/charmbracelet/bubbletea"

	"polewright/estimator/poles"
	"polewright/ui/plane/targets"
)

// askPlace opens the prompt for the place of the held pole.
func (m *Model) askPlace() tea.Cmd {
	if _, fixed, ok := m.heldTarget(); !ok || fixed {
		return m.move("", 0, 0) // refuses, with the reason
	}
	return m.openPrompt("place in the "+string(byte(m.plane))+"-plane:", "", func(m *Model, text string) (tea.Cmd, error) {
		if text == "" {
			return nil, nil
		}
		at, err := poles.ParseOne(text)
		if err != nil {
			return nil, err
		}
		plane := m.plane
		if strings.Contains(text, "@") { // frequency and damping are of the s-plane
			plane = targets.S
		}
		set, held, err := m.now.set.Place(m.now.held, at, plane)
		if err != nil {
			return nil, err
		}
		next := m.now
		next.set, next.held, next.gain, next.gainCurrent = set, held, nil, nil
		cmd := m.change(next, "")
		m.follow()
		return cmd, nil
	})
}

// askPattern opens the prompt for all poles at once.
func (m *Model) askPattern() tea.Cmd {
	if m.cfg.Resolve == nil {
		m.refuse("lists and patterns are not available here")
		return nil
	}
	return m.openPrompt("all poles, "+string(byte(m.plane))+"-plane:", "", func(m *Model, text string) (tea.Cmd, error) {
		if text == "" {
			return nil, nil
		}
		if strings.EqualFold(text, "floor") {
			return m.snapToFloor(), nil
		}
		list, err := m.cfg.Resolve(text, string(byte(m.plane)), m.now.form)
		if err != nil {
			return nil, err
		}
		if len(list) == 0 {
			return nil, errors.New("no poles in that")
		}
		next, err := m.replaceAll(list)
		if err != nil {
			return nil, err
		}
		cmd := m.change(next, "")
		m.follow()
		return cmd, nil
	})
}
