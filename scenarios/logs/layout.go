package logs

import (
	"fmt"
	"maps"
	"slices"
	"strings"

	"polewright/estimator"
	"polewright/plants"
)

// Layout says what the signals of a log are for one design model. It is
// immutable.
type Layout struct {
	// Period of the design in s, > 0.
	Period float64
	// Inputs and Sensors are the columns a log must have, in the model's order;
	// sensors that are not in use are none of them.
	Inputs, Sensors []Signal
	// States are all states of the model: those of the plant, then lags, delays
	// and unknowns. Outputs are the plant's combinations of states. A column named
	// like one of them is a reference.
	States, Outputs []Signal

	unused []string // sensors that are not in use: their columns are passed over
}

// Signal is one signal of the plant.
type Signal struct {
	Name, Unit string
	// Operating is the absolute value at zero deviation.
	Operating float64
	// Wrap is the span modulo which a sensor's innovation is taken; 0 without.
	Wrap float64
}

// NewLayout looks up the signals of a design model in its plant. It fails for a
// model without a sample period: a log is sampled.
func NewLayout(p *plants.Plant, m *estimator.Model) (*Layout, error) {
	if err := m.Check(); err != nil {
		return nil, err
	}
	if !m.Discrete() {
		return nil, &plants.Error{Where: "log", Wrong: "the design has no sample period", Expected: "expected period_s in the plant file, or --period"}
	}
	n, inputs, sensors := m.Dims()
	if len(m.SensorNames) != sensors || len(m.InputNames) != inputs || inputs != len(p.Inputs) ||
		len(m.StateNames) != n || n < len(p.States) {
		return nil, fmt.Errorf("the model and the plant do not name the same signals: %w", estimator.ErrShape)
	}
	l := &Layout{Period: m.Period}
	for _, u := range p.Inputs {
		l.Inputs = append(l.Inputs, Signal{Name: u.Name, Unit: u.Unit, Operating: u.Operating})
	}
	used := map[string]bool{}
	for _, name := range m.SensorNames {
		i, ok := p.SensorIndex(name)
		if !ok {
			return nil, fmt.Errorf("the plant has no sensor %q: %w", name, estimator.ErrShape)
		}
		s := p.Sensors[i]
		used[name] = true
		l.Sensors = append(l.Sensors, Signal{Name: s.Name, Unit: s.Unit, Operating: s.Operating, Wrap: s.Wrap})
	}
	for _, s := range p.Sensors {
		if !used[s.Name] {
			l.unused = append(l.unused, s.Name)
		}
	}
	for i, name := range m.StateNames {
		x := Signal{Name: name}
		if i < len(p.States) {
			x.Unit, x.Operating = p.States[i].Unit, p.States[i].Operating
		}
		l.States = append(l.States, x)
	}
	for _, o := range p.Outputs {
		z := Signal{Name: o.Name, Unit: o.Unit}
		for i, v := range o.Row {
			z.Operating += v * p.States[i].Operating
		}
		l.Outputs = append(l.Outputs, z)
	}
	return l, nil
}

// The kinds of columns.
type kind uint8

const (
	passedOver kind = iota
	timeColumn
	inputColumn
	sensorColumn
	stateColumn
	outputColumn
)

type column struct {
	kind  kind
	index int
	name  string // as the log has it
}

// timeName is the name of the time column.
const timeName = "t"

// find gives the meaning of a name. An input or a sensor goes before a state of
// the same name.
func (l *Layout) find(name string) (kind, int, bool) {
	if name == timeName {
		return timeColumn, 0, true
	}
	for _, group := range []struct {
		kind kind
		list []Signal
	}{{inputColumn, l.Inputs}, {sensorColumn, l.Sensors}, {stateColumn, l.States}, {outputColumn, l.Outputs}} {
		for i, s := range group.list {
			if s.Name == name {
				return group.kind, i, true
			}
		}
	}
	for _, s := range l.unused {
		if s == name {
			return passedOver, 0, true
		}
	}
	return passedOver, 0, false
}

// allOthers, renamed to nothing, leaves out every column that the plant does not
// know.
const allOthers = "*"

// columns gives each field of a header its meaning.
func (l *Layout) columns(header [][]byte, names map[string]string) ([]column, *plants.Error) {
	list := make([]column, len(header))
	first := map[[2]int]string{}
	mapped := map[string]bool{}
	rest, lenient := names[allOthers]
	if rest != "" {
		return nil, &plants.Error{Where: "header", Wrong: "all other columns renamed to " + quote(rest), Expected: "expected \"*=\", which leaves them out"}
	}
	mapped[allOthers] = true
	for i, field := range header {
		name := string(trimSpace(field))
		c := column{name: name}
		to, renamed := names[name]
		if renamed {
			mapped[name] = true
		} else {
			to = name
		}
		k, index, ok := l.find(to)
		if renamed && to == "" || !ok && !renamed && lenient {
			list[i] = c
			continue
		}
		if !ok {
			return nil, l.unknown(name, to, renamed)
		}
		c.kind, c.index = k, index
		if k != passedOver {
			id := [2]int{int(k), index}
			if other, twice := first[id]; twice {
				return nil, &plants.Error{Where: "header", Wrong: fmt.Sprintf("two columns for %s: %s and %s", quote(to), quote(other), quote(name)), Expected: "expected one"}
			}
			first[id] = name
		}
		list[i] = c
	}
	for _, name := range slices.Sorted(maps.Keys(names)) {
		if !mapped[name] {
			return nil, &plants.Error{Where: "header", Wrong: "no column " + quote(name) + " to rename", Expected: "the log has " + enumerate(header)}
		}
	}
	for _, want := range l.needed() {
		k, index, _ := l.find(want)
		if _, ok := first[[2]int{int(k), index}]; !ok {
			return nil, &plants.Error{Where: "header", Wrong: "no column " + quote(want), Expected: "expected " + quoteAll(l.needed())}
		}
	}
	return list, nil
}

// needed are the names of the columns that a log must have.
func (l *Layout) needed() []string {
	list := []string{timeName}
	for _, s := range l.Inputs {
		list = append(list, s.Name)
	}
	for _, s := range l.Sensors {
		list = append(list, s.Name)
	}
	return list
}

func (l *Layout) unknown(name, to string, renamed bool) *plants.Error {
	wrong := "unknown column " + quote(name)
	if renamed {
		wrong = "column " + quote(name) + " is renamed to " + quote(to) + ", which the plant does not have"
	}
	return &plants.Error{Where: "header", Wrong: wrong,
		Expected: "expected " + quoteAll(l.needed()) + " or a state's name; --map \"" + shorten(name) + "=NAME\" renames a column, \"" + shorten(name) + "=\" leaves it out, \"*=\" all such"}
}

// shorten keeps a message readable.
func shorten(s string) string {
	if r := []rune(s); len(r) > 60 {
		return string(r[:57]) + "..."
	}
	return s
}

func quote(s string) string { return `"` + shorten(s) + `"` }

func quoteAll(list []string) string {
	quoted := make([]string, 0, len(list))
	for i, s := range list {
		if i == 8 && len(list) > 9 {
			quoted = append(quoted, fmt.Sprintf("%d more", len(list)-i))
			break
		}
		quoted = append(quoted, quote(s))
	}
	return strings.Join(quoted, ", ")
}

func enumerate(header [][]byte) string {
	names := make([]string, len(header))
	for i, f := range header {
		names[i] = string(f)
	}
	return quoteAll(names)
}
