package session

import (
	"crypto/rand"
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"runtime"
	"strings"
	"syscall"
	"time"
)

// Sum tells the content of a file from any other: its SHA-256.
type Sum [sha256.Size]byte

// A file is written under a name of this shape beside the one that it replaces.
// One that a killed program left is swept away by a later save once it is old.
const (
	tempStart, tempEnd = ".polewright-", ".tmp"
	tempAge            = time.Hour
)

var errNotRegular = errors.New("not a regular file")

// temporary is a file that is being written.
type temporary interface {
	io.WriteCloser
	Chmod(fs.FileMode) error
	Sync() error
}

// disk is where files are written. The zero value is the real one.
type disk struct {
	create func(name string, mode fs.FileMode) (temporary, error)
}

func (d disk) open(name string, mode fs.FileMode) (temporary, error) {
	if d.create != nil {
		return d.create(name, mode)
	}
	return os.OpenFile(name, os.O_WRONLY|os.O_CREATE|os.O_EXCL, mode)
}

// WriteNew writes a whole file atomically and durably. Without force it refuses,
// with an error that is fs.ErrExist, where something by that name exists.
func WriteNew(path string, data []byte, force bool) error {
	if _, err := os.Lstat(path); err == nil && !force {
		return said(path, fs.ErrExist)
	}
	return disk{}.write(path, data, 0o644, func(Sum) bool { return force })
}

// Replace writes a whole file atomically and durably. It refuses, with an error
// that is fs.ErrExist, where the file exists and holds other content than what
// known stands for. Programs that replace a file at the same time take turns.
func Replace(path string, data []byte, known Sum) error {
	return disk{}.write(path, data, 0o644, func(old Sum) bool { return old == known })
}

// WritePrivate writes a whole file atomically and durably, for its owner's eyes.
func WritePrivate(path string, data []byte) error {
	return disk{}.write(path, data, 0o600, func(Sum) bool { return true })
}

// SumOf returns what stands for the content of a file now.
func SumOf(path string) (Sum, error) {
	f, err := openRegular(path, os.O_RDONLY)
	if err != nil {
		return Sum{}, err
	}
	defer f.Close()
	return sum(f)
}

// sum reads at most what a session may hold; anything larger is none.
func sum(r io.Reader) (s Sum, err error) {
	h := sha256.New()
	if _, err = io.Copy(h, io.LimitReader(r, maxFile+1)); err == nil {
		h.Sum(s[:0])
	}
	return s, err
}

// write puts data in the place of path: written beside it, flushed to the disk,
// renamed, and the folder flushed, so that whoever is interrupted at any instant
// finds the old file or the new one. An old file keeps its permissions; it is
// replaced only where allowed says so of its content. A link is followed.
func (d disk) write(path string, data []byte, mode fs.FileMode, allowed func(old Sum) bool) error {
	target := path
	if real, err := filepath.EvalSymlinks(path); err == nil {
		target = real
	}
	old, err := lockOld(target)
	switch {
	case err == nil:
		defer old.Close()
		content, err := sum(old)
		if err != nil {
			return said(path, err)
		}
		if !allowed(content) {
			return &fs.PathError{Op: "save", Path: path, Err: fs.ErrExist}
		}
		info, err := old.Stat()
		if err != nil {
			return said(path, err)
		}
		mode = info.Mode().Perm()
	case !errors.Is(err, fs.ErrNotExist):
		return said(path, err)
	}
	temp, err := d.fill(filepath.Dir(target), data, mode, old != nil)
	if err != nil {
		return said(path, err)
	}
	if old != nil {
		if runtime.GOOS == "windows" { // where an open file cannot be replaced
			_ = old.Close()
		}
		err = os.Rename(temp, target)
	} else {
		err = appear(temp, target)
	}
	if err != nil {
		_ = os.Remove(temp)
		return said(path, err)
	}
	sweep(filepath.Dir(target))
	if err := syncFolder(filepath.Dir(target)); err != nil {
		return said(path, err)
	}
	return nil
}

