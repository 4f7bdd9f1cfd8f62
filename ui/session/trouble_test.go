package session

import (
	"errors"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
)

// failing is a file on a disk that fails.
type failing struct {
	*os.File
	room    int
	syncErr error
}

func (f *failing) Write(p []byte) (int, error) {
	if len(p) <= f.room {
		return f.File.Write(p)
	}
	n, _ := f.File.Write(p[:f.room])
	return n, &fs.PathError{Op: "write", Path: f.Name(), Err: syscall.ENOSPC}
}

func (f *failing) Sync() error { return f.syncErr }

func TestDiskThatFails(t *testing.T) {
	for name, c := range map[string]struct {
		room  int
		sync  error
		words string
	}{
		"full from the start": {0, nil, "no space left on device"},
		"full in the middle":  {5, nil, "no space left on device"},
		"flush fails":         {1 << 20, syscall.EIO, "input/output error"},
	} {
		t.Run(name, func(t *testing.T) {
			dir := t.TempDir()
			file := filepath.Join(dir, "work.session.json")
			if err := os.WriteFile(file, []byte("old work"), 0o640); err != nil {
				t.Fatal(err)
			}
			d := disk{create: func(name string, mode fs.FileMode) (temporary, error) {
				f, err := os.OpenFile(name, os.O_WRONLY|os.O_CREATE|os.O_EXCL, mode)
				return &failing{f, c.room, c.sync}, err
			}}
			err := d.write(file, []byte("new work, longer"), 0o644, func(Sum) bool { return true })
			oneLine(t, err, c.words)
			holds(t, file, "old work")
			only(t, dir, "work.session.json")
		})
	}
}

// A disk that is really full, where this user may make one.
func TestFullDisk(t *testing.T) {
	dir := t.TempDir()
	if err := mountSmall(dir); err != nil {
		t.Skipf("no small disk can be made here: %v", err)
	}
	t.Cleanup(func() { _ = unmount(dir) })
	file := filepath.Join(dir, "work.session.json")
	if err := WriteNew(file, []byte("old work"), false); err != nil {
		t.Fatal(err)
	}
	err := WriteNew(file, make([]byte, 1<<20), true)
	oneLine(t, err, "no space left on device")
	holds(t, file, "old work")
	only(t, dir, "work.session.json")
}

func TestFoldersThatRefuse(t *testing.T) {
	gone := filepath.Join(t.TempDir(), "gone")
	err := WriteNew(filepath.Join(gone, "work.session.json"), []byte("x"), false)
	oneLine(t, err, "there is no folder "+gone)

	folder := t.TempDir()
	oneLine(t, WriteNew(folder, []byte("x"), true), "not a regular file")

	closed := t.TempDir()
	file := filepath.Join(closed, "work.session.json")
	if err := os.WriteFile(file, []byte("old work"), 0o600); err != nil {
		t.Fatal(err)
	}
	asNobody(t, closed, func() {
		if err := WriteNew(file, []byte("old work"), true); err != nil {
			t.Error("an open folder refuses:", err)
		}
		if err := os.Chmod(closed, 0o500); err != nil {
			t.Fatal(err)
		}
		oneLine(t, WriteNew(file, []byte("x"), true), "permission denied")
		if err := os.Chmod(closed, 0o700); err != nil {
			t.Fatal(err)
		}
		if err := os.Chmod(file, 0o400); err != nil {
			t.Fatal(err)
		}
		oneLine(t, WriteNew(file, []byte("x"), true), "permission denied")
	})
	holds(t, file, "old work")
	only(t, closed, "work.session.json")
}

