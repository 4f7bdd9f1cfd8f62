package cli

import (
	"os"
	"path/filepath"
	"testing"

	"polewright/estimator/emit"
)

func TestWriteAllStaysInItsFolder(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "in")
	if err := os.Mkdir(dir, 0o700); err != nil {
		t.Fatal(err)
	}
	for _, name := range []string{"../out.h", "/tmp/out.h", "sub/out.h", "..", ""} {
		if err := writeAll(dir, []emit.File{{Name: "a.h"}, {Name: name}}, true); err == nil {
			t.Errorf("%q: no error", name)
		}
	}
	for _, folder := range []string{dir, filepath.Dir(dir)} {
		list, err := os.ReadDir(folder)
		if want := map[string]int{dir: 0, filepath.Dir(dir): 1}[folder]; err != nil || len(list) != want {
			t.Errorf("%s: %v, %v", folder, list, err)
		}
	}
}

// What was written before another file failed is taken back: new files go, old ones
// return.
func TestTakeBack(t *testing.T) {
	dir := t.TempDir()
	old := []emit.File{{Name: "a.h", Text: []byte("old")}, {Name: "empty.h"}}
	if err := writeAll(dir, old, false); err != nil {
		t.Fatal(err)
	}
	files := []emit.File{{Name: "a.h", Text: []byte("new")}, {Name: "empty.h", Text: []byte("new")}, {Name: "b.c", Text: []byte("new")}}
	if err := writeAll(dir, files, true); err != nil {
		t.Fatal(err)
	}
	takeBack(dir, files, [][]byte{[]byte("old"), {}, nil})
	for _, f := range old {
		if text, err := os.ReadFile(filepath.Join(dir, f.Name)); err != nil || string(text) != string(f.Text) {
			t.Errorf("%s: %q, %v", f.Name, text, err)
		}
	}
	if list, err := os.ReadDir(dir); err != nil || len(list) != 2 {
		t.Errorf("%v, %v", list, err)
	}
}
