// Package lines is the dialogue that stands in for the screen where a terminal
// cannot move its cursor, for screen readers and for scripts: one line in, a few
// plain lines out, the same verbs as the keys.
package lines

import (
	"bufio"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"slices"
	"strings"

	"polewright/estimator"
	"polewright/ui/desk"
	"polewright/ui/plane/targets"
)

// Config is what the dialogue needs from outside.
type Config struct {
	Work   desk.Work
	Answer func(desk.Request) desk.Answer
	// Save writes a session file. A file that is not the session's own, and one that
	// someone else changed, it refuses with an error that is fs.ErrExist unless
	// replace says so.
	Save    func(file string, w desk.Work, replace bool) error
	Resolve func(text, plane string, form estimator.Form) ([]complex128, error)
	In      io.Reader
	Out     io.Writer
	// Prompt is written before each line is read; empty for scripts.
	Prompt string
}

// state is what undo goes back to.
type state struct {
	set    targets.Set
	held   int
	form   estimator.Form
	method estimator.Method
	answer *desk.Answer
}

type dialogue struct {
	Config
	now        state
	past, next []state
	plane      targets.Plane
	file       string
	candidates []desk.Candidate
	current    string
	unsaved    bool
	asked      bool // quit was asked once with unsaved work
	gen        uint64
}

// errQuit ends the dialogue.
var errQuit = errors.New("quit")

// Run talks until quit or the end of the input. Its error is one of reading,
// writing, or of a first design that cannot be made. unsaved tells whether work
// was left unsaved at the end of the input.
func Run(c Config) (unsaved bool, err error) {
	d := &dialogue{Config: c, plane: targets.S, file: c.Work.File,
		candidates: slices.Clone(c.Work.Candidates), current: c.Work.Current}
	if c.Work.View.Plane == "z" || c.Work.View.Plane == "" && d.period() > 0 && !c.Work.Bench.Plant.Continuous {
		d.plane = targets.Z
	}
	d.now = state{form: c.Work.Form, method: c.Work.Method}
	if err := d.start(); err != nil {
		return false, err
	}
	in := bufio.NewScanner(c.In)
	in.Buffer(make([]byte, 4096), 1<<16)
	for {
		if _, err := io.WriteString(c.Out, c.Prompt); err != nil {
			return d.unsaved, err
		}
		if !in.Scan() {
			return d.unsaved, in.Err()
		}
		err := d.obey(strings.TrimSpace(in.Text()))
		switch {
		case errors.Is(err, errQuit):
			return false, nil
		case err != nil:
			d.say("no: %s", clean(err.Error()))
		}
	}
}

func (d *dialogue) period() float64 { return d.Work.Bench.Model.Period }

func (d *dialogue) say(format string, args ...any) { fmt.Fprintf(d.Out, format+"\n", args...) }

// start makes the first design: the stored one, or the one to begin with.
func (d *dialogue) start() error {
	a := d.Answer(desk.Request{Form: d.now.form, Method: d.now.method, Poles: d.Work.Poles, Gain: d.Work.Gain, GainCurrent: d.Work.GainCurrent})
	if a.Err != nil && a.Design == nil {
		return a.Err
	}
	list := d.Work.Poles
	if list == nil {
		list = a.Design.Wanted
		if n := len(list) - len(a.Fixed); list != nil && n >= 0 {
			list = list[:n]
		}
	}
	set, err := targets.From(list, d.period())
	if err != nil {
		return err
	}
	d.now.set, d.now.answer = set, &a
	d.now.held = min(max(d.Work.View.Selected, 0), max(len(set.List)-1, 0))
	d.say("%s. Type help for the verbs.", d.title())
	d.showHeld()
	d.brief()
	return nil
}

func (d *dialogue) title() string {
	time := "continuous time"
	if p := d.period(); p > 0 {
		time = fmt.Sprintf("every %g s", p)
	}
	return d.Work.Bench.Plant.Name + ", " + time
}

// change asks for a new state and takes it over where there is a design for it.
func (d *dialogue) change(to state) error {
	d.gen++
	from := d.now.answer.Design
	r := desk.Request{Gen: d.gen, Form: to.form, Method: to.method, Poles: to.set.Poles()}
	if from != nil && from.Form == to.form && from.Method == to.method {
		r.From = from
	}
	a := d.Answer(r)
	if a.Err != nil && a.Design == nil {
		return a.Err
	}
	to.answer = &a
	d.past = append(d.past, d.now)
	d.now, d.next, d.current, d.unsaved, d.asked = to, nil, "", true, false
	d.showHeld()
	d.brief()
	return nil
}

func (d *dialogue) step(from, to *[]state, word string) error {
	if len(*from) == 0 {
		return errors.New("nothing to " + word)
	}
	*to = append(*to, d.now)
	d.now = (*from)[len(*from)-1]
	*from = (*from)[:len(*from)-1]
	d.current, d.unsaved = "", true
	d.showHeld()
	d.brief()
	return nil
}

// work is what a session keeps.
func (d *dialogue) work() desk.Work {
	w := d.Work
	w.File, w.Form, w.Method, w.Poles = d.file, d.now.form, d.now.method, d.now.set.Poles()
	w.Gain, w.GainCurrent = d.now.answer.Design.Gain, d.now.answer.Design.GainCurrent
	w.Candidates, w.Current = d.candidates, d.current
	w.View.Plane, w.View.Selected = string(byte(d.plane)), d.now.held
	return w
}

func (d *dialogue) save(file string, replace bool) error {
	if file == "" {
		file = d.file
	}
	if file == "" {
		return errors.New("save needs a name the first time: save NAME.session.json")
	}
	if !strings.HasSuffix(file, ".json") {
		file += ".session.json"
	}
	err := d.Save(file, d.work(), replace)
	if errors.Is(err, fs.ErrExist) {
		return fmt.Errorf("%s exists or was changed by someone else; replace %s overwrites it", file, file)
	}
	if err != nil {
		return err
	}
	d.file, d.unsaved = file, false
	d.say("saved %s", file)
	return nil
}

// clean keeps an answer on one line.
func clean(s string) string {
	return strings.Map(func(r rune) rune {
		if r < ' ' || r == 0x7f || r >= 0x80 && r < 0xa0 {
			return ' '
		}
		return r
	}, s)
}
