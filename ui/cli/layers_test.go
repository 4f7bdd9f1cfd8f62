package cli_test

import (
	"go/parser"
	"go/token"
	"io/fs"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
)

// layers lists every folder with what its code, tests apart, must not import. A
// layer may use those below it, never one above: ui, scenarios, plants,
// estimator.
var layers = []struct {
	folder string
	never  []string // import paths, or prefixes that end in "/"
}{
	{folder: "estimator", never: []string{
		"os", "io", "io/fs", "time", "log", "net/", "polewright/plants", "polewright/plants/", "polewright/scenarios", "polewright/scenarios/", "polewright/ui/"}},
	{folder: "plants", never: []string{"os", "net/", "polewright/scenarios", "polewright/scenarios/", "polewright/ui/"}},
	{folder: "scenarios", never: []string{"os", "net/", "polewright/ui/"}},
	{folder: "estimator", never: []string{"github.com/charmbracelet/"}},
	{folder: "plants", never: []string{"github.com/charmbracelet/"}},
	{folder: "scenarios", never: []string{"github.com/charmbracelet/"}},
	{folder: "ui/cli", never: []string{"github.com/charmbracelet/"}},
	{folder: "ui/desk", never: []string{"github.com/charmbracelet/"}},
	{folder: "ui/measures", never: []string{"github.com/charmbracelet/"}},
	{folder: "ui/session", never: []string{"github.com/charmbracelet/"}},
	{folder: "ui/solver", never: []string{"github.com/charmbracelet/"}},
	{folder: "ui/aim", never: []string{"github.com/charmbracelet/"}},
	{folder: "ui/report", never: []string{"github.com/charmbracelet/"}},
	{folder: "ui/verify", never: []string{"github.com/charmbracelet/"}},
}

func TestLayers(t *testing.T) {
	root := filepath.Join("..", "..")
	for _, layer := range layers {
		found := false
		err := filepath.WalkDir(filepath.Join(root, filepath.FromSlash(layer.folder)), func(path string, d fs.DirEntry, err error) error {
			if err != nil || d.IsDir() || !strings.HasSuffix(path, ".go") || strings.HasSuffix(path, "_test.go") {
				return err
			}
			found = true
			f, err := parser.ParseFile(token.NewFileSet(), path, nil, parser.ImportsOnly)
			if err != nil {
				return err
			}
			for _, spec := range f.Imports {
				name, err := strconv.Unquote(spec.Path.Value)
				if err != nil {
					return err
				}
				for _, never := range layer.never {
					if name == never || strings.HasSuffix(never, "/") && strings.HasPrefix(name, never) {
						t.Errorf("%s imports %s", path, name)
					}
				}
			}
			return nil
		})
		if err != nil {
			t.Fatal(err)
		}
		if !found {
			t.Errorf("no code in %s", layer.folder)
		}
	}
}
