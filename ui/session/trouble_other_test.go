//go:build !linux

package session

import (
	"errors"
	"os"
	"testing"
)

func mountSmall(string) error { return errors.ErrUnsupported }
func unmount(string) error    { return nil }

func asNobody(t *testing.T, _ string, do func()) {
	t.Helper()
	if os.Geteuid() == 0 {
		t.Skip("root may write everywhere")
	}
	do()
}
