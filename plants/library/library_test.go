package library_test

import (
	"strings"
	"testing"

	"polewright/plants"
	"polewright/plants/library"
)

// TestEveryPlantParses also holds the texts to what a reader of them expects:
// a note that says the plant is invented, and at least one scenario.
func TestEveryPlantParses(t *testing.T) {
	if len(library.Names()) != 8 {
		t.Fatalf("%d plants, want 8", len(library.Names()))
	}
	for _, name := range library.Names() {
		text, file, ok := library.Plant(name)
		if !ok {
			t.Errorf("%s: not there", name)
			continue
		}
		p, err := plants.Parse(file, text)
		if err != nil {
			t.Error(err)
			continue
		}
		if !strings.Contains(p.Note, "Invented; all numbers are our own.") {
			t.Errorf("%s: the note does not say that it is invented", name)
		}
		scenarios := library.Scenarios(name)
		if len(scenarios) == 0 {
			t.Errorf("%s: no scenario", name)
		}
		for _, s := range scenarios {
			if !strings.HasPrefix(s.Name, name+".") || len(s.Text) == 0 {
				t.Errorf("%s: scenario %q of %d bytes", name, s.Name, len(s.Text))
			}
		}
	}
}

// TestEveryPlantModels builds the design model of each plant, as it stands and
// in continuous time where no whole-sample delay stands against it.
func TestEveryPlantModels(t *testing.T) {
	states := map[string]int{
		"lift": 3, "pan-drive": 4, "balancer": 3, "kiln": 7, "climber": 4, "twin-drum": 3, "web": 3, "gangway": 11,
	}
	none := 0.0
	for _, name := range library.Names() {
		text, file, _ := library.Plant(name)
		p, err := plants.Parse(file, text)
		if err != nil {
			t.Error(err)
			continue
		}
		m, err := p.Model(plants.Options{})
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		if n, _, _ := m.Dims(); n != states[name] {
			t.Errorf("%s: %d states (%v), want %d", name, n, m.StateNames, states[name])
		}
		if m.Period != p.Period {
			t.Errorf("%s: period %g, want %g", name, m.Period, p.Period)
		}
		_, err = p.Model(plants.Options{Period: &none})
		if refused := name == "web" || name == "gangway"; refused != (err != nil) {
			t.Errorf("%s without a period: %v", name, err)
		}
	}
}

func TestUnknownPlant(t *testing.T) {
	for _, name := range []string{"", "nobody", "lift.toml", "../lift", "lift.start"} {
		if _, _, ok := library.Plant(name); ok {
			t.Errorf("Plant(%q) found something", name)
		}
		if s := library.Scenarios(name); len(s) != 0 {
			t.Errorf("Scenarios(%q) found %d", name, len(s))
		}
	}
}
