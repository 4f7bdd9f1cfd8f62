package report

import (
	"fmt"
	"math"
	"strings"

	"polewright/estimator"
	"polewright/estimator/poles"
	"polewright/plants"
	"polewright/ui/measures"
)

// manySensors is from where on only each sensor alone is taken out.
const manySensors = 4

// sensing tells what the sensors see.
func (m *maker) sensing() error {
	b, o := m.bench, m.list[0].doc.Observability
	n := len(b.Model.StateNames)
	m.heading(1, "What the sensors see")
	m.text(Plain, "The sensors see %d of %d states (rank of the observability matrix, relative tolerance %s, in scaled coordinates).", o.Rank, n, Digits(float64(o.Tolerance)))
	own := "s"
	head := []string{"mode (s-plane)", "sigma", ""}
	if b.Model.Discrete() {
		own, head = "z", []string{"mode (z-plane)", "s-plane", "sigma", ""}
	}
	t := &Table{Caption: "Modes of the design model: sigma is the smallest singular value of [A − λI; C], large where the sensors see a mode well", Head: head}
	for i, mode := range o.Modes {
		at := mode.Eigenvalue
		row := []Cell{pole(&at, "observability.modes", i, "eigenvalue")}
		if own == "z" {
			row = append(row, pole(toS(at, b.Model.Period)))
		}
		seen := words("seen")
		if !mode.Observable {
			seen = Cell{Text: "NOT SEEN: no gain moves it", Strong: true}
		}
		t.Rows = append(t.Rows, append(row, number(mode.Sigma, "observability.modes", i, "sigma"), seen))
	}
	t.Words = make([]bool, len(head))
	t.Words[len(head)-1] = true
	m.table(t)
	if len(o.Gramian) > 0 {
		g := &Table{Caption: "Eigenvalues of the observability Gramian, ascending", Head: []string{"number", "eigenvalue"}}
		for i, v := range o.Gramian {
			g.Rows = append(g.Rows, []Cell{words(fmt.Sprint(i + 1)), number(v, "observability.gramian_eigenvalues", i)})
		}
		m.table(g)
	}
	return m.sensorSets()
}

func toS(z measures.Complex, period float64) *measures.Complex {
	s, ok := poles.ToS(complex(z[0], z[1]), period)
	if !ok {
		return nil
	}
	return &measures.Complex{real(s), imag(s)}
}

// sensorSets tells what smaller sets of sensors would see.
func (m *maker) sensorSets() error {
	p := m.bench.Plant
	t := &Table{Caption: "What each set of sensors would see", Head: []string{"sensors", "states seen", "weakest sigma", "modes that no gain moves"}, Words: []bool{true, false, false, true}}
	for _, set := range setsOf(p.Enabled()) {
		model, err := p.Model(plants.Options{Period: &m.bench.Model.Period, Sensors: set})
		if err != nil {
			return err
		}
		d, err := estimator.NewDesigner(model, estimator.Options{})
		if err != nil {
			return err
		}
		o := d.Analysis().Observability
		weakest, fixed := math.Inf(1), []string{}
		for _, mode := range o.Modes {
			weakest = min(weakest, mode.Sigma)
		}
		for _, v := range o.Fixed {
			fixed = append(fixed, pole(&measures.Complex{real(v), imag(v)}).Text)
		}
		t.Rows = append(t.Rows, []Cell{words(strings.Join(model.SensorNames, " + ")), words(fmt.Sprint(o.Rank)), words(Digits(weakest)),
			{Text: blank(strings.Join(fixed, ", ")), Strong: len(fixed) > 0}})
	}
	m.table(t)
	return nil
}

// setsOf lists every set of the enabled sensors, the whole first; of many sensors
// the whole, and all but one each.
func setsOf(enabled []bool) [][]bool {
	var on []int
	for i, e := range enabled {
		if e {
			on = append(on, i)
		}
	}
	var out [][]bool
	add := func(keep func(k int) bool) {
		set := make([]bool, len(enabled))
		for k, i := range on {
			set[i] = keep(k)
		}
		out = append(out, set)
	}
	if len(on) > manySensors {
		add(func(int) bool { return true })
		for lost := range on {
			add(func(k int) bool { return k != lost })
		}
		return out
	}
	for bits := 1<<len(on) - 1; bits > 0; bits-- {
		add(func(k int) bool { return bits>>k&1 == 1 })
	}
	return out
}
