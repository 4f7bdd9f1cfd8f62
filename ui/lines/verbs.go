package lines

import (
	"errors"
	"fmt"
	"math/cmplx"
	"strconv"
	"strings"

	"polewright/estimator"
	"polewright/estimator/poles"
	"polewright/ui/desk"
	"polewright/ui/plane/targets"
)

// verb is one thing that can be said.
type verb struct {
	names []string
	args  string
	does  string
	run   func(d *dialogue, arg string) error
}

func verbs() []verb {
	return []verb{
		{[]string{"next", "n"}, "", "hold the next pole", func(d *dialogue, _ string) error { return d.hold(1) }},
		{[]string{"previous", "N"}, "", "hold the previous pole", func(d *dialogue, _ string) error { return d.hold(-1) }},
		{[]string{"left", "h"}, "[N]", "move it N cells left: faster", move(-1, 0)},
		{[]string{"right", "l"}, "[N]", "move it N cells right: slower", move(1, 0)},
		{[]string{"up", "k"}, "[N]", "move it N cells up", move(0, 1)},
		{[]string{"down", "j"}, "[N]", "move it N cells down", move(0, -1)},
		{[]string{"="}, "PLACE", "put it at a place: = -6, = -4+-3i, = 10@0.7", (*dialogue).place},
		{[]string{"poles", "p"}, "LIST", "all poles: a list, butterworth@W, bessel@W, equal@W, plant*K, controller*K, floor", (*dialogue).all},
		{[]string{"floor", "f"}, "", "the poles of the best linear estimator", func(d *dialogue, _ string) error { return d.all("floor") }},
		{[]string{"faster", ">"}, "[PERCENT]", "all poles faster, by 5 % unless said", scale(1)},
		{[]string{"slower", "<"}, "[PERCENT]", "all poles slower", scale(-1)},
		{[]string{"undo", "u"}, "", "take the last change back", func(d *dialogue, _ string) error { return d.step(&d.past, &d.next, "undo") }},
		{[]string{"redo", "U"}, "", "do it again", func(d *dialogue, _ string) error { return d.step(&d.next, &d.past, "redo") }},
		{[]string{"form", "c"}, "[prediction|current]", "the form of a sampled estimator", (*dialogue).form},
		{[]string{"gain"}, "robust|least-noise", "which gain several sensors take", (*dialogue).method},
		{[]string{"plane", "z"}, "[s|z]", "the plane that places are said in", (*dialogue).setPlane},
		{[]string{"show", "r"}, "", "all readings of the design in hand", func(d *dialogue, _ string) error { d.show(); return nil }},
		{[]string{"keep", "a"}, "", "keep the design under the next letter", func(d *dialogue, _ string) error { return d.keep() }},
		{[]string{"recall"}, "LETTER", "take a candidate into the hand", (*dialogue).recall},
		{[]string{"compare", "v"}, "", "the candidates side by side", func(d *dialogue, _ string) error { d.compare(); return nil }},
		{[]string{"save", "s"}, "[FILE]", "save the session", func(d *dialogue, arg string) error { return d.save(arg, false) }},
		{[]string{"replace"}, "FILE", "save over an existing file", func(d *dialogue, arg string) error { return d.save(arg, true) }},
		{[]string{"help", "?"}, "", "these verbs, and the cautions", func(d *dialogue, _ string) error { d.help(); return nil }},
		{[]string{"quit", "q"}, "", "leave; twice with unsaved work", func(d *dialogue, _ string) error { return d.quit() }},
	}
}

// obey does what one line says.
func (d *dialogue) obey(line string) error {
	if line == "" {
		return nil
	}
	word, arg, _ := strings.Cut(line, " ")
	if strings.HasPrefix(line, "=") {
		word, arg = "=", line[1:]
	}
	for _, v := range verbs() {
		for _, name := range v.names {
			if word == name {
				return v.run(d, strings.TrimSpace(arg))
			}
		}
	}
	return fmt.Errorf("%q is no verb here; help lists them", word)
}

func (d *dialogue) hold(step int) error {
	n := len(d.now.set.List)
	if n == 0 {
		return errors.New("there is no pole to hold: the sensors see no mode that could be moved")
	}
	d.now.held = (d.now.held + step + n) % n
	d.showHeld()
	return nil
}

// cell is a twentieth of the largest target in the plane shown, so that steps
// have the size of what they move.
func (d *dialogue) cell() float64 {
	size := 0.0
	for _, t := range d.now.set.List {
		if at, ok := targets.Shown(t.At, d.plane, d.period()); ok {
			size = max(size, cmplx.Abs(at))
		}
	}
	if size == 0 || d.plane == targets.Z {
		size = 1
	}
	return size / 20
}

func move(dx, dy int) func(*dialogue, string) error {
	return func(d *dialogue, arg string) error {
		n := 1
		if arg != "" {
			var err error
			if n, err = strconv.Atoi(arg); err != nil || n < 1 || n > 1000 {
				return fmt.Errorf("%q cells; expected a whole number from 1 to 1000", arg)
			}
		}
		if len(d.now.set.List) == 0 {
			return d.hold(0)
		}
		to := d.now
		cell := d.cell()
		var event targets.Event
		var err error
		to.set, to.held, event, err = to.set.Move(to.held, n*dx, n*dy, targets.Grid{Plane: d.plane, DX: cell, DY: cell})
		if err != nil {
			return err
		}
		switch event {
		case targets.Parted, targets.PartedAtLimit:
			d.say("the pair parted into two real poles")
		case targets.Joined:
			d.say("two real poles joined to a pair")
		}
		return d.change(to)
	}
}

