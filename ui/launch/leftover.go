package launch

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"path/filepath"
	"strings"
	"time"

	"polewright/ui/desk"
	"polewright/ui/journal"
	"polewright/ui/session"
)

// leftover is what was recovered.
type leftover struct {
	work    *desk.Work
	sum     session.Sum // of its session file as the work knew it
	journal *journal.Journal
}

// offer asks, before the screen is there, what becomes of work that was left
// unsaved: of the plant or the session that is opened, or with all of any. It
// returns nil where nothing is recovered.
func offer(ctx context.Context, o *Options, folder string, now time.Time) (*leftover, error) {
	journal.Clean(folder, now)
	found := journal.Find(folder, o.wanted())
	defer func() {
		for _, f := range found {
			f.Release()
		}
	}()
	for _, f := range found {
		w, sum, err := f.Work()
		if err != nil {
			fmt.Fprintf(o.Out, "unsaved work on %s cannot be read: %s\n", title(f), session.Printable(err.Error(), 300))
			continue
		}
		if saved(w) {
			f.Drop()
			continue
		}
		answer, err := ask(ctx, o.In, o.Out, "unsaved work on "+title(f)+" was found.\nr recover, d drop, k keep for later (then Enter): ")
		if err != nil {
			return nil, err
		}
		switch answer {
		case "r":
			return &leftover{work: w, sum: sum, journal: f.Continue(o.Program)}, nil
		case "d":
			f.Drop()
		}
	}
	return nil, nil
}

// wanted tells which journals concern what is opened; nil for all.
func (o *Options) wanted() func(m session.Mark) bool {
	if o.Any {
		return nil
	}
	if o.Work.File != "" {
		path, err := filepath.Abs(o.Work.File)
		return func(m session.Mark) bool { return err == nil && m.File == path }
	}
	name := o.Work.Bench.Plant.Name
	return func(m session.Mark) bool { return m.Plant == name }
}

func title(f *journal.Found) string {
	text := session.Printable(f.Mark.Plant, 60)
	if f.Mark.File != "" {
		text += " (" + session.Printable(filepath.Base(f.Mark.File), 60) + ")"
	}
	return text + " from " + f.Mark.Written.Local().Format("2006-01-02 15:04:05")
}

// saved reports that the session file holds just this work: the program was
// killed between saving it and removing the journal.
func saved(w *desk.Work) bool {
	if w.File == "" {
		return false
	}
	there, err := session.Load(w.File)
	if err != nil {
		return false
	}
	there.View = w.View
	a, err1 := session.EncodeDraft("", there, nil)
	b, err2 := session.EncodeDraft("", w, nil)
	return err1 == nil && err2 == nil && bytes.Equal(a, b)
}

// ask reads one of r, d and k. Whoever answers nothing keeps the work.
func ask(ctx context.Context, in io.Reader, out io.Writer, question string) (string, error) {
	for range 5 {
		if _, err := io.WriteString(out, question); err != nil {
			return "k", nil
		}
		type line struct {
			text string
			err  error
		}
		lines := make(chan line, 1)
		go func() {
			text, err := readLine(in)
			lines <- line{text, err}
		}()
		select {
		case <-ctx.Done():
			return "", errors.New("interrupted; the unsaved work is kept")
		case l := <-lines:
			if l.err != nil {
				return "k", nil
			}
			switch answer := strings.ToLower(strings.TrimSpace(l.text)); answer {
			case "r", "d", "k":
				return answer, nil
			}
		}
	}
	return "k", nil
}

// readLine reads no further than the end of the line: what follows belongs to the
// screen.
func readLine(in io.Reader) (string, error) {
	var text []byte
	one := make([]byte, 1)
	for {
		n, err := in.Read(one)
		switch {
		case n == 1 && one[0] == '\n':
			return string(text), nil
		case n == 1 && len(text) < 100:
			text = append(text, one[0])
		case err != nil:
			return "", err
		}
	}
}
