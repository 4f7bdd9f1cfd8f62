// Package journal keeps unsaved work against a crash, a lost connection or a
// killed program: in a file per running program, in the user's state folder, for
// its owner's eyes alone. What was left is found again at the next start.
//
// A journal is a session file with a mark beside the work. Beside it lies a file
// that the running program holds locked, so that the work of a program that still
// runs is told from what was left.
package journal

import (
	"errors"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"time"

	"github.com/adrg/xdg"

	"polewright/ui/session"
)

const (
	ending       = ".work.json"
	lockEnding   = ".lock"
	reportEnding = ".fault.txt"
	// Kept is how long a journal that nobody takes up is kept, and a report of a fault.
	Kept = 30 * 24 * time.Hour
)

// Folder is where journals are kept: below XDG_STATE_HOME, or its counterpart on
// systems without.
func Folder() string { return filepath.Join(xdg.StateHome, "polewright", "journal") }

// prepare makes the folder, for its owner alone.
func prepare(folder string) error {
	if err := os.MkdirAll(folder, 0o700); err != nil {
		return err
	}
	info, err := os.Stat(folder)
	if err != nil {
		return err
	}
	if info.Mode().Perm()&0o077 != 0 {
		return os.Chmod(folder, 0o700)
	}
	return nil
}

// Report writes what is known of a fault in the program, for its owner's eyes, and
// returns where.
func Report(folder string, text []byte, now time.Time) (string, error) {
	if err := prepare(folder); err != nil {
		return "", err
	}
	path := filepath.Join(folder, now.UTC().Format("20060102-150405.000000000")+reportEnding)
	return path, session.WritePrivate(path, text)
}

// Clean removes journals that nobody took up for longer than Kept, reports as old,
// and the locks of programs that left no journal. What a running program holds
// stays.
func Clean(folder string, now time.Time) {
	entries, err := os.ReadDir(folder)
	if err != nil {
		return
	}
	for _, e := range entries {
		if strings.HasSuffix(e.Name(), reportEnding) {
			if info, err := e.Info(); err == nil && now.Sub(info.ModTime()) > Kept {
				_ = os.Remove(filepath.Join(folder, e.Name()))
			}
			continue
		}
		stem, isLock := strings.CutSuffix(e.Name(), lockEnding)
		if !isLock {
			var isWork bool
			if stem, isWork = strings.CutSuffix(e.Name(), ending); !isWork {
				continue
			}
		}
		path := filepath.Join(folder, stem)
		info, err := os.Lstat(path + ending)
		switch {
		case err == nil && now.Sub(info.ModTime()) <= Kept:
			continue
		case err != nil && !errors.Is(err, fs.ErrNotExist):
			continue
		}
		if c, ok := claim(path); ok {
			c.remove()
		}
	}
}
