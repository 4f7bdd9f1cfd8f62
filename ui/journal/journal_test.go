package journal_test

import (
	"bufio"
	"encoding/hex"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"time"

	"polewright/plants"
	"polewright/plants/library"
	"polewright/scenarios"
	"polewright/ui/desk"
	"polewright/ui/journal"
	"polewright/ui/session"
)

// keepIn names, in the environment, the folder where this program is to keep work
// until it is killed, in place of testing.
const keepIn = "POLEWRIGHT_TEST_KEEP_IN"

func TestMain(m *testing.M) {
	if folder := os.Getenv(keepIn); folder != "" {
		keepUntilKilled(folder)
	}
	os.Exit(m.Run())
}

func keepUntilKilled(folder string) {
	j, err := journal.Open(folder, "test")
	if err != nil {
		panic(err)
	}
	w, err := lift()
	if err != nil {
		panic(err)
	}
	for i := 0; ; i++ {
		w.Poles = []complex128{complex(0.5, float64(i)), complex(0.5, -float64(i))}
		j.Keep(w, session.Mark{})
		if err := j.Flush(); err != nil {
			panic(err)
		}
		fmt.Println(i)
	}
}

// lift is work whose gain is not found yet.
func lift() (w desk.Work, err error) {
	text, file, _ := library.Plant("lift")
	p, err := plants.Parse(file, text)
	if err != nil {
		return w, err
	}
	m, err := p.Model(plants.Options{})
	if err != nil {
		return w, err
	}
	return desk.Work{
		Bench: &desk.Bench{Plant: p, PlantFile: file, PlantText: text, Model: m, Scenario: scenarios.Default(p)},
		Poles: []complex128{complex(0.5, 0.1), complex(0.5, -0.1)},
	}, nil
}

func work(t *testing.T) desk.Work {
	t.Helper()
	w, err := lift()
	if err != nil {
		t.Fatal(err)
	}
	return w
}

func files(t *testing.T, folder string) []string {
	t.Helper()
	list, err := os.ReadDir(folder)
	if err != nil {
		t.Fatal(err)
	}
	var names []string
	for _, e := range list {
		names = append(names, e.Name())
	}
	return names
}

func TestKeepFindTakeUp(t *testing.T) {
	folder := filepath.Join(t.TempDir(), "state", "journal")
	j, err := journal.Open(folder, "test")
	if err != nil {
		t.Fatal(err)
	}
	w := work(t)
	sum := session.Sum{1, 2, 3}
	j.Keep(w, session.Mark{File: "/somewhere/lift.session.json", Content: hex.EncodeToString(sum[:])})
	if err := j.Flush(); err != nil {
		t.Fatal(err)
	}
	for path, want := range map[string]os.FileMode{folder: 0o700, filepath.Join(folder, files(t, folder)[0]): 0o600, filepath.Join(folder, files(t, folder)[1]): 0o600} {
		if info, err := os.Stat(path); err != nil || info.Mode().Perm() != want {
			t.Errorf("%s: %v, %v; expected %v", path, info.Mode().Perm(), err, want)
		}
	}
	if found := journal.Find(folder, nil); len(found) != 0 {
		t.Error("work of a program that runs is offered")
	}
	if err := j.Close(true); err != nil {
		t.Fatal(err)
	}

	if found := journal.Find(folder, func(m session.Mark) bool { return m.Plant == "other" }); len(found) != 0 {
		t.Error("work on another plant is offered")
	}
	found := journal.Find(folder, func(m session.Mark) bool { return m.Plant == w.Bench.Plant.Name })
	if len(found) != 1 {
		t.Fatalf("%d found", len(found))
	}
	if again := journal.Find(folder, nil); len(again) != 0 {
		t.Error("the same work is offered twice at the same time")
	}
	back, known, err := found[0].Work()
	if err != nil {
		t.Fatal(err)
	}
	if !slices.Equal(back.Poles, w.Poles) || back.File != "/somewhere/lift.session.json" || known != sum || back.Gain != nil {
		t.Errorf("got %+v, %v", back, known)
	}
	if d := time.Since(found[0].Mark.Written); d < 0 || d > time.Minute {
		t.Errorf("written %v ago", d)
	}

	// taken up, it stays until it is saved
	next := found[0].Continue("test")
	found[0].Release() // no longer its to release
	if again := journal.Find(folder, nil); len(again) != 0 {
		t.Error("work that was taken up is offered")
	}
	if err := next.Close(true); err != nil { // a second crash
		t.Fatal(err)
	}
	found = journal.Find(folder, nil)
	if len(found) != 1 {
		t.Fatalf("%d found after the second crash", len(found))
	}
	next = found[0].Continue("test")
	next.Saved()
	if err := next.Close(true); err != nil {
		t.Fatal(err)
	}
	if left := files(t, folder); len(left) != 0 {
		t.Errorf("saved, and %v is left", left)
	}
}

