package launch

import (
	"errors"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"polewright/estimator"
	"polewright/plants"
	"polewright/plants/library"
	"polewright/scenarios"
	"polewright/ui/aim"
	"polewright/ui/desk"
	"polewright/ui/session"
)

// work is a design on a built-in plant, at speed times its first poles.
func work(t *testing.T, speed float64) desk.Work {
	t.Helper()
	text, file, _ := library.Plant("lift")
	p, err := plants.Parse(file, text)
	if err != nil {
		t.Fatal(err)
	}
	m, err := p.Model(plants.Options{})
	if err != nil {
		t.Fatal(err)
	}
	d, err := estimator.NewDesigner(m, estimator.Options{})
	if err != nil {
		t.Fatal(err)
	}
	list, err := aim.Start(m, d)
	if err != nil {
		t.Fatal(err)
	}
	for i := range list {
		list[i] *= complex(speed, 0)
	}
	design, err := d.Place(list, nil)
	if err != nil {
		t.Fatal(err)
	}
	return desk.Work{
		Bench: &desk.Bench{Plant: p, PlantFile: file, PlantText: text, Model: m, Scenario: scenarios.Default(p)},
		Poles: list, Gain: design.Gain,
	}
}

func opened(t *testing.T, file string) *store {
	t.Helper()
	w, sum, err := session.LoadSum(file)
	if err != nil {
		t.Fatal(err)
	}
	s, err := newStore(&Options{Work: *w, Known: sum})
	if err != nil {
		t.Fatal(err)
	}
	return s
}

func content1(t *testing.T, file string) string {
	t.Helper()
	data, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	return string(data)
}

// Two programs have one session open: the second to save is told, and what it is
// told about is all that it may replace.
func TestTwoOnOneSession(t *testing.T) {
	dir := t.TempDir()
	file := filepath.Join(dir, "bench.session.json")
	one, two, three := work(t, 1), work(t, 0.9), work(t, 0.8)
	if err := session.Save(file, "test", &one, false); err != nil {
		t.Fatal(err)
	}
	a, b := opened(t, file), opened(t, file)
	if err := a.save(file, two, false); err != nil { // its own file, unchanged
		t.Fatal(err)
	}
	theirs := content1(t, file)
	for range 2 { // asked again, it says so again
		if err := b.save(file, three, false); !errors.Is(err, fs.ErrExist) {
			t.Fatalf("got %v", err)
		}
	}
	if content1(t, file) != theirs {
		t.Fatal("the second save won silently")
	}

	// another name is free
	other := filepath.Join(dir, "other.session.json")
	if err := b.save(other, three, false); err != nil {
		t.Fatal(err)
	}
	if b.where() != other {
		t.Errorf("saved in %s", b.where())
	}

	// whoever was asked may replace, but not what came after the question
	if err := b.save(file, three, false); !errors.Is(err, fs.ErrExist) {
		t.Fatalf("got %v", err)
	}
	if err := a.save(file, one, false); err != nil {
		t.Fatal(err)
	}
	theirs = content1(t, file)
	if err := b.save(file, three, true); !errors.Is(err, fs.ErrExist) {
		t.Fatalf("what nobody was asked about was replaced: %v", err)
	}
	if content1(t, file) != theirs {
		t.Fatal("the second save won silently")
	}
	if err := b.save(file, three, true); err != nil {
		t.Fatal(err)
	}
	if err := b.save(file, two, false); err != nil { // now its own
		t.Error(err)
	}
	if err := a.save(file, one, false); !errors.Is(err, fs.ErrExist) { // and no longer the other's
		t.Errorf("got %v", err)
	}
}

func TestStoreRefusesStrangers(t *testing.T) {
	file := filepath.Join(t.TempDir(), "notes.json")
	if err := os.WriteFile(file, []byte("my notes"), 0o600); err != nil {
		t.Fatal(err)
	}
	s := &store{program: "test"}
	if err := s.save(file, work(t, 1), false); !errors.Is(err, fs.ErrExist) {
		t.Errorf("got %v", err)
	}
	if content1(t, file) != "my notes" {
		t.Error("overwritten")
	}
	if err := s.save(file, work(t, 1), true); err != nil {
		t.Error(err)
	}
	other := filepath.Join(filepath.Dir(file), "other.json")
	if err := os.WriteFile(other, []byte("more notes"), 0o600); err != nil {
		t.Fatal(err)
	}
	if err := s.save(other, work(t, 1), true); err != nil { // named outright
		t.Error(err)
	}
}

// What cannot be saved is said in words, and saved elsewhere.
func TestStoreInTrouble(t *testing.T) {
	dir := t.TempDir()
	folder := filepath.Join(dir, "folder")
	if err := os.Mkdir(folder, 0o700); err != nil {
		t.Fatal(err)
	}
	file := filepath.Join(folder, "bench.session.json")
	s := &store{program: "test"}
	w := work(t, 1)
	if err := s.save(file, w, false); err != nil {
		t.Fatal(err)
	}
	if err := os.RemoveAll(folder); err != nil {
		t.Fatal(err)
	}
	err := s.save(file, w, false)
	if err == nil || errors.Is(err, fs.ErrExist) || err.Error() != file+": there is no folder "+folder || strings.Contains(err.Error(), "\n") {
		t.Errorf("got %v", err)
	}
	if s.where() != file || s.mark().File != file {
		t.Error("a save that failed changed what is known")
	}
	if err := s.save(filepath.Join(dir, "elsewhere.session.json"), w, false); err != nil {
		t.Error(err)
	}
}
