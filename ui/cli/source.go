package cli

import (
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strings"

	"polewright/plants"
	"polewright/plants/library"
	"polewright/scenarios"
	"polewright/ui/desk"
)

const maxText = 1 << 20

// readBounded reads a file of at most maxText bytes.
func readBounded(file, what string) ([]byte, error) {
	f, err := os.Open(file)
	if err != nil {
		return nil, fileError(file, what, err)
	}
	defer f.Close()
	data, err := io.ReadAll(io.LimitReader(f, maxText+1))
	if err != nil {
		return nil, fileError(file, what, err)
	}
	if len(data) > maxText {
		return nil, fileError(file, what, fmt.Errorf("more than %d bytes", maxText))
	}
	return data, nil
}

// source is a plant with the text that it came from.
type source struct {
	plant   *plants.Plant
	file    string
	text    []byte
	builtIn string // name in the library, else empty
}

// loadPlant reads a plant file, or a built-in plant by its library name.
func loadPlant(arg string) (*source, error) {
	if text, file, ok := library.Plant(arg); ok {
		if _, err := os.Stat(arg); err != nil {
			p, err := plants.Parse(file, text)
			return &source{plant: p, file: file, text: text, builtIn: arg}, err
		}
	}
	text, err := readBounded(arg, "a plant file (TOML or JSON) or the name of a built-in plant")
	if err != nil {
		return nil, err
	}
	p, err := plants.Parse(arg, text)
	if err != nil {
		return nil, err
	}
	return &source{plant: p, file: arg, text: text}, nil
}

// bench puts the plant on the bench, with the scenario of that name or file
// where one is named.
func (s *source) bench(scenario string, o plants.Options) (*desk.Bench, error) {
	b := &desk.Bench{Plant: s.plant, PlantFile: filepath.Base(s.file), PlantText: s.text}
	var err error
	if b.Model, err = s.plant.Model(o); err != nil {
		return nil, inFile(s.file, err)
	}
	if scenario == "" {
		b.Scenario = scenarios.Default(s.plant)
		return b, nil
	}
	if b.Scenario, err = s.loadScenario(scenario, b); err != nil {
		return nil, err
	}
	if b.Scenario.TruthPlant == "" {
		return b, nil
	}
	return b, s.loadTruth(scenario, b)
}

// loadScenario finds a scenario by its name or word for a built-in plant, else by
// its file.
func (s *source) loadScenario(arg string, b *desk.Bench) (*scenarios.Scenario, error) {
	if s.builtIn != "" {
		for _, f := range library.Scenarios(s.builtIn) {
			sc, err := scenarios.Parse(f.Name, f.Text, s.plant)
			if err != nil {
				return nil, err
			}
			if strings.EqualFold(sc.Name, arg) || scenarioWord(f.Name) == arg {
				b.ScenarioFile, b.ScenarioText = f.Name, f.Text
				return sc, nil
			}
		}
	}
	text, err := readBounded(arg, "a scenario file (TOML)")
	if err != nil {
		return nil, err
	}
	b.ScenarioFile, b.ScenarioText = filepath.Base(arg), text
	return scenarios.Parse(arg, text, s.plant)
}

// loadTruth reads the fuller plant that a scenario names: a file beside the
// scenario's, never one outside its folder.
func (s *source) loadTruth(scenario string, b *desk.Bench) error {
	name := b.Scenario.TruthPlant
	if !filepath.IsLocal(name) {
		return &plants.Error{File: scenario, Where: "truth, plant", Wrong: fmt.Sprintf("%q leads out of the scenario's folder", name), Expected: "the name of a plant file beside the scenario"}
	}
	path := filepath.Join(filepath.Dir(scenario), name)
	text, err := readBounded(path, "the plant file that the scenario's [truth] names")
	if err != nil {
		return err
	}
	b.TruthFile, b.TruthText = name, text
	b.Truth, err = plants.Parse(path, text)
	return err
}

// scenarioWord is SCENARIO of PLANT.SCENARIO.toml.
func scenarioWord(file string) string {
	parts := strings.Split(filepath.Base(file), ".")
	if len(parts) < 3 {
		return file
	}
	return parts[len(parts)-2]
}

// inFile names the file in an error that knows none.
func inFile(file string, err error) error {
	if e, ok := err.(*plants.Error); ok {
		if e.File == "" {
			c := *e
			c.File = file
			return &c
		}
		return e
	}
	return fmt.Errorf("%s: %w", file, err)
}
