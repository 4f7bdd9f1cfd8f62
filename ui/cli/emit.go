package cli

import (
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"io"
	"path/filepath"
	"strings"
	"text/tabwriter"

	"github.com/spf13/cobra"

	"polewright/estimator"
	"polewright/estimator/emit"
	"polewright/plants"
	"polewright/scenarios/logs"
	"polewright/ui/desk"
	"polewright/ui/measures"
	"polewright/ui/session"
)

// emitOptions are those of emit.
type emitOptions struct {
	candidate, as, out, precision string
	force, json                   bool
}

func newEmit() *cobra.Command {
	var o emitOptions
	cmd := &cobra.Command{
		Use:   "emit SESSION --candidate NAME --as c99|st|json|csv --out DIR",
		Short: "Write a candidate's estimator for its target",
		Long: `Write the estimator of a candidate, with the gain that the session stores, as source
text for its target: C99 (one header, no library), IEC 61131-3 structured text, JSON
or CSV. C99 and structured text come with a self-test.

Every file names the plant, the candidate, their SHA-256 and the cautions. All files
are written or none.

` + measures.Caution,
		Example: `  polewright emit hoist.session.json --candidate B --as c99 --precision float --out firmware`,
		Args:    cobra.ExactArgs(1),
		RunE: func(cmd *cobra.Command, args []string) error {
			return o.run(cmd, args[0])
		},
	}
	f := cmd.Flags()
	f.StringVar(&o.candidate, "candidate", "", "the candidate whose stored gain is used")
	f.StringVar(&o.as, "as", "", "c99, st (structured text), json or csv")
	f.StringVar(&o.out, "out", "", "existing folder for the files")
	f.StringVar(&o.precision, "precision", "double", "double or float (c99, st), or 32-bit fixed point like q15.16 (c99): m.n with m + n = 31")
	f.BoolVar(&o.force, "force", false, "overwrite existing files")
	f.BoolVar(&o.json, "json", false, "print JSON: the files with their sizes and SHA-256")
	for name, words := range map[string][]string{"as": {"c99", "st", "json", "csv"}, "precision": {"double", "float", "q15.16"}} {
		cobra.CheckErr(cmd.RegisterFlagCompletionFunc(name, cobra.FixedCompletions(words, cobra.ShellCompDirectiveNoFileComp)))
	}
	return cmd
}

func (o *emitOptions) run(cmd *cobra.Command, file string) error {
	target, src, err := o.read(cmd)
	if err != nil {
		return err
	}
	if !session.Is(file) {
		if _, err := loadPlant(file); err != nil {
			return err
		}
		return &plants.Error{File: file, Where: "file", Wrong: "a plant", Expected: "a session file: emitted is the gain that a session keeps"}
	}
	w, sum, err := session.LoadSum(file)
	if err != nil {
		return fileError(file, "a session file", err)
	}
	c, err := o.pick(w)
	if err != nil {
		return err
	}
	if err := fill(src, w.Bench, c, sum); err != nil {
		return inFile(file, err)
	}
	files, err := emit.Emit(*src, target)
	if err != nil {
		return fmt.Errorf("%s: candidate %s: %w", file, c.Letter, err)
	}
	if err := writeAll(o.out, files, o.force); err != nil {
		return err
	}
	return o.report(cmd.OutOrStdout(), target, src, c, files)
}

// read checks the options that need no session.
func (o *emitOptions) read(cmd *cobra.Command) (emit.Target, *emit.Source, error) {
	src := &emit.Source{Version: Version}
	target, err := word("as", o.as, map[string]emit.Target{"c99": emit.C99, "st": emit.StructuredText, "json": emit.JSON, "csv": emit.CSV})
	if err != nil {
		return target, nil, err
	}
	if o.out == "" {
		return target, nil, usageError("out", "not given", "an existing folder")
	}
	if src.Arithmetic, src.FractionBits, err = emit.ParseArithmetic(o.precision); err != nil {
		return target, nil, usageError("precision", fmt.Sprintf("%q", o.precision), "double, float or fixed point qM.N with M + N = 31, such as q15.16")
	}
	switch {
	case cmd.Flags().Changed("precision") && (target == emit.JSON || target == emit.CSV):
		return target, nil, usageError("precision", "given for "+o.as+", which always carries all digits", "with --as c99 or st")
	case src.Arithmetic == emit.Fixed && target != emit.C99:
		return target, nil, usageError("precision", "fixed point for "+o.as, "with --as c99; or double or float")
	}
	return target, src, nil
}

func (o *emitOptions) pick(w *desk.Work) (*desk.Candidate, error) {
	wrong := fmt.Sprintf("no candidate %q", o.candidate)
	if o.candidate == "" {
		wrong = "not given"
	}
	expected := "a session that keeps one"
	if len(w.Candidates) > 0 {
		expected = candidateNames(w)
	}
	for i := range w.Candidates {
		if c := &w.Candidates[i]; o.candidate != "" && c.Letter == o.candidate {
			return c, nil
		}
	}
	return nil, usageError("candidate", wrong, expected)
}

