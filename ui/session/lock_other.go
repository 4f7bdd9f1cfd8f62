//go:build !(darwin || dragonfly || freebsd || linux || netbsd || openbsd)

package session

import "os"

// lock does nothing: where a file that is open cannot be replaced, the system
// itself makes programs take turns.
func lock(*os.File) error { return nil }
