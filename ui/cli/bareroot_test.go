//go:build linux

package cli_test

import (
	"errors"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
)

// bareRoot is a root folder with nothing in it but the program, built as for a
// release.
func bareRoot(t *testing.T) string {
	t.Helper()
	if testing.Short() {
		t.Skip("builds and drives the program")
	}
	root := t.TempDir()
	cmd := exec.Command("go", "build", "-trimpath", "-ldflags", "-s -w", "-o", filepath.Join(root, "polewright"), "polewright")
	cmd.Env = append(os.Environ(), "CGO_ENABLED=0")
	if out, err := cmd.CombinedOutput(); err != nil {
		t.Fatalf("go build: %v\n%s", err, out)
	}
	return root
}

// inside is the program with root as all the files there are. Who is not root
// becomes it in a user namespace, where the system has these.
func inside(root string, args ...string) *exec.Cmd {
	cmd := &exec.Cmd{Path: "/polewright", Args: append([]string{"polewright"}, args...), Dir: "/", Env: []string{"TERM=xterm-256color"}}
	cmd.SysProcAttr = &syscall.SysProcAttr{Chroot: root}
	if os.Geteuid() != 0 {
		cmd.SysProcAttr.Cloneflags = syscall.CLONE_NEWUSER
		cmd.SysProcAttr.UidMappings = []syscall.SysProcIDMap{{ContainerID: 0, HostID: os.Getuid(), Size: 1}}
		cmd.SysProcAttr.GidMappings = []syscall.SysProcIDMap{{ContainerID: 0, HostID: os.Getgid(), Size: 1}}
	}
	return cmd
}

// The released program needs no file but itself: no library, no terminal
// description, no time zones, no home, no /dev and no /tmp.
func TestRunsOnABareRoot(t *testing.T) {
	t.Parallel()
	root := bareRoot(t)
	for _, c := range []struct{ args, says string }{
		{"--version", "polewright"},
		{"library", "lift"},
		{"design lift --poles floor", "steady-state noise"},
		{"simulate lift --poles floor", "t,"},
	} {
		out, err := inside(root, strings.Fields(c.args)...).CombinedOutput()
		var refused *os.PathError
		if errors.As(err, &refused) && !errors.Is(err, os.ErrNotExist) { // a library that is missing does not exist
			t.Skipf("no root folder of its own for this user: %v", err)
		}
		if err != nil || !strings.Contains(string(out), c.says) {
			t.Errorf("%s: %v\n%.400s", c.args, err, out)
		}
	}

	p := attach(t, inside(root, "lift"))
	p.waitFor("Platform lift")
	p.press(right + shiftRight)
	p.waitFor("unsaved")
	p.press(ctrlS)
	p.waitFor("session.json")
	p.press(enter)
	p.waitForFile(filepath.Join(root, "Platform lift.session.json"))
	p.press("q")
	p.quits()
}
