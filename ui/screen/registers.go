package screen

import (
	"math/cmplx"
	"slices"

	"polewright/ui/desk"
	"polewright/ui/plane/targets"
)

// takeFixed takes over the poles that no gain moves, which depend on the form.
func (m *Model) takeFixed(list []complex128) {
	set, err := targets.From(list, m.period())
	if err != nil || m.fixed != nil && slices.Equal(set.List, m.fixed) {
		return
	}
	m.fixed = append([]targets.Target{}, set.List...) // not nil: they are known
	m.dirty |= planeRegion
}

// refit makes the poles in hand as many as the form in hand has: delay registers
// have poles at z = 0 that one form can choose and the other cannot. Other poles
// that are missing are not made up. It tells whether that helped, so that asking
// again is of use.
func (m *Model) refit(a *desk.Answer) bool {
	have := m.now.set.Count()
	if m.now.gain != nil || m.period() == 0 || a.Movable == 0 || have == 0 || have == a.Movable || have < a.Movable-a.Registers {
		return false
	}
	list := slices.Clone(m.now.set.List)
	for ; have < a.Movable; have++ {
		list = append(list, targets.Target{})
	}
	for i := len(list) - 1; i >= 0 && have > a.Movable; i-- {
		if t := list[i]; !t.Pair && cmplx.Abs(t.At) < 1e-9 {
			list = slices.Delete(list, i, i+1)
			if m.now.held > i {
				m.now.held--
			}
			have--
		}
	}
	if have != a.Movable {
		return false
	}
	m.takeFixed(a.Fixed)
	m.now.set.List = list
	m.now.held = min(m.now.held, len(list)-1)
	m.dirty |= planeRegion | readingsRegion
	return true
}
