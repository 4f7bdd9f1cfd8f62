// Package desktest puts built-in plants on the bench, for tests.
package desktest

import (
	"testing"

	"polewright/estimator"
	"polewright/plants"
	"polewright/plants/library"
	"polewright/scenarios"
	"polewright/ui/aim"
	"polewright/ui/desk"
)

// Bench holds a built-in plant with its first scenario.
func Bench(t testing.TB, name string) *desk.Bench {
	t.Helper()
	text, file, ok := library.Plant(name)
	if !ok {
		t.Fatalf("no built-in plant %s", name)
	}
	p, err := plants.Parse(file, text)
	if err != nil {
		t.Fatal(err)
	}
	f := library.Scenarios(name)[0]
	s, err := scenarios.Parse(f.Name, f.Text, p)
	if err != nil {
		t.Fatal(err)
	}
	m, err := p.Model(plants.Options{})
	if err != nil {
		t.Fatal(err)
	}
	return &desk.Bench{Plant: p, PlantFile: file, PlantText: text, Model: m,
		Scenario: s, ScenarioFile: f.Name, ScenarioText: f.Text}
}

// Start is the design to begin with, its poles, and the designer that made it.
func Start(t testing.TB, b *desk.Bench, o estimator.Options) (*estimator.Designer, []complex128, *estimator.Design) {
	t.Helper()
	d, err := estimator.NewDesigner(b.Model, o)
	if err != nil {
		t.Fatal(err)
	}
	list, err := aim.Start(b.Model, d)
	if err != nil {
		t.Fatal(err)
	}
	design, err := d.Place(list, nil)
	if err != nil {
		t.Fatal(err)
	}
	return d, list, design
}
