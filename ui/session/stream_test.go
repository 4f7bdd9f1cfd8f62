package session_test

import (
	"errors"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"polewright/ui/session"
)

func text(s string) func(io.Writer) error {
	return func(w io.Writer) error {
		_, err := io.WriteString(w, s)
		return err
	}
}

// folderHolds holds that these files and no others are in a folder.
func folderHolds(t *testing.T, dir string, want map[string]string) {
	t.Helper()
	list, err := os.ReadDir(dir)
	if err != nil {
		t.Fatal(err)
	}
	if len(list) != len(want) {
		t.Errorf("%d files, expected %d: %v", len(list), len(want), list)
	}
	for name, content := range want {
		if have, err := os.ReadFile(filepath.Join(dir, name)); err != nil || string(have) != content {
			t.Errorf("%s: %.40q, %v", name, have, err)
		}
	}
}

func TestWriteStream(t *testing.T) {
	dir := t.TempDir()
	path := filepath.Join(dir, "out.csv")
	long := strings.Repeat("0.123456789,", 30000)
	if err := session.WriteStream(path, false, text(long)); err != nil {
		t.Fatal(err)
	}
	folderHolds(t, dir, map[string]string{"out.csv": long})
	if err := session.WriteStream(path, false, text("other")); !errors.Is(err, fs.ErrExist) {
		t.Errorf("an existing file: %v", err)
	}
	folderHolds(t, dir, map[string]string{"out.csv": long})
	if err := os.Chmod(path, 0o640); err != nil {
		t.Fatal(err)
	}
	if err := session.WriteStream(path, true, text("new")); err != nil {
		t.Fatal(err)
	}
	folderHolds(t, dir, map[string]string{"out.csv": "new"})
	if info, err := os.Stat(path); err != nil || info.Mode().Perm() != 0o640 {
		t.Errorf("permissions %v, %v", info.Mode(), err)
	}
	for _, bad := range []string{filepath.Join(dir, "nowhere", "out.csv"), dir} {
		if err := session.WriteStream(bad, true, text("x")); err == nil {
			t.Errorf("%s: no error", bad)
		}
	}
	folderHolds(t, dir, map[string]string{"out.csv": "new"})
}

// What fails half way leaves the old file, no temporary one, and its own error.
func TestWriteStreamThatFails(t *testing.T) {
	broken := errors.New("broken")
	for _, force := range []bool{false, true} {
		dir := t.TempDir()
		want := map[string]string{}
		if force {
			want["out.csv"] = "old"
			if err := os.WriteFile(filepath.Join(dir, "out.csv"), []byte("old"), 0o600); err != nil {
				t.Fatal(err)
			}
		}
		err := session.WriteStream(filepath.Join(dir, "out.csv"), force, func(w io.Writer) error {
			if _, err := io.WriteString(w, strings.Repeat("x", 1<<18)); err != nil {
				return err
			}
			return broken
		})
		if err != broken {
			t.Errorf("error %v", err)
		}
		folderHolds(t, dir, want)
	}
}

// A file that someone else makes meanwhile is not written over.
func TestWriteStreamThatIsOvertaken(t *testing.T) {
	dir := t.TempDir()
	path := filepath.Join(dir, "out.csv")
	err := session.WriteStream(path, false, func(w io.Writer) error {
		return os.WriteFile(path, []byte("theirs"), 0o600)
	})
	if !errors.Is(err, fs.ErrExist) {
		t.Errorf("error %v", err)
	}
	folderHolds(t, dir, map[string]string{"out.csv": "theirs"})
}

// A link is followed: its target is replaced, not the link.
func TestWriteStreamThroughALink(t *testing.T) {
	dir, other := t.TempDir(), t.TempDir()
	target, path := filepath.Join(other, "real.csv"), filepath.Join(dir, "out.csv")
	if err := os.WriteFile(target, []byte("old"), 0o600); err != nil {
		t.Fatal(err)
	}
	if err := os.Symlink(target, path); err != nil {
		t.Skip("no links here")
	}
	if err := session.WriteStream(path, true, text("new")); err != nil {
		t.Fatal(err)
	}
	folderHolds(t, other, map[string]string{"real.csv": "new"})
	if info, err := os.Lstat(path); err != nil || info.Mode()&fs.ModeSymlink == 0 {
		t.Errorf("%v, %v", info, err)
	}
}
