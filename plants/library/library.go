// Package library holds the built-in plants and their scenarios. All of them are
// invented; each plant's note says why it is there.
package library

import (
	"embed"
	"slices"
	"strings"
)

// File is a text with the name it is copied to.
type File struct {
	Name string
	Text []byte
}

//go:embed data/*.toml
var data embed.FS

// names has the plants in the order to meet them, the first start's plant first.
var names = []string{
	"lift", "pan-drive", "balancer", "kiln", "climber", "twin-drum", "web", "gangway",
}

// Names lists the plants, the one for a first start first. The list belongs to
// the caller.
func Names() []string { return slices.Clone(names) }

// Plant returns the text of a plant and the name of its file; ok is false where
// there is no plant of this name.
func Plant(name string) (text []byte, file string, ok bool) {
	if !slices.Contains(names, name) {
		return nil, "", false
	}
	file = name + ".toml"
	text, err := data.ReadFile("data/" + file)
	return text, file, err == nil
}

// Scenarios returns the scenarios of a plant, by name: their files are called
// PLANT.SCENARIO.toml.
func Scenarios(name string) []File {
	entries, err := data.ReadDir("data")
	if err != nil || !slices.Contains(names, name) {
		return nil
	}
	var files []File
	for _, e := range entries {
		if e.Name() == name+".toml" || !strings.HasPrefix(e.Name(), name+".") {
			continue
		}
		if text, err := data.ReadFile("data/" + e.Name()); err == nil {
			files = append(files, File{e.Name(), text})
		}
	}
	return files
}
