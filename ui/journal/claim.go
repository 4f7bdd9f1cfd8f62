package journal

import (
	"errors"
	"io/fs"
	"os"
)

// held is a journal's path, without its endings, that no other program can take.
type held struct {
	path string
	lock *os.File
}

// claim takes a path unless a running program holds it.
func claim(path string) (*held, bool) {
	for range 10 {
		f, err := os.OpenFile(path+lockEnding, os.O_RDWR|os.O_CREATE, 0o600)
		if err != nil {
			return nil, false
		}
		if !tryLock(f) {
			_ = f.Close()
			return nil, false
		}
		// the one who held it may have removed it just now
		mine, err1 := f.Stat()
		there, err2 := os.Stat(path + lockEnding)
		if err1 == nil && err2 == nil && os.SameFile(mine, there) {
			return &held{path: path, lock: f}, true
		}
		_ = f.Close()
	}
	return nil, false
}

// release leaves the journal for a later start.
func (h *held) release() {
	if h.lock == nil {
		return
	}
	if _, err := os.Lstat(h.path + ending); errors.Is(err, fs.ErrNotExist) {
		h.removeLock()
		return
	}
	_ = h.lock.Close()
	h.lock = nil
}

// remove ends the journal.
func (h *held) remove() {
	if h.lock == nil {
		return
	}
	_ = os.Remove(h.path + ending)
	h.removeLock()
}

// removeLock removes the name before the lock is let go, where the system allows.
func (h *held) removeLock() {
	err := os.Remove(h.path + lockEnding)
	_ = h.lock.Close()
	if err != nil {
		_ = os.Remove(h.path + lockEnding)
	}
	h.lock = nil
}

// removeWork removes the work alone: the program that holds it goes on.
func removeWork(path string) error {
	err := os.Remove(path + ending)
	if errors.Is(err, fs.ErrNotExist) {
		return nil
	}
	return err
}
