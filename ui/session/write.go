package session

import (
	"os"
	"path/filepath"

	"github.com/google/renameio/v2"
)

// writeAtomic replaces path by data: written beside it, flushed to the disk,
// renamed, and the folder flushed, so that whoever is interrupted at any instant
// finds the old file or the new one.
func writeAtomic(path string, data []byte) error {
	if err := renameio.WriteFile(path, data, 0o644, renameio.WithTempDir(filepath.Dir(path))); err != nil {
		return err
	}
	dir, err := os.Open(filepath.Dir(path))
	if err != nil {
		return err
	}
	defer dir.Close()
	return dir.Sync()
}

// WriteNew writes a whole file atomically. Without force it refuses, with an
// error that is os.ErrExist, where something by that name exists.
func WriteNew(path string, data []byte, force bool) error {
	if !force {
		if _, err := os.Lstat(path); err == nil {
			return &os.PathError{Op: "write", Path: path, Err: os.ErrExist}
		}
	}
	return writeAtomic(path, data)
}
