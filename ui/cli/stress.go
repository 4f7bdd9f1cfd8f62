package cli

import (
	"fmt"
	"io"
	"strings"
	"text/tabwriter"

	"github.com/spf13/cobra"

	"polewright/estimator"
	"polewright/plants"
	"polewright/scenarios"
	"polewright/scenarios/tolerance"
	"polewright/ui/measures"
)

func newStress() *cobra.Command {
	var o designOptions
	var samples int
	var seed uint64
	cmd := &cobra.Command{
		Use:   "stress PLANT --poles LIST",
		Short: "Try one design on every corner of the parameters' tolerances",
		Long: `Judge one design on real plants whose parameters differ from the model's within
their tolerances: every corner (up to eight parameters; beyond that each alone and
corners drawn at random) and points inside, drawn from the seed. Printed are the
worst stability, noise, bias and loop margins, each with the case that gives it,
and a [truth] table that makes the worst case a scenario's real plant.

Exit status: 0 done, 1 the answer is no (a loop is unstable in some case, or a
limit of the scenario on margins or noise is not met at worst), 2 bad usage or bad
input.

` + tolerance.Caution + `

` + measures.Caution,
		Example: `  polewright stress hoist.toml --poles floor
  polewright stress hoist.session.json --candidate B --json`,
		Args: cobra.ExactArgs(1),
		RunE: func(cmd *cobra.Command, args []string) error {
			if samples < 0 {
				return usageError("samples", fmt.Sprint(samples), "0 or more points inside")
			}
			t, err := o.prepare(cmd, args[0])
			if err != nil {
				return err
			}
			if err := t.solve(); err != nil {
				return err
			}
			return t.stress(cmd, samples, seed)
		},
	}
	o.register(cmd)
	cmd.Flags().IntVar(&samples, "samples", 200, "number of points inside the tolerances")
	cmd.Flags().Uint64Var(&seed, "seed", 1, "seed of these points")
	return cmd
}

// stress runs the study and prints it.
func (t *task) stress(cmd *cobra.Command, samples int, seed uint64) error {
	if samples == 0 {
		samples = -1
	}
	e, err := tolerance.Study{
		Plant: t.Plant, Design: t.design, Samples: samples, Seed: seed,
		Options:  plants.Options{Period: &t.Model.Period},
		Designer: estimator.Options{Form: t.design.Form, Method: t.design.Method},
	}.Run(cmd.Context(), nil)
	if err != nil {
		return inFile(t.file, err)
	}
	var limits []scenarios.LimitResult
	if t.ScenarioFile != "" {
		limits = e.Judge(&t.Scenario.Limits)
	}
	if t.opt.json {
		err = printJSON(cmd.OutOrStdout(), t.stressDocument(e, limits))
	} else {
		err = t.printStress(cmd.OutOrStdout(), e, limits)
	}
	if err != nil {
		return err
	}
	if e.Unstable > 0 && t.Model.K != nil {
		return &noError{fmt.Errorf("%s: plant and estimator are unstable in %d of %d cases", t.file, e.Unstable, e.Cases)}
	}
	return limitsMet(limits)
}

// stressDocument is what `stress --json` prints.
type stressDocument struct {
	Format          int                `json:"format"`
	Plant           string             `json:"plant"`
	Parameters      []stressParameter  `json:"parameters"`
	Cases           int                `json:"cases"`
	AllCorners      bool               `json:"all_corners"`
	Unstable        int                `json:"unstable"`
	NominalUnstable bool               `json:"nominal_unstable"`
	UnstableCases   []stressFactors    `json:"unstable_cases"` // the worst first
	Failed          int                `json:"failed"`
	Measures        []stressMeasure    `json:"measures"`
	Truth           map[string]float64 `json:"truth"` // factors of the case to try; null where none differs
	Limits          []measures.Limit   `json:"limits,omitempty"`
	Notes           []string           `json:"notes"`
	Caution         string             `json:"caution"`
}

type stressParameter struct {
	Name      string          `json:"name"`
	Value     measures.Number `json:"value"`
	Tolerance measures.Number `json:"tolerance"`
}

type stressFactors struct {
	Text    string             `json:"text"`
	Factors map[string]float64 `json:"factors"`
}