func TestDropReleaseAndQuit(t *testing.T) {
	folder := t.TempDir()
	leave := func(keep bool) {
		j, err := journal.Open(folder, "test")
		if err != nil {
			t.Fatal(err)
		}
		j.Keep(work(t), session.Mark{})
		if err := j.Close(keep); err != nil {
			t.Fatal(err)
		}
	}
	leave(true)
	for range 2 { // kept for later, it comes again
		found := journal.Find(folder, nil)
		if len(found) != 1 {
			t.Fatalf("%d found", len(found))
		}
		found[0].Release()
	}
	found := journal.Find(folder, nil)
	found[0].Drop()
	if left := files(t, folder); len(left) != 0 {
		t.Errorf("dropped, and %v is left", left)
	}
	leave(false)
	if left := files(t, folder); len(left) != 0 {
		t.Errorf("given up, and %v is left", left)
	}
}

func TestNewestIsKept(t *testing.T) {
	folder := t.TempDir()
	j, err := journal.Open(folder, "test")
	if err != nil {
		t.Fatal(err)
	}
	w := work(t)
	began := time.Now()
	for i := range 10000 {
		w.Poles = []complex128{complex(0, float64(i))}
		j.Keep(w, session.Mark{})
	}
	if d := time.Since(began); d > time.Second {
		t.Errorf("10000 changes waited %v for the disk", d)
	}
	if err := j.Close(true); err != nil {
		t.Fatal(err)
	}
	found := journal.Find(folder, nil)
	if len(found) != 1 {
		t.Fatalf("%d found", len(found))
	}
	if back, _, err := found[0].Work(); err != nil || back.Poles[0] != complex(0, 9999) {
		t.Errorf("got %v, %v", back.Poles, err)
	}
}

func TestTroubleIsTold(t *testing.T) {
	folder := filepath.Join(t.TempDir(), "journal")
	j, err := journal.Open(folder, "test")
	if err != nil {
		t.Fatal(err)
	}
	if err := os.RemoveAll(folder); err != nil {
		t.Fatal(err)
	}
	j.Keep(work(t), session.Mark{})
	if err := j.Flush(); err == nil || !strings.Contains(err.Error(), "there is no folder") {
		t.Errorf("got %v", err)
	}
	if err := os.Mkdir(folder, 0o700); err != nil {
		t.Fatal(err)
	}
	j.Keep(work(t), session.Mark{}) // and it recovers
	if err := j.Close(true); err != nil {
		t.Error(err)
	}

	file := filepath.Join(t.TempDir(), "file")
	if err := os.WriteFile(file, nil, 0o600); err != nil {
		t.Fatal(err)
	}
	if _, err := journal.Open(filepath.Join(file, "journal"), "test"); err == nil {
		t.Error("a journal below a file")
	}
}

