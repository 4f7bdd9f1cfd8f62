package session

import (
	"os"
	"path/filepath"
	"runtime"
	"syscall"
	"testing"
)

// mountSmall makes a disk of 64 KiB.
func mountSmall(dir string) error {
	return syscall.Mount("tmpfs", dir, "tmpfs", 0, "size=64k")
}

func unmount(dir string) error { return syscall.Unmount(dir, syscall.MNT_DETACH) }

// asNobody does something that root is not asked about: where this is root, on a
// thread with another user's rights, to whom folder and files are given first.
func asNobody(t *testing.T, folder string, do func()) {
	t.Helper()
	if os.Geteuid() != 0 {
		do()
		return
	}
	const nobody = 65534
	give := func(uid int) {
		list, err := os.ReadDir(folder)
		if err != nil {
			t.Fatal(err)
		}
		for _, e := range list {
			if err := os.Chown(folder+"/"+e.Name(), uid, uid); err != nil {
				t.Fatal(err)
			}
		}
		if err := os.Chown(folder, uid, uid); err != nil {
			t.Fatal(err)
		}
	}
	if err := os.Chmod(filepath.Dir(folder), 0o755); err != nil { // the way there
		t.Fatal(err)
	}
	give(nobody)
	defer give(0)
	runtime.LockOSThread()
	defer runtime.UnlockOSThread()
	setUser := func(uid uintptr) {
		if _, _, e := syscall.RawSyscall(syscall.SYS_SETFSUID, uid, 0, 0); e != 0 {
			t.Fatal(e)
		}
	}
	setUser(nobody)
	defer setUser(0)
	do()
}
