package cli

import (
	"encoding/json"
	"fmt"
	"strings"

	"github.com/spf13/cobra"
	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/estimator/poles"
	"polewright/ui/aim"
	"polewright/ui/desk"
	"polewright/ui/session"
)

// task is one design to make: what is on the bench, a designer, what is wanted.
type task struct {
	*desk.Bench
	file     string // as the user named it
	opt      designOptions
	designer *estimator.Designer
	plane    string
	stored   *desk.Candidate // of a session; nil for a plant
	design   *estimator.Design
}

// prepare loads what arg names and makes a designer for it.
func (o *designOptions) prepare(cmd *cobra.Command, arg string) (*task, error) {
	t := &task{file: arg, opt: *o}
	kind, err := o.designer()
	if err != nil {
		return nil, err
	}
	if session.Is(arg) {
		err = t.fromSession(cmd, &kind)
	} else {
		err = t.fromPlant(cmd)
	}
	if err != nil {
		return nil, err
	}
	if t.plane, err = o.choosePlane(t.Plant, t.Model); err != nil {
		return nil, err
	}
	if t.designer, err = estimator.NewDesigner(t.Model, kind); err != nil {
		return nil, fmt.Errorf("%s: %w", arg, err)
	}
	return t, nil
}

func (t *task) fromPlant(cmd *cobra.Command) error {
	if t.opt.candidate != "" {
		return usageError("candidate", fmt.Sprintf("%q without a session", t.opt.candidate), "a session file in place of the plant")
	}
	src, err := loadPlant(t.file)
	if err != nil {
		return err
	}
	mo, err := t.opt.model(cmd)
	if err != nil {
		return err
	}
	t.Bench, err = src.bench(t.opt.scenario, mo)
	return err
}

// fromSession takes the plant, the scenario and, where no poles or gain are given,
// the stored gain of a candidate, with its form and method.
func (t *task) fromSession(cmd *cobra.Command, kind *estimator.Options) error {
	for _, name := range []string{"period", "scenario"} {
		if cmd.Flags().Changed(name) {
			return usageError(name, "given with a session", "the session's own; use its plant file for another")
		}
	}
	w, err := session.Load(t.file)
	if err != nil {
		return fileError(t.file, "a session file", err)
	}
	t.Bench = w.Bench
	if t.opt.poles != "" || t.opt.useGain != "" {
		return nil
	}
	if t.opt.candidate == "" {
		return usageError("candidate", "not given", candidateNames(w))
	}
	for i := range w.Candidates {
		if c := &w.Candidates[i]; c.Letter == t.opt.candidate {
			t.stored = c
			*kind = estimator.Options{Form: c.Form, Method: c.Method}
			return nil
		}
	}
	return usageError("candidate", fmt.Sprintf("no candidate %q", t.opt.candidate), candidateNames(w))
}

func candidateNames(w *desk.Work) string {
	if len(w.Candidates) == 0 {
		return "--poles, since this session keeps no candidate"
	}
	var names []string
	for _, c := range w.Candidates {
		names = append(names, c.Letter)
	}
	return "one of " + strings.Join(names, ", ")
}

// solve makes the design that the options ask for.
func (t *task) solve() error {
	var err error
	switch {
	case t.stored != nil:
		d := t.stored.Design
		t.design, err = t.designer.Judge(estimator.Given{L: d.Gain, Lf: d.GainCurrent, Wanted: t.stored.Poles})
		if err != nil {
			return fmt.Errorf("%s: candidate %s: %w", t.file, t.stored.Letter, err)
		}
		return nil
	case t.opt.useGain != "":
		var l *mat.Dense
		if l, err = t.readGain(); err != nil {
			return err
		}
		if t.design, err = t.designer.Judge(estimator.Given{L: l}); err != nil {
			return usageError("use-gain", err.Error(), "a finite n x p gain")
		}
		return nil
	case t.opt.poles == "":
		return usageError("poles", "not given", `a list like "-4±3i, -6" or a pattern like floor`)
	}
	wanted, err := t.wanted(t.opt.poles)
	if err != nil {
		return err
	}
	if t.design, err = t.designer.Place(wanted, nil); err != nil {
		return fmt.Errorf("%s: --poles: %w", t.file, err)
	}
	return nil
}

// wanted turns a pole list or pattern into poles of the model's own plane.
func (t *task) wanted(list string) ([]complex128, error) {
	spec, err := poles.Parse(list)
	if err != nil {
		return nil, fmt.Errorf("--poles: %w", err)
	}
	own, err := aim.Own(spec, t.plane, t.Model, t.designer)
	if err != nil {
		return nil, fmt.Errorf("--poles: %w", err)
	}
	return own, nil
}

// readGain reads the gain of --use-gain, given in the option or in a file.
func (t *task) readGain() (*mat.Dense, error) {
	text := []byte(t.opt.useGain)
	if !strings.HasPrefix(strings.TrimSpace(t.opt.useGain), "[") {
		var err error
		if text, err = readBounded(t.opt.useGain, "a JSON matrix"); err != nil {
			return nil, err
		}
	}
	var rows [][]*float64
	if err := json.Unmarshal(text, &rows); err != nil {
		return nil, usageError("use-gain", "not a JSON matrix of numbers", `rows like "[[0.4],[2.1]]"`)
	}
	n, _, p := t.Model.Dims()
	expected := fmt.Sprintf("%d x %d", n, p)
	if len(rows) != n {
		return nil, usageError("use-gain", fmt.Sprintf("%d rows", len(rows)), expected)
	}
	l := mat.NewDense(n, p, nil)
	for i, row := range rows {
		if len(row) != p {
			return nil, usageError("use-gain", fmt.Sprintf("row %d has %d entries", i+1, len(row)), expected)
		}
		for j, v := range row {
			if v == nil {
				return nil, usageError("use-gain", fmt.Sprintf("row %d, column %d is null", i+1, j+1), "a number")
			}
			l.Set(i, j, *v)
		}
	}
	return l, nil
}
