package cli

import (
	"fmt"
	"io"
	"os"
	"time"

	"polewright/ui/quiet"
)

// progress reads a long file and says on a terminal how far it is, as one line of
// plain text that is written over and cleared at the end.
type progress struct {
	src   io.ReadSeeker
	out   io.Writer // nil where nothing is shown
	what  string
	size  int64
	at    int64
	next  time.Time
	shown int // length of the line on the terminal
}

// A line appears only for what lasts, and not more often than can be read.
const (
	progressAfter = 500 * time.Millisecond
	progressEvery = 200 * time.Millisecond
)

// newProgress shows nothing unless out is a terminal that can go back in its line.
func newProgress(out io.Writer, src io.ReadSeeker, size int64) *progress {
	quiet.Restore() // the TERM that the user has
	p := &progress{src: src, size: size, next: time.Now().Add(progressAfter)}
	if f, ok := out.(*os.File); ok && size > 0 && os.Getenv("TERM") != "dumb" {
		if info, err := f.Stat(); err == nil && info.Mode()&os.ModeCharDevice != 0 {
			p.out = f
		}
	}
	return p
}

// begin names what the file is read for.
func (p *progress) begin(what string) { p.what = what }

// Read counts and shows.
func (p *progress) Read(b []byte) (int, error) {
	n, err := p.src.Read(b)
	p.at += int64(n)
	if p.out != nil {
		if now := time.Now(); now.After(p.next) {
			p.next = now.Add(progressEvery)
			p.show()
		}
	}
	return n, err
}

// Seek follows the reader.
func (p *progress) Seek(offset int64, whence int) (int64, error) {
	at, err := p.src.Seek(offset, whence)
	if err == nil {
		p.at = at
	}
	return at, err
}

func (p *progress) show() {
	line := fmt.Sprintf("%s, %d %%", p.what, min(100, 100*p.at/p.size))
	fmt.Fprintf(p.out, "\r%-*s", p.shown, line)
	p.shown = max(p.shown, len(line))
}

// clear takes the line off the terminal.
func (p *progress) clear() {
	if p.shown > 0 {
		fmt.Fprintf(p.out, "\r%*s\r", p.shown, "")
		p.shown = 0
	}
}
