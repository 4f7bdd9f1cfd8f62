//go:build unix

package cli_test

import (
	"fmt"
	"net"
	"os"
	"os/exec"
	"os/user"
	"path/filepath"
	"testing"
	"time"
)

// tool finds a program that a test needs; without it the test skips, or fails
// where POLEWRIGHT_REQUIRE_TOOLS=1.
func tool(t *testing.T, name string, places ...string) string {
	t.Helper()
	if path, err := exec.LookPath(name); err == nil {
		return path
	}
	for _, path := range places {
		if _, err := os.Stat(path); err == nil {
			return path
		}
	}
	if os.Getenv("POLEWRIGHT_REQUIRE_TOOLS") == "1" {
		t.Fatalf("%s is needed for this test", name)
	}
	t.Skipf("%s is not installed", name)
	return ""
}

// server is an SSH server of the test's own, on loopback, with its own keys.
type server struct{ port, key string }

func serve(t *testing.T) server {
	t.Helper()
	daemon := tool(t, "sshd", "/usr/sbin/sshd")
	tool(t, "ssh")
	keygen := tool(t, "ssh-keygen")
	if os.Getuid() == 0 { // where sshd drops its privileges to
		if err := os.MkdirAll("/run/sshd", 0o755); err != nil {
			t.Skipf("no place for sshd: %v", err)
		}
	}
	dir := t.TempDir()
	for _, name := range []string{"host", "client"} {
		if out, err := exec.Command(keygen, "-q", "-t", "ed25519", "-N", "", "-f", filepath.Join(dir, name)).CombinedOutput(); err != nil {
			t.Fatalf("ssh-keygen: %v\n%s", err, out)
		}
	}
	listener, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	_, port, err := net.SplitHostPort(listener.Addr().String())
	if err != nil {
		t.Fatal(err)
	}
	listener.Close()
	config := filepath.Join(dir, "config")
	text := fmt.Sprintf("Port %s\nListenAddress 127.0.0.1\nHostKey %s\nAuthorizedKeysFile %s\nPidFile none\nUsePAM no\nStrictModes no\nPermitRootLogin yes\nPasswordAuthentication no\n",
		port, filepath.Join(dir, "host"), filepath.Join(dir, "client.pub"))
	if err := os.WriteFile(config, []byte(text), 0o600); err != nil {
		t.Fatal(err)
	}
	cmd := exec.Command(daemon, "-D", "-e", "-f", config)
	if err := cmd.Start(); err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() {
		_ = cmd.Process.Kill()
		_ = cmd.Wait()
	})
	for range 200 {
		if c, err := net.Dial("tcp", "127.0.0.1:"+port); err == nil {
			c.Close()
			return server{port, filepath.Join(dir, "client")}
		}
		time.Sleep(25 * time.Millisecond)
	}
	t.Fatal("sshd does not listen")
	return server{}
}

// login runs the program over the connection, in dir.
func (s server) login(t *testing.T, program, dir string, args string) *terminal {
	t.Helper()
	me, err := user.Current()
	if err != nil {
		t.Fatal(err)
	}
	command := fmt.Sprintf("cd '%s' && XDG_STATE_HOME='%s' LC_ALL=C.UTF-8 exec '%s' %s", dir, dir, program, args)
	return open(t, "ssh", dir, "-tt", "-F", "none", "-p", s.port, "-i", s.key, "-o", "IdentitiesOnly=yes", "-o", "StrictHostKeyChecking=no",
		"-o", "UserKnownHostsFile=/dev/null", "-o", "LogLevel=ERROR", me.Username+"@127.0.0.1", command)
}

// Over a real connection: drag, resize while dragging, save; then the line drops in
// the middle of a drag, and the drag is there at the next login.
func TestOverSSH(t *testing.T) {
	t.Parallel()
	program, dir := build(t), t.TempDir()
	s := serve(t)

	p := s.login(t, program, dir, "lift")
	p.waitFor("of 3 broken")
	p.press(right + right)
	p.waitFor("unsaved")
	p.resize(36, 120)
	p.press(right)
	p.waitFor("f floor") // the status line has room for more keys
	p.press("s")
	p.waitFor("save as")
	p.press(enter)
	file := filepath.Join(dir, "Platform lift.session.json")
	p.waitForFile(file)
	p.waitFor("saved Platform lift")
	first := saved(t, file)

	p.press(right + right)
	p.waitFor("unsaved")
	kept := waitForJournal(t, dir, nil)
	if err := p.cmd.Process.Kill(); err != nil { // the line drops
		t.Fatal(err)
	}
	_, _ = p.endsAnyhow()

	for range 400 { // until the far end has noticed
		if !running(program) {
			break
		}
		time.Sleep(25 * time.Millisecond)
	}
	p = s.login(t, program, dir, "'"+file+"'")
	p.waitFor("unsaved work on Platform lift")
	p.press("r" + enter)
	p.waitFor("recovered; not saved yet")
	p.press("s")
	p.waitForChange(file, first)
	if got := saved(t, file); len(got) != len(kept) {
		t.Errorf("recovered %v", got)
	}
	p.waitFor("saved /")
	p.press("q")
	restored(t, p.quits())
}

// running reports whether a process runs this very program.
func running(program string) bool {
	return exec.Command("pgrep", "-f", program).Run() == nil
}