// fill writes and flushes a temporary file in a folder and returns its name. An
// exact mode is that of the file before; else the user's mask applies.
func (d disk) fill(folder string, data []byte, mode fs.FileMode, exact bool) (string, error) {
	var random [8]byte
	_, _ = rand.Read(random[:]) // cannot fail
	name := filepath.Join(folder, tempStart+hex.EncodeToString(random[:])+tempEnd)
	f, err := d.open(name, mode)
	if err != nil {
		return "", err
	}
	if exact && runtime.GOOS != "windows" {
		err = f.Chmod(mode)
	}
	if err == nil {
		_, err = f.Write(data)
	}
	if err == nil {
		err = f.Sync()
	}
	if closing := f.Close(); err == nil {
		err = closing
	}
	if err != nil {
		_ = os.Remove(name)
	}
	return name, err
}

// appear gives a temporary file its name where no other file has it, also where
// one takes it at the same time.
func appear(temp, target string) error {
	err := os.Link(temp, target)
	if err == nil {
		return os.Remove(temp)
	}
	if errors.Is(err, fs.ErrExist) {
		return fs.ErrExist
	}
	// a file system without links
	if _, err := os.Lstat(target); err == nil {
		return fs.ErrExist
	}
	return os.Rename(temp, target)
}

// lockOld opens the file that is to be replaced and holds other programs that
// would replace it until it is closed.
func lockOld(target string) (*os.File, error) {
	for range 100 {
		f, err := openRegular(target, os.O_RDWR)
		if err != nil {
			return nil, err
		}
		if err := lock(f); err != nil {
			_ = f.Close()
			return nil, err
		}
		held, err := f.Stat()
		if err == nil {
			var now fs.FileInfo
			if now, err = os.Stat(target); err == nil && os.SameFile(held, now) {
				return f, nil
			}
		}
		_ = f.Close() // replaced while this waited
		if err != nil {
			return nil, err
		}
	}
	return nil, errors.New("it is being replaced all the time")
}

// openRegular opens a file and never anything that would wait or answer.
func openRegular(path string, how int) (*os.File, error) {
	info, err := os.Stat(path)
	if err != nil {
		return nil, err
	}
	if !info.Mode().IsRegular() {
		return nil, errNotRegular
	}
	return os.OpenFile(path, how, 0)
}

// syncFolder makes a rename last. Systems that cannot do it say so and are left
// in peace.
func syncFolder(folder string) error {
	if runtime.GOOS == "windows" {
		return nil
	}
	f, err := os.Open(folder)
	if err != nil {
		return err
	}
	defer f.Close()
	if err := f.Sync(); err != nil && !errors.Is(err, syscall.EINVAL) && !errors.Is(err, errors.ErrUnsupported) {
		return err
	}
	return nil
}

// sweep removes what killed programs left in a folder long ago.
func sweep(folder string) {
	left, _ := filepath.Glob(filepath.Join(escapeGlob(folder), tempStart+"*"+tempEnd))
	for _, name := range left {
		if info, err := os.Lstat(name); err == nil && info.Mode().IsRegular() && time.Since(info.ModTime()) > tempAge {
			_ = os.Remove(name)
		}
	}
}

func escapeGlob(folder string) string {
	if runtime.GOOS == "windows" {
		return folder
	}
	return strings.NewReplacer(`\`, `\\`, `*`, `\*`, `?`, `\?`, `[`, `\[`).Replace(folder)
}

// said puts what went wrong in words about the file that the user named.
func said(path string, err error) error {
	var p *fs.PathError
	var l *os.LinkError
	switch {
	case errors.Is(err, fs.ErrExist):
		err = fs.ErrExist
	case errors.Is(err, fs.ErrNotExist):
		err = fmt.Errorf("there is no folder %s", Printable(filepath.Dir(path), 200))
	case errors.As(err, &p):
		err = p.Err
	case errors.As(err, &l):
		err = l.Err
	}
	return &fs.PathError{Op: "save", Path: path, Err: err}
}
