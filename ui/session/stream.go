package session

import (
	"bufio"
	"crypto/rand"
	"encoding/hex"
	"errors"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"runtime"
)

// WriteStream is WriteNew for a file that is too long to be held in memory: fill
// writes its content, at first into a temporary file beside it. Where fill fails,
// nothing is left behind and its error is returned as it is.
func WriteStream(path string, force bool, fill func(io.Writer) error) (err error) {
	if _, err := os.Lstat(path); err == nil && !force {
		return said(path, fs.ErrExist)
	}
	target := path
	if real, err := filepath.EvalSymlinks(path); err == nil {
		target = real
	}
	mode := fs.FileMode(0o644)
	info, err := os.Stat(target)
	if err == nil {
		if !info.Mode().IsRegular() {
			return said(path, errors.New("not a regular file"))
		}
		mode = info.Mode().Perm()
	}
	var random [8]byte
	_, _ = rand.Read(random[:]) // cannot fail
	temp := filepath.Join(filepath.Dir(target), tempStart+hex.EncodeToString(random[:])+tempEnd)
	f, err := os.OpenFile(temp, os.O_WRONLY|os.O_CREATE|os.O_EXCL, mode)
	if err != nil {
		return said(path, err)
	}
	defer func() {
		if err != nil {
			_ = f.Close()
			_ = os.Remove(temp)
		}
	}()
	if info != nil && runtime.GOOS != "windows" { // as the file before, whatever the mask says
		if err := f.Chmod(mode); err != nil {
			return said(path, err)
		}
	}
	out := bufio.NewWriterSize(f, 1<<16)
	if err := fill(out); err != nil {
		return err
	}
	for _, finish := range []func() error{out.Flush, f.Sync, f.Close} {
		if err := finish(); err != nil {
			return said(path, err)
		}
	}
	if force {
		err = os.Rename(temp, target)
	} else {
		err = appear(temp, target)
	}
	if err != nil {
		return said(path, err)
	}
	sweep(filepath.Dir(target))
	if err := syncFolder(filepath.Dir(target)); err != nil {
		return said(path, err)
	}
	return nil
}
