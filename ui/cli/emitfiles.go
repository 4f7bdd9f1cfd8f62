package cli

import (
	"errors"
	"fmt"
	"os"
	"path/filepath"

	"polewright/estimator/emit"
	"polewright/ui/session"
)

// writeAll writes files into an existing folder, all of them or none: every name is
// looked at before the first is written, and what was written is taken back where a
// later one fails. No link in the folder is followed.
func writeAll(folder string, files []emit.File, force bool) error {
	info, err := os.Stat(folder)
	if err == nil && !info.IsDir() {
		err = errors.New("not a folder")
	}
	if errors.Is(err, os.ErrNotExist) {
		err = errors.New("no such folder")
	}
	if err != nil {
		return fileError(folder, "an existing folder", err)
	}
	before := make([][]byte, len(files)) // nil where there was none
	for i, f := range files {
		if filepath.Base(f.Name) != f.Name || !filepath.IsLocal(f.Name) {
			return fmt.Errorf("%s: a file's name that leads out of the folder: %q", folder, f.Name)
		}
		path := filepath.Join(folder, f.Name)
		old, err := os.Lstat(path)
		switch {
		case errors.Is(err, os.ErrNotExist):
			continue
		case err == nil && !force:
			err = os.ErrExist
		case err == nil && !old.Mode().IsRegular():
			err = errors.New("not a regular file")
		case err == nil:
			before[i], err = os.ReadFile(path)
		}
		if err != nil {
			return fileError(path, newFile, err)
		}
	}
	for i, f := range files {
		path := filepath.Join(folder, f.Name)
		if err := session.WriteNew(path, f.Text, before[i] != nil); err != nil {
			takeBack(folder, files[:i], before)
			return fileError(path, newFile, err)
		}
	}
	return nil
}

// takeBack restores what stood before, as far as the folder lets it.
func takeBack(folder string, files []emit.File, before [][]byte) {
	for i, f := range files {
		path := filepath.Join(folder, f.Name)
		if before[i] == nil {
			_ = os.Remove(path)
		} else {
			_ = session.WriteNew(path, before[i], true)
		}
	}
}
