// Package sample makes session files on the built-in plants, for tests.
package sample

import (
	"context"
	"fmt"

	"polewright/estimator"
	"polewright/estimator/poles"
	"polewright/plants"
	"polewright/plants/library"
	"polewright/scenarios"
	"polewright/ui/aim"
	"polewright/ui/desk"
	"polewright/ui/session"
)

// Program is who saves the samples of a test that does not say otherwise.
const Program = "polewright test"

// Bench puts a plant's text and, where it is not nil, a scenario's on the bench.
func Bench(plantFile string, plantText []byte, scenarioFile string, scenarioText []byte) (*desk.Bench, error) {
	b := &desk.Bench{PlantFile: plantFile, PlantText: plantText}
	var err error
	if b.Plant, err = plants.Parse(plantFile, plantText); err != nil {
		return nil, err
	}
	if b.Model, err = b.Plant.Model(plants.Options{}); err != nil {
		return nil, err
	}
	if scenarioText == nil {
		b.Scenario = scenarios.Default(b.Plant)
		return b, nil
	}
	b.ScenarioFile, b.ScenarioText = scenarioFile, scenarioText
	b.Scenario, err = scenarios.Parse(scenarioFile, scenarioText, b.Plant)
	return b, err
}

// BuiltIn is the bench of a built-in plant with its first scenario.
func BuiltIn(name string) (*desk.Bench, error) {
	text, file, ok := library.Plant(name)
	if !ok {
		return nil, fmt.Errorf("no built-in plant %q", name)
	}
	if list := library.Scenarios(name); len(list) > 0 {
		return Bench(file, text, list[0].Name, list[0].Text)
	}
	return Bench(file, text, "", nil)
}

// Work designs a candidate per entry, A, B ... The last one is selected and in hand.
func Work(b *desk.Bench, entries ...Entry) (*desk.Work, error) {
	w := &desk.Work{Bench: b, View: desk.View{Plane: "s"}}
	runner, err := scenarios.NewRunner(b.Plant, b.Model, b.Scenario, b.Truth)
	if err != nil {
		return nil, err
	}
	for i, e := range entries {
		d, err := estimator.NewDesigner(b.Model, e.Options)
		if err != nil {
			return nil, err
		}
		list, err := e.poles(b, d)
		if err != nil {
			return nil, err
		}
		design, err := d.Place(list, nil)
		if err != nil {
			return nil, err
		}
		run, err := runner.Run(context.Background(), scenarios.Gain{L: design.Gain, Lf: design.GainCurrent, Form: design.Form})
		if err != nil {
			return nil, err
		}
		name := string(rune('A' + i))
		w.Candidates = append(w.Candidates, desk.Candidate{Letter: name, Note: e.Note, Form: e.Form, Method: e.Method, Poles: list,
			Design: design, Limits: b.Scenario.Judge(design, b.Model, b.Plant, run), Run: run})
		w.Current, w.Form, w.Method, w.Poles = name, e.Form, e.Method, list
		w.Gain, w.GainCurrent = design.Gain, design.GainCurrent
	}
	return w, nil
}

// Entry is one candidate to make.
type Entry struct {
	estimator.Options
	Poles string // a list or pattern in the s-plane; empty: those a person begins with
	Note  string
}

func (e *Entry) poles(b *desk.Bench, d *estimator.Designer) ([]complex128, error) {
	if e.Poles == "" {
		return aim.Start(b.Model, d)
	}
	spec, err := poles.Parse(e.Poles)
	if err != nil {
		return nil, err
	}
	return aim.Own(spec, "s", b.Model, d)
}

// Save writes a session of a built-in plant.
func Save(file, program, plant string, entries ...Entry) error {
	b, err := BuiltIn(plant)
	if err != nil {
		return err
	}
	w, err := Work(b, entries...)
	if err != nil {
		return err
	}
	return session.Save(file, program, w, false)
}