func (d *dialogue) place(arg string) error {
	at, err := poles.ParseOne(arg)
	if err != nil {
		return err
	}
	if len(d.now.set.List) == 0 {
		return d.hold(0)
	}
	plane := d.plane
	if strings.Contains(arg, "@") {
		plane = targets.S
	}
	to := d.now
	if to.set, to.held, err = to.set.Place(to.held, at, plane); err != nil {
		return err
	}
	return d.change(to)
}

func (d *dialogue) all(arg string) error {
	list, err := d.Resolve(arg, string(byte(d.plane)), d.now.form)
	if err != nil {
		return err
	}
	to := d.now
	if to.set, err = targets.From(list, d.period()); err != nil {
		return err
	}
	to.held = min(to.held, max(len(to.set.List)-1, 0))
	return d.change(to)
}

func scale(sign float64) func(*dialogue, string) error {
	return func(d *dialogue, arg string) error {
		percent := 5.0
		if arg != "" {
			var err error
			if percent, err = strconv.ParseFloat(strings.TrimSuffix(arg, "%"), 64); err != nil || !(percent > 0) || percent > 1000 {
				return fmt.Errorf("%q; expected a percentage above 0, at most 1000", arg)
			}
		}
		k := 1 + percent/100
		if sign < 0 {
			k = 1 / k
		}
		to := d.now
		var err error
		if to.set, err = to.set.Scale(k); err != nil {
			return err
		}
		return d.change(to)
	}
}

func (d *dialogue) form(arg string) error {
	to := d.now
	if arg == "" {
		arg = "current"
		if d.now.form == estimator.Current {
			arg = "prediction"
		}
	}
	switch {
	case arg == "prediction":
		to.form = estimator.Prediction
	case arg == "current" && d.period() > 0:
		to.form = estimator.Current
	case arg == "current":
		return errors.New("the current form needs a sample period")
	default:
		return fmt.Errorf("%q; expected prediction or current", arg)
	}
	return d.change(to)
}

func (d *dialogue) method(arg string) error {
	to := d.now
	switch arg {
	case "robust":
		to.method = estimator.Robust
	case "least-noise":
		to.method = estimator.LeastNoise
	default:
		return fmt.Errorf("%q; expected robust or least-noise", arg)
	}
	return d.change(to)
}

func (d *dialogue) setPlane(arg string) error {
	if arg == "" {
		arg = "z"
		if d.plane == targets.Z {
			arg = "s"
		}
	}
	switch {
	case arg == "s":
		d.plane = targets.S
	case arg == "z" && d.period() > 0:
		d.plane = targets.Z
	case arg == "z":
		return errors.New("there is no z-plane without a sample period")
	default:
		return fmt.Errorf("%q; expected s or z", arg)
	}
	d.showHeld()
	return nil
}

func (d *dialogue) keep() error {
	letter := ""
	for c := 'A'; c <= 'Z' && letter == ""; c++ {
		if d.find(string(c)) < 0 {
			letter = string(c)
		}
	}
	if letter == "" {
		return errors.New("all letters A to Z are taken")
	}
	a := d.now.answer
	d.candidates = append(d.candidates, desk.Candidate{Letter: letter, Form: d.now.form, Method: d.now.method,
		Poles: d.now.set.Poles(), Design: a.Design, Limits: a.Limits, Run: a.Run})
	d.current, d.unsaved, d.asked = letter, true, false
	d.say("kept as %s", letter)
	return nil
}

func (d *dialogue) find(letter string) int {
	for i, c := range d.candidates {
		if strings.EqualFold(c.Letter, letter) {
			return i
		}
	}
	return -1
}

func (d *dialogue) recall(arg string) error {
	i := d.find(arg)
	if i < 0 {
		return fmt.Errorf("no candidate %q; compare lists them", arg)
	}
	c := d.candidates[i]
	list := c.Poles
	if list == nil {
		return fmt.Errorf("candidate %s is a gain found elsewhere: it has no poles to move", c.Letter)
	}
	set, err := targets.From(list, d.period())
	if err != nil {
		return err
	}
	a := d.Answer(desk.Request{Form: c.Form, Method: c.Method, Poles: list, Gain: c.Design.Gain, GainCurrent: c.Design.GainCurrent})
	if a.Err != nil && a.Design == nil {
		return a.Err
	}
	d.past, d.next = append(d.past, d.now), nil
	d.now = state{set: set, held: min(d.now.held, max(len(set.List)-1, 0)), form: c.Form, method: c.Method, answer: &a}
	d.current, d.unsaved, d.asked = c.Letter, true, false
	d.showHeld()
	d.brief()
	return nil
}

func (d *dialogue) quit() error {
	if d.unsaved && !d.asked {
		d.asked = true
		return errors.New("there is unsaved work; save it, or quit again to lose it")
	}
	return errQuit
}
