package screen

import (
	"errors"
	"math/cmplx"
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
		m.doubtPlane(text, at)
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
		if spec, err := poles.Parse(text); err == nil && spec.Kind == poles.List {
			m.doubtPlane(text, spec.Poles)
		}
		return cmd, nil
	})
}

// doubtPlane asks whether places that were typed in the s-plane and are unstable
// there were meant for the z-plane.
func (m *Model) doubtPlane(text string, typed []complex128) {
	if m.plane != targets.S || m.period() == 0 || strings.Contains(text, "@") {
		return
	}
	grows := false
	for _, v := range typed {
		if cmplx.Abs(v) >= 1 {
			return
		}
		grows = grows || real(v) >= 0
	}
	if grows {
		m.refuse("unstable: were these z-plane places? z shows that plane")
	}
}
