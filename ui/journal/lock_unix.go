//go:build darwin || dragonfly || freebsd || linux || netbsd || openbsd

package journal

import (
	"errors"
	"os"
	"syscall"
)

// tryLock holds a file until it is closed or the program ends in whatever way.
// File systems without locks let everybody pass.
func tryLock(f *os.File) bool {
	for {
		err := syscall.Flock(int(f.Fd()), syscall.LOCK_EX|syscall.LOCK_NB)
		if !errors.Is(err, syscall.EINTR) {
			return !errors.Is(err, syscall.EWOULDBLOCK)
		}
	}
}
