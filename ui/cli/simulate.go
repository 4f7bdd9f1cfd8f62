package cli

import (
	"bytes"
	"context"
	"fmt"
	"math"

	"github.com/spf13/cobra"

	"polewright/scenarios"
	"polewright/ui/measures"
	"polewright/ui/session"
)

func newSimulate() *cobra.Command {
	var o designOptions
	var out string
	var force bool
	cmd := &cobra.Command{
		Use:   "simulate PLANT --poles LIST",
		Short: "Run a scenario: the real plant beside its estimate",
		Long: `Run one design over a scenario and write time, true states, estimates and
innovations as CSV, to standard output or to a file. The same seed gives the same
noise on every machine. Without --scenario a plain start-up run is made.

` + measures.Caution,
		Example: `  polewright simulate hoist.toml --poles floor --scenario cold.toml --out run.csv`,
		Args:    cobra.ExactArgs(1),
		RunE: func(cmd *cobra.Command, args []string) error {
			t, err := o.prepare(cmd, args[0])
			if err != nil {
				return err
			}
			if err := t.solve(); err != nil {
				return err
			}
			run, err := t.run(cmd.Context())
			if err != nil {
				return err
			}
			limits := t.Scenario.Judge(t.design, t.Model, t.Plant, run)
			if err := t.writeRun(cmd, run, limits, out, force); err != nil {
				return err
			}
			return limitsMet(limits)
		},
	}
	o.register(cmd)
	cmd.Flags().StringVar(&out, "out", "", "CSV file to write")
	cmd.Flags().BoolVar(&force, "force", false, "overwrite an existing file")
	return cmd
}

func (t *task) run(ctx context.Context) (*scenarios.Run, error) {
	runner, err := scenarios.NewRunner(t.Plant, t.Model, t.Scenario, t.Truth)
	if err != nil {
		return nil, err
	}
	return runner.Run(ctx, scenarios.Gain{L: t.design.Gain, Lf: t.design.GainCurrent, Form: t.design.Form})
}

// summary is what `simulate --json` prints.
type summary struct {
	Format   int               `json:"format"`
	Scenario string            `json:"scenario"`
	Samples  int               `json:"samples"`
	Diverged bool              `json:"diverged"`
	RMS      []measures.Number `json:"error_rms"` // per plant state, over the whole run
	States   []string          `json:"states"`
	Limits   []measures.Limit  `json:"limits"`
	Caution  string            `json:"caution"`
}

func (t *task) writeRun(cmd *cobra.Command, run *scenarios.Run, limits []scenarios.LimitResult, out string, force bool) error {
	var csv bytes.Buffer
	if err := scenarios.WriteCSV(&csv, run, t.Plant); err != nil {
		return err
	}
	if out != "" {
		if err := session.WriteNew(out, csv.Bytes(), force); err != nil {
			return fileError(out, "a new file in an existing folder (--force overwrites)", err)
		}
	}
	if t.opt.json {
		return printJSON(cmd.OutOrStdout(), summarise(run, limits, t))
	}
	if out == "" {
		_, err := cmd.OutOrStdout().Write(csv.Bytes())
		return err
	}
	_, err := fmt.Fprintf(cmd.OutOrStdout(), "%s: %d samples\n%s\n", out, len(run.T), measures.Caution)
	return err
}

func summarise(run *scenarios.Run, limits []scenarios.LimitResult, t *task) *summary {
	s := &summary{Format: 1, Scenario: t.Scenario.Name, Samples: len(run.T), Diverged: run.Diverged, Limits: []measures.Limit{}, Caution: measures.Caution}
	for i, truth := range run.True {
		var sum float64
		for k, v := range truth {
			e := v - run.Estimate[i][k]
			sum += e * e
		}
		s.RMS = append(s.RMS, measures.Number(math.Sqrt(sum/float64(len(truth)))))
		s.States = append(s.States, t.Model.StateNames[i])
	}
	for _, l := range limits {
		s.Limits = append(s.Limits, measures.Limit{Name: l.Name, Value: measures.Number(l.Value), Limit: measures.Number(l.Limit), Met: l.Met})
	}
	return s
}