func TestPermissionsAndLinksStay(t *testing.T) {
	dir := t.TempDir()
	file, link := filepath.Join(dir, "real.session.json"), filepath.Join(dir, "link.session.json")
	if err := WriteNew(file, []byte("one"), false); err != nil {
		t.Fatal(err)
	}
	if info, err := os.Stat(file); err != nil || info.Mode().Perm()&0o600 != 0o600 || info.Mode().Perm()&0o022 != 0 {
		t.Errorf("new file: %v, %v", info.Mode(), err)
	}
	if err := os.Chmod(file, 0o640); err != nil {
		t.Fatal(err)
	}
	if err := os.Symlink("real.session.json", link); err != nil {
		t.Skip(err)
	}
	if err := WriteNew(link, []byte("two"), true); err != nil {
		t.Fatal(err)
	}
	holds(t, file, "two")
	if info, err := os.Stat(file); err != nil || info.Mode().Perm() != 0o640 {
		t.Errorf("old file: %v, %v", info.Mode(), err)
	}
	if info, err := os.Lstat(link); err != nil || info.Mode()&fs.ModeSymlink == 0 {
		t.Errorf("the link became %v, %v", info.Mode(), err)
	}
}

func TestReplaceOnlyWhatIsKnown(t *testing.T) {
	dir := t.TempDir()
	file := filepath.Join(dir, "work.session.json")
	if err := WriteNew(file, []byte("mine"), false); err != nil {
		t.Fatal(err)
	}
	known, err := SumOf(file)
	if err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(file, []byte("theirs"), 0o600); err != nil {
		t.Fatal(err)
	}
	if err := Replace(file, []byte("newer"), known); !errors.Is(err, fs.ErrExist) {
		t.Errorf("got %v", err)
	}
	holds(t, file, "theirs")
	if err := os.Remove(file); err != nil {
		t.Fatal(err)
	}
	if err := Replace(file, []byte("newer"), known); err != nil { // nobody's work is lost
		t.Error(err)
	}
	holds(t, file, "newer")
}

// Of many that replace the same content at the same time, one wins and the others
// are told.
func TestReplaceTakesTurns(t *testing.T) {
	file := filepath.Join(t.TempDir(), "work.session.json")
	if err := WriteNew(file, []byte("start"), false); err != nil {
		t.Fatal(err)
	}
	for round := range 20 {
		known, err := SumOf(file)
		if err != nil {
			t.Fatal(err)
		}
		const many = 8
		results := make(chan error, many)
		for i := range many {
			go func() { results <- Replace(file, []byte{byte(round), byte(i)}, known) }()
		}
		won := 0
		for range many {
			switch err := <-results; {
			case err == nil:
				won++
			case !errors.Is(err, fs.ErrExist):
				t.Error(err)
			}
		}
		if won != 1 {
			t.Fatalf("%d of %d replaced the same content", won, many)
		}
	}
}

// Of many that make the same new file, one wins.
func TestWriteNewTakesTurns(t *testing.T) {
	dir := t.TempDir()
	const many = 16
	results := make(chan error, many)
	for i := range many {
		go func() { results <- WriteNew(filepath.Join(dir, "new.json"), []byte{byte(i)}, false) }()
	}
	won := 0
	for range many {
		switch err := <-results; {
		case err == nil:
			won++
		case !errors.Is(err, fs.ErrExist):
			t.Error(err)
		}
	}
	if won != 1 {
		t.Fatalf("%d of %d made the same file", won, many)
	}
	only(t, dir, "new.json")
}

func oneLine(t *testing.T, err error, words string) {
	t.Helper()
	if err == nil {
		t.Fatal("no error")
	}
	if text := err.Error(); !strings.Contains(text, words) || strings.Contains(text, "\n") || strings.Contains(text, tempStart) {
		t.Errorf("got %q, expected one line with %q", text, words)
	}
}

func holds(t *testing.T, file, content string) {
	t.Helper()
	if got, err := os.ReadFile(file); err != nil || string(got) != content {
		t.Errorf("%s holds %q, %v; expected %q", file, got, err, content)
	}
}

func only(t *testing.T, dir, name string) {
	t.Helper()
	list, err := os.ReadDir(dir)
	if err != nil {
		t.Fatal(err)
	}
	for _, e := range list {
		if e.Name() != name {
			t.Errorf("%s was left", e.Name())
		}
	}
}
