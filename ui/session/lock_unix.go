//go:build darwin || dragonfly || freebsd || linux || netbsd || openbsd

package session

import (
	"errors"
	"os"
	"syscall"
	"time"
)

// lock waits a little until no other program holds the file. File systems without
// locks let everybody pass.
func lock(f *os.File) error {
	for range 200 {
		err := syscall.Flock(int(f.Fd()), syscall.LOCK_EX|syscall.LOCK_NB)
		switch {
		case err == nil:
			return nil
		case errors.Is(err, syscall.EINTR):
		case !errors.Is(err, syscall.EWOULDBLOCK):
			return nil
		default:
			time.Sleep(10 * time.Millisecond)
		}
	}
	return errors.New("another program is writing it")
}