type stressMeasure struct {
	Name    string          `json:"name"`
	Unit    string          `json:"unit"`
	Nominal measures.Number `json:"nominal"`
	Worst   measures.Number `json:"worst"`
	At      stressFactors   `json:"at"`
}

func (t *task) stressDocument(e *tolerance.Envelope, limits []scenarios.LimitResult) *stressDocument {
	doc := &stressDocument{Format: 1, Plant: t.Plant.Name, Cases: e.Cases, AllCorners: e.Exhaustive, Unstable: e.Unstable,
		NominalUnstable: e.NominalUnstable, Failed: e.Failed, Notes: append([]string{}, e.Notes...),
		Parameters: []stressParameter{}, UnstableCases: []stressFactors{}, Measures: []stressMeasure{},
		Caution: tolerance.Caution + " " + measures.Caution}
	for _, q := range e.Parameters {
		doc.Parameters = append(doc.Parameters, stressParameter{q.Name, measures.Number(q.Value), measures.Number(q.Tolerance)})
	}
	for _, c := range e.UnstableCases {
		doc.UnstableCases = append(doc.UnstableCases, stressFactors{c.String(), c.Truth()})
	}
	for _, m := range e.Measures {
		doc.Measures = append(doc.Measures, stressMeasure{m.Name, m.Unit, measures.Number(m.Nominal), measures.Number(m.Worst),
			stressFactors{m.Case.String(), m.Case.Truth()}})
	}
	if c, ok := e.Stress(); ok {
		doc.Truth = c.Truth()
	}
	for _, f := range e.Failures {
		doc.Notes = append(doc.Notes, failureLine(f))
	}
	for _, l := range limits {
		doc.Limits = append(doc.Limits, measures.Limit{Name: l.Name, Value: measures.Number(l.Value), Limit: measures.Number(l.Limit), Met: l.Met})
	}
	return doc
}

func failureLine(f tolerance.Failure) string {
	return fmt.Sprintf("%s could not be judged: %s", f.Case, oneLine(f.Err))
}

func (t *task) printStress(w io.Writer, e *tolerance.Envelope, limits []scenarios.LimitResult) error {
	tw := tabwriter.NewWriter(w, 0, 8, 2, ' ', 0)
	line := func(format string, args ...any) { fmt.Fprintf(tw, format+"\n", args...) }
	line("%s: one design on %d plants within the tolerances", t.Plant.Name, e.Cases)
	for _, n := range e.Notes {
		line("%s", n)
	}
	line("")
	if e.NominalUnstable && t.Model.K == nil {
		line("The plant does not settle by itself and has no controller here: a parameter that is")
		line("off makes the estimate drift off with the plant, without a steady state.")
		line("")
	}
	if e.Unstable > 0 {
		line("UNSTABLE in %d of %d cases; their noise, bias and margins are without bound and left out below:", e.Unstable, e.Cases)
		for _, c := range e.UnstableCases {
			line("  %s", c)
		}
		line("")
	}
	line("figure\tnominal\tworst\tunit\tat")
	for _, m := range e.Measures {
		line("%s\t%s\t%s\t%s\t%s", m.Name, figure(m.Nominal), figure(m.Worst), m.Unit, m.Case)
	}
	if e.Failed > 0 {
		line("")
		line("%d cases could not be judged:", e.Failed)
		for _, f := range e.Failures {
			line("  %s", failureLine(f))
		}
	}
	printStressLimits(line, limits)
	if c, ok := e.Stress(); ok {
		line("")
		line("To try the worst case in a scenario, put into its file:")
		for _, s := range strings.Split(strings.TrimSpace(c.TruthText()), "\n") {
			line("  %s", s)
		}
	}
	line("")
	line("%s", tolerance.Caution)
	line("%s", measures.Caution)
	return tw.Flush()
}

func printStressLimits(line func(string, ...any), limits []scenarios.LimitResult) {
	if len(limits) == 0 {
		return
	}
	line("")
	line("limit\tworst\tlimit\t")
	for _, l := range limits {
		met := "met"
		if !l.Met {
			met = "NOT MET"
		}
		line("%s\t%s\t%s\t%s", l.Name, figure(l.Value), figure(l.Limit), met)
	}
}