// fill takes the stored gain, the signals and where all of it comes from.
func fill(src *emit.Source, b *desk.Bench, c *desk.Candidate, sum session.Sum) error {
	layout, err := logs.NewLayout(b.Plant, b.Model)
	if !b.Model.Discrete() {
		return &plants.Error{Where: "candidate " + c.Letter, Wrong: "a design in continuous time, which cannot run on a target", Expected: "one with a sample period: set period_s in the plant file and design for it"}
	}
	if err != nil {
		return err
	}
	src.Model, src.Form, src.L = b.Model, c.Form, c.Design.Gain
	if c.Form == estimator.Current {
		src.Lf = c.Design.GainCurrent
	}
	for i, s := range layout.States {
		unit := s.Unit
		if i >= len(b.Plant.States) {
			unit = addedUnit(b.Plant, s.Name)
		}
		src.States = append(src.States, emit.Signal{Name: s.Name, Unit: unit, Offset: s.Operating})
	}
	for _, s := range layout.Inputs {
		src.Inputs = append(src.Inputs, emit.Signal{Name: s.Name, Unit: s.Unit, Offset: s.Operating})
	}
	for _, s := range layout.Sensors {
		out := emit.Signal{Name: s.Name, Unit: s.Unit, Offset: s.Operating, Wrap: s.Wrap}
		if i, ok := b.Plant.SensorIndex(s.Name); ok && b.Plant.Sensors[i].Range != nil {
			r := b.Plant.Sensors[i].Range
			out.Range = []float64{r.Low, r.High}
		}
		src.Sensors = append(src.Sensors, out)
	}
	plant := sha256.Sum256(b.PlantText)
	src.Plant, src.Candidate = b.Plant.Name, c.Letter
	src.PlantSHA256, src.SessionSHA256 = hex.EncodeToString(plant[:]), hex.EncodeToString(sum[:])
	src.Cautions = c.Design.Warnings
	return nil
}

// addedUnit is the unit of a state that a lag, a delay or an unknown adds: that of
// its signal, by which it is named; a slope's is per second.
func addedUnit(p *plants.Plant, name string) string {
	unit, longest := "", -1
	take := func(signal, u string) {
		if strings.HasPrefix(name, signal+" ") && len(signal) > longest {
			unit, longest = u, len(signal)
		}
	}
	for _, s := range p.Inputs {
		take(s.Name, s.Unit)
	}
	for _, s := range p.Sensors {
		take(s.Name, s.Unit)
	}
	if longest >= 0 && unit != "" && strings.HasPrefix(name[longest:], " ramp slope") {
		unit = "(" + unit + ")/s"
	}
	return unit
}

// emitted is what `emit --json` prints.
type emitted struct {
	Format        int           `json:"format"`
	As            string        `json:"as"`
	Precision     string        `json:"precision"`
	Plant         string        `json:"plant"`
	Candidate     string        `json:"candidate"`
	Form          string        `json:"form"`
	PlantSHA256   string        `json:"plant_sha256"`
	SessionSHA256 string        `json:"session_sha256"`
	Version       string        `json:"version"`
	Files         []emittedFile `json:"files"`
	SelfTest      string        `json:"self_test,omitempty"`
	Warnings      []string      `json:"warnings"`
	Caution       string        `json:"caution"`
}

type emittedFile struct {
	Name   string `json:"name"`
	Path   string `json:"path"`
	Bytes  int    `json:"bytes"`
	SHA256 string `json:"sha256"`
}

func (o *emitOptions) report(w io.Writer, target emit.Target, src *emit.Source, c *desk.Candidate, files []emit.File) error {
	doc := &emitted{Format: 1, As: target.String(), Precision: o.precision, Plant: src.Plant, Candidate: src.Candidate, Form: measures.FormName(src.Form),
		PlantSHA256: src.PlantSHA256, SessionSHA256: src.SessionSHA256, Version: src.Version, Warnings: append([]string{}, c.Design.Warnings...), Caution: measures.Caution}
	for _, f := range files {
		sum := sha256.Sum256(f.Text)
		doc.Files = append(doc.Files, emittedFile{f.Name, filepath.Join(o.out, f.Name), len(f.Text), hex.EncodeToString(sum[:])})
	}
	if target == emit.C99 {
		doc.SelfTest = selfTestLine(doc.Files[len(doc.Files)-1].Path)
	}
	if o.json {
		return printJSON(w, doc)
	}
	tw := tabwriter.NewWriter(w, 0, 8, 2, ' ', 0)
	line := func(format string, args ...any) { fmt.Fprintf(tw, format+"\n", args...) }
	precision := "all digits"
	if target == emit.C99 || target == emit.StructuredText {
		precision = o.precision
	}
	line("%s, candidate %s, every %g s, %s form, %s", src.Plant, src.Candidate, src.Model.Period, doc.Form, precision)
	line("")
	line("file\tbytes\tSHA-256")
	for _, f := range doc.Files {
		line("%s\t%d\t%s", f.Path, f.Bytes, f.SHA256)
	}
	line("")
	switch target {
	case emit.C99:
		line("self-test: %s", doc.SelfTest)
	case emit.StructuredText:
		line("self-test: run the program in %s for one cycle; its output passed must be TRUE", doc.Files[len(doc.Files)-1].Path)
	}
	for _, s := range doc.Warnings {
		line("note: %s", s)
	}
	line("%s", measures.Caution)
	return tw.Flush()
}

// selfTestLine is what a POSIX shell needs to compile and run a self-test.
func selfTestLine(path string) string {
	program := strings.TrimSuffix(path, ".c")
	run := program
	if !strings.ContainsRune(run, filepath.Separator) {
		run = "./" + run
	}
	return fmt.Sprintf("gcc -std=c99 -O2 -Wall -Wextra -Wpedantic -Wconversion -Werror -o %s %s && %s", shellWord(program), shellWord(path), shellWord(run))
}

// shellWord quotes a word where a shell needs it, and a leading dash away.
func shellWord(s string) string {
	if strings.HasPrefix(s, "-") {
		s = "./" + s
	}
	for _, r := range s {
		if (r < 'a' || r > 'z') && (r < 'A' || r > 'Z') && (r < '0' || r > '9') && !strings.ContainsRune("_-./+,=:@%", r) {
			return "'" + strings.ReplaceAll(s, "'", `'\''`) + "'"
		}
	}
	return s
}
