package session_test

import (
	"bytes"
	"math/rand/v2"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"polewright/ui/session"
)

// saveForever names, in the environment, the file that this program is to save
// again and again in place of testing; next to it lie the two contents.
const saveForever = "POLEWRIGHT_TEST_SAVE_FOREVER"

func TestMain(m *testing.M) {
	if file := os.Getenv(saveForever); file != "" {
		saveAgainAndAgain(file)
	}
	os.Exit(m.Run())
}

func saveAgainAndAgain(file string) {
	var contents [2][]byte
	for i, name := range []string{"a", "b"} {
		data, err := os.ReadFile(filepath.Join(filepath.Dir(file), name))
		if err != nil {
			panic(err)
		}
		contents[i] = data
	}
	for i := 0; ; i++ {
		if err := session.WriteNew(file, contents[i%2], true); err != nil {
			panic(err)
		}
		if i == 1 {
			_, _ = os.Stdout.WriteString("saving\n")
		}
	}
}

// A program that is killed at any instant while it saves leaves the old session or
// the new one, whole.
func TestKilledWhileSaving(t *testing.T) {
	kills := 300
	if testing.Short() {
		kills = 30
	}
	dir := t.TempDir()
	file := filepath.Join(dir, "work"+session.Ending)
	var contents [2][]byte
	for i, plant := range []string{"lift", "gangway"} {
		data, err := session.Encode("polewright test", work(t, plant))
		if err != nil {
			t.Fatal(err)
		}
		contents[i] = data
		if err := os.WriteFile(filepath.Join(dir, string("ab"[i])), data, 0o600); err != nil {
			t.Fatal(err)
		}
	}
	var found [2]int
	for kill := range kills {
		child := exec.Command(os.Args[0])
		child.Env = append(os.Environ(), saveForever+"="+file)
		out, err := child.StdoutPipe()
		if err != nil {
			t.Fatal(err)
		}
		if err := child.Start(); err != nil {
			t.Fatal(err)
		}
		if _, err := out.Read(make([]byte, 7)); err != nil {
			t.Fatalf("the program did not begin to save: %v, %v", err, child.Wait())
		}
		time.Sleep(time.Duration(rand.IntN(3000)) * time.Microsecond)
		if err := child.Process.Kill(); err != nil {
			t.Fatal(err)
		}
		_ = child.Wait()
		data, err := os.ReadFile(file)
		if err != nil {
			t.Fatalf("kill %d: %v", kill, err)
		}
		switch {
		case bytes.Equal(data, contents[0]):
			found[0]++
		case bytes.Equal(data, contents[1]):
			found[1]++
		default:
			t.Fatalf("kill %d left %d bytes that are neither session", kill, len(data))
		}
		if kill%50 == 0 {
			if _, err := session.Load(file); err != nil {
				t.Fatal(err)
			}
		}
	}
	left := leftovers(t, dir)
	t.Logf("%d kills: the first session %d times, the second %d times; %d fell into a write", kills, found[0], found[1], left)
	if found[0] == 0 || found[1] == 0 || left == 0 {
		t.Error("the kills were not at random instants")
	}

	// what the kills left goes once it is old
	old := time.Now().Add(-2 * time.Hour)
	for _, e := range entries(t, dir) {
		if err := os.Chtimes(filepath.Join(dir, e), old, old); err != nil {
			t.Fatal(err)
		}
	}
	if err := session.WriteNew(file, contents[0], true); err != nil {
		t.Fatal(err)
	}
	if n := leftovers(t, dir); n != 0 {
		t.Errorf("%d unfinished files stay for ever", n)
	}
}

func entries(t *testing.T, dir string) []string {
	t.Helper()
	list, err := os.ReadDir(dir)
	if err != nil {
		t.Fatal(err)
	}
	var names []string
	for _, e := range list {
		names = append(names, e.Name())
	}
	return names
}

func leftovers(t *testing.T, dir string) (n int) {
	t.Helper()
	for _, name := range entries(t, dir) {
		if strings.HasSuffix(name, ".tmp") {
			n++
		}
	}
	return n
}