func TestCleanAfterThirtyDays(t *testing.T) {
	folder := t.TempDir()
	leave := func() *journal.Journal {
		j, err := journal.Open(folder, "test")
		if err != nil {
			t.Fatal(err)
		}
		j.Keep(work(t), session.Mark{})
		if err := j.Flush(); err != nil {
			t.Fatal(err)
		}
		return j
	}
	if err := leave().Close(true); err != nil {
		t.Fatal(err)
	}
	now := time.Now()
	journal.Clean(folder, now.Add(journal.Kept-time.Hour))
	if n := len(files(t, folder)); n != 2 {
		t.Fatalf("%d files before their time is over", n)
	}
	running := leave()
	if report, err := journal.Report(folder, []byte("it broke"), now); err != nil {
		t.Error(err)
	} else if info, err := os.Stat(report); err != nil || info.Mode().Perm() != 0o600 {
		t.Errorf("%s: %v", report, err)
	}
	other := filepath.Join(folder, "somebody's.json")
	if err := os.WriteFile(other, nil, 0o600); err != nil {
		t.Fatal(err)
	}
	journal.Clean(folder, now.Add(journal.Kept+time.Hour))
	if left := files(t, folder); len(left) != 3 { // work and lock of the program that runs, and the other's
		t.Errorf("left: %v", left)
	}
	if err := running.Close(true); err != nil {
		t.Fatal(err)
	}
	if found := journal.Find(folder, nil); len(found) != 1 {
		t.Error("what a running program kept was cleaned away")
	}
}

func TestDamagedJournalsAreNotOffered(t *testing.T) {
	folder := t.TempDir()
	for name, text := range map[string]string{
		"empty.work.json": "", "text.work.json": "hello", "plain.work.json": `{"format":1}`,
	} {
		if err := os.WriteFile(filepath.Join(folder, name), []byte(text), 0o600); err != nil {
			t.Fatal(err)
		}
	}
	if found := journal.Find(folder, nil); len(found) != 0 {
		t.Errorf("%d found", len(found))
	}
	bad := `{"format":99,"journal":{"file":"relative.session.json","plant":"x"}}`
	if err := os.WriteFile(filepath.Join(folder, "newer.work.json"), []byte(bad), 0o600); err != nil {
		t.Fatal(err)
	}
	found := journal.Find(folder, nil)
	if len(found) != 1 {
		t.Fatalf("%d found", len(found))
	}
	if _, _, err := found[0].Work(); err == nil || !strings.Contains(err.Error(), "newer polewright") {
		t.Errorf("got %v", err)
	}
}

// A program that is killed at any instant leaves the last work that it was told is
// kept, or newer work.
func TestKilledWhileKeeping(t *testing.T) {
	kills := 40
	if testing.Short() {
		kills = 8
	}
	kept := 0
	for kill := range kills {
		folder := t.TempDir()
		child := exec.Command(os.Args[0])
		child.Env = append(os.Environ(), keepIn+"="+folder)
		out, err := child.StdoutPipe()
		if err != nil {
			t.Fatal(err)
		}
		if err := child.Start(); err != nil {
			t.Fatal(err)
		}
		lines := bufio.NewScanner(out)
		last := -1
		time.AfterFunc(time.Duration(30+kill)*time.Millisecond, func() { _ = child.Process.Kill() })
		for lines.Scan() {
			if _, err := fmt.Sscan(lines.Text(), &last); err != nil {
				t.Fatal(err)
			}
		}
		_ = child.Wait()
		found := journal.Find(folder, nil)
		if last < 0 {
			continue // killed before anything was kept
		}
		kept++
		if len(found) != 1 {
			t.Fatalf("kill %d: %d found of %v", kill, len(found), files(t, folder))
		}
		w, _, err := found[0].Work()
		if err != nil {
			t.Fatalf("kill %d: %v", kill, err)
		}
		if got := int(imag(w.Poles[0])); got < last || got > last+1 {
			t.Errorf("kill %d: found change %d after %d was kept", kill, got, last)
		}
	}
	t.Logf("%d of %d kills came after work was kept", kept, kills)
	if kept == 0 {
		t.Error("no kill came late enough to say anything")
	}
}
