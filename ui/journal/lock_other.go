//go:build !(darwin || dragonfly || freebsd || linux || netbsd || openbsd)

package journal

import "os"

// tryLock relies on systems where a file that is open cannot be removed: one
// whose name goes away and comes back was held by nobody.
func tryLock(f *os.File) bool {
	name := f.Name()
	_ = f.Close()
	if os.Remove(name) != nil {
		return false
	}
	again, err := os.OpenFile(name, os.O_RDWR|os.O_CREATE|os.O_EXCL, 0o600)
	if err != nil {
		return false
	}
	*f = *again
	return true
}
