package report_test

import (
	"bytes"
	"context"
	"path/filepath"
	"testing"

	"polewright/ui/internal/sample"
	"polewright/ui/report"
	"polewright/ui/session"
)

func kept(t *testing.T, plant string, entries ...sample.Entry) *session.Kept {
	t.Helper()
	file := filepath.Join(t.TempDir(), "work"+session.Ending)
	if err := sample.Save(file, sample.Program, plant, entries...); err != nil {
		t.Fatal(err)
	}
	return load(t, file)
}

func load(t *testing.T, file string) *session.Kept {
	t.Helper()
	k, err := session.LoadKept(file)
	if err != nil {
		t.Fatal(err)
	}
	return k
}

func document(t *testing.T, k *session.Kept, candidates ...string) *report.Document {
	t.Helper()
	d, err := report.Make(context.Background(), k, report.Options{Program: "polewright test", Candidates: candidates})
	if err != nil {
		t.Fatal(err)
	}
	return d
}

func TestSameSessionSameBytes(t *testing.T) {
	file := filepath.Join(t.TempDir(), "work"+session.Ending)
	if err := sample.Save(file, sample.Program, "gangway", sample.Entry{}, sample.Entry{Poles: "-2±1i,-3,-4"}); err != nil {
		if err = sample.Save(file, sample.Program, "gangway", sample.Entry{}); err != nil {
			t.Fatal(err)
		}
	}
	a, b := document(t, load(t, file)), document(t, load(t, file))
	if !bytes.Equal(a.HTML(), b.HTML()) || !bytes.Equal(a.Markdown(), b.Markdown()) {
		t.Error("not the same bytes")
	}
}
