package cli

import (
	"bytes"
	"io"
	"os"
	"strings"
	"testing"
	"time"

	"github.com/creack/pty"

	"polewright/ui/quiet"
)

// A file that is not a terminal is left in peace; the reader works all the same.
func TestProgressIsSilentWithoutATerminal(t *testing.T) {
	var out bytes.Buffer
	p := newProgress(&out, strings.NewReader("12345"), 5)
	p.next = time.Time{}
	p.begin("reading")
	if b, err := io.ReadAll(p); err != nil || string(b) != "12345" {
		t.Errorf("%q, %v", b, err)
	}
	p.clear()
	if out.Len() != 0 {
		t.Errorf("%q", out.String())
	}
}

func TestProgressIsWrittenOverAndCleared(t *testing.T) {
	var out bytes.Buffer
	p := &progress{src: strings.NewReader("1234567890"), out: &out, size: 10}
	read := func() {
		p.next = time.Time{}
		if _, err := p.Read(make([]byte, 5)); err != nil {
			t.Fatal(err)
		}
	}
	p.begin("checking")
	read()
	read()
	if _, err := p.Seek(0, io.SeekStart); err != nil {
		t.Fatal(err)
	}
	p.begin("run")
	read()
	p.clear()
	p.clear()
	want := "\rchecking, 50 %" + "\rchecking, 100 %" + "\rrun, 50 %      " + "\r" + strings.Repeat(" ", 15) + "\r"
	if out.String() != want {
		t.Errorf("%q, want %q", out.String(), want)
	}
	// Not more often than can be read.
	p.next = time.Now().Add(time.Hour)
	before := out.Len()
	if _, err := p.Read(make([]byte, 5)); err != nil || out.Len() != before {
		t.Errorf("%v, %d bytes more", err, out.Len()-before)
	}
}

// On a terminal it shows, also where the program hid TERM while it started.
func TestProgressOnATerminal(t *testing.T) {
	quiet.Restore()
	if os.Getenv("TERM") == "dumb" {
		t.Skip("TERM is dumb: nothing is shown here")
	}
	master, terminal, err := pty.Open()
	if err != nil {
		t.Skip("no pseudo-terminal here")
	}
	defer master.Close()
	defer terminal.Close()
	t.Setenv("TERM", "dumb") // as hidden
	p := newProgress(terminal, strings.NewReader("12345"), 5)
	if os.Getenv("TERM") == "dumb" {
		t.Skip("TERM was not set: nothing was hidden")
	}
	p.next = time.Time{}
	p.begin("reading")
	if _, err := p.Read(make([]byte, 5)); err != nil {
		t.Fatal(err)
	}
	got := make([]byte, 100)
	n, err := master.Read(got)
	if err != nil || !strings.Contains(string(got[:n]), "reading, 100 %") {
		t.Errorf("%q, %v", got[:n], err)
	}
}
