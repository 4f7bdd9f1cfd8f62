package launch

import (
	"context"
	"io"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"time"

	"polewright/ui/desk"
	"polewright/ui/journal"
	"polewright/ui/session"
)

// leave puts work in the journal as a program that crashes does.
func leave(t *testing.T, folder string, w desk.Work, mark session.Mark) {
	t.Helper()
	j, err := journal.Open(folder, "test")
	if err != nil {
		t.Fatal(err)
	}
	j.Keep(w, mark)
	if err := j.Close(true); err != nil {
		t.Fatal(err)
	}
}

// offered answers the questions of a start with what is typed.
func offered(t *testing.T, folder, typed string, o Options) (*leftover, string) {
	t.Helper()
	o.In, o.Out = tape(t, typed), tape(t, "")
	left, err := offer(context.Background(), &o, folder, time.Now())
	if err != nil {
		t.Fatal(err)
	}
	if _, err := o.Out.Seek(0, io.SeekStart); err != nil {
		t.Fatal(err)
	}
	said, err := io.ReadAll(o.Out)
	if err != nil {
		t.Fatal(err)
	}
	return left, string(said)
}

func tape(t *testing.T, text string) *os.File {
	t.Helper()
	f, err := os.CreateTemp(t.TempDir(), "tape")
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { _ = f.Close() })
	if _, err := f.WriteString(text); err != nil {
		t.Fatal(err)
	}
	if _, err := f.Seek(0, io.SeekStart); err != nil {
		t.Fatal(err)
	}
	return f
}

func TestRecovered(t *testing.T) {
	folder := t.TempDir()
	w := work(t, 0.9)
	fresh := Options{Work: work(t, 1), Program: "test"}
	leave(t, folder, w, session.Mark{})
	left, said := offered(t, folder, "what?\nR\nq", fresh)
	if left == nil || !slices.Equal(left.work.Poles, w.Poles) || left.work.File != "" {
		t.Fatalf("got %+v after %q", left, said)
	}
	if strings.Count(said, "unsaved work on Platform lift from 20") != 2 || !strings.Contains(said, "r recover, d drop, k keep for later") {
		t.Errorf("said %q", said)
	}
	if err := left.journal.Close(false); err != nil { // given up
		t.Fatal(err)
	}
	if left, said := offered(t, folder, "r\n", fresh); left != nil || said != "" {
		t.Errorf("it came twice: %q", said)
	}
}

func TestDroppedAndKept(t *testing.T) {
	folder := t.TempDir()
	fresh := Options{Work: work(t, 1)}
	leave(t, folder, work(t, 0.9), session.Mark{})
	for _, typed := range []string{"k\n", "", "?\n?\n?\n?\n?\nd\n"} { // kept, no answer, no sense
		if left, said := offered(t, folder, typed, fresh); left != nil || said == "" {
			t.Fatalf("%q gave %+v, %q", typed, left, said)
		}
	}
	if left, said := offered(t, folder, "d\n", fresh); left != nil || said == "" {
		t.Fatalf("got %+v, %q", left, said)
	}
	if left, said := offered(t, folder, "r\n", fresh); left != nil || said != "" {
		t.Errorf("dropped, it came again: %q", said)
	}
}

func TestOfferedToTheSameSessionOnly(t *testing.T) {
	folder, dir := t.TempDir(), t.TempDir()
	file := filepath.Join(dir, "bench.session.json")
	first := work(t, 1)
	if err := session.Save(file, "test", &first, false); err != nil {
		t.Fatal(err)
	}
	s := opened(t, file)
	leave(t, folder, work(t, 0.9), s.mark())
	this, other := Options{Work: first, Program: "test"}, Options{Work: first}
	this.Work.File, other.Work.File = file, filepath.Join(dir, "other.session.json")
	if _, said := offered(t, folder, "d\n", other); said != "" {
		t.Errorf("offered to another session: %q", said)
	}
	if err := os.WriteFile(file, []byte("changed meanwhile"), 0o600); err != nil {
		t.Fatal(err)
	}
	left, said := offered(t, folder, "r\n", this)
	if left == nil || left.work.File != file || !strings.Contains(said, "Platform lift (bench.session.json) from ") {
		t.Fatalf("got %+v, %q", left, said)
	}
	if content1(t, file) != "changed meanwhile" {
		t.Error("recovering wrote the session")
	}
	next, err := newStore(&Options{Work: *left.work, Known: left.sum})
	if err != nil {
		t.Fatal(err)
	}
	if err := next.save(file, *left.work, false); err == nil {
		t.Error("recovered work replaced what changed meanwhile")
	}
	if err := left.journal.Close(true); err != nil {
		t.Fatal(err)
	}

	// with nothing named, all are offered
	if left, said := offered(t, folder, "r\n", Options{Work: first, Any: true, Program: "test"}); left == nil {
		t.Errorf("not offered: %q", said)
	} else if err := left.journal.Close(false); err != nil {
		t.Error(err)
	}
}

// A program that is killed after it saved and before its journal is gone leaves
// nothing to ask about.
func TestSavedWorkIsNotOffered(t *testing.T) {
	folder, dir := t.TempDir(), t.TempDir()
	file := filepath.Join(dir, "bench.session.json")
	w := work(t, 0.9)
	if err := session.Save(file, "test", &w, false); err != nil {
		t.Fatal(err)
	}
	leave(t, folder, w, opened(t, file).mark())
	if _, said := offered(t, folder, "r\n", Options{Work: w, Any: true}); said != "" {
		t.Errorf("said %q", said)
	}
	leave(t, folder, work(t, 0.8), opened(t, file).mark())
	if _, said := offered(t, folder, "k\n", Options{Work: w, Any: true}); said == "" {
		t.Error("work that differs is not offered")
	}
}

func TestHostileJournalIsTame(t *testing.T) {
	folder := t.TempDir()
	bad := `{"format":1,"journal":{"file":"/x/\u001b[2J\u202e.json","plant":"\u001b]0;evil\u0007","written":"2026-01-02T03:04:05Z"}}`
	if err := os.WriteFile(filepath.Join(folder, "bad.work.json"), []byte(bad), 0o600); err != nil {
		t.Fatal(err)
	}
	left, said := offered(t, folder, "r\n", Options{Any: true})
	if left != nil || strings.ContainsAny(said, "\x1b\x07\u202e") || strings.Count(said, "\n") != 1 || !strings.Contains(said, "cannot be read") {
		t.Errorf("got %+v, %q", left, said)
	}
}

func TestInterruptedQuestion(t *testing.T) {
	ctx, cancel := context.WithCancel(context.Background())
	r, w := io.Pipe() // nobody types
	defer w.Close()
	time.AfterFunc(20*time.Millisecond, cancel)
	if _, err := ask(ctx, r, io.Discard, "?"); err == nil || !strings.Contains(err.Error(), "interrupted") {
		t.Errorf("got %v", err)
	}
}
