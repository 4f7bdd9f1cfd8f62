package cli

import (
	"encoding/json"
	"fmt"
	"io"
	"math"
	"strings"
	"text/tabwriter"

	"github.com/spf13/cobra"

	"polewright/estimator"
	"polewright/estimator/poles"
	"polewright/scenarios"
	"polewright/ui/measures"
)

func newDesign() *cobra.Command {
	var o designOptions
	cmd := &cobra.Command{
		Use:   "design PLANT --poles LIST",
		Short: "Make one design and print what it costs and gives",
		Long: `Design one estimator for a plant file (or a built-in plant by name) and print its
gain, its steady-state noise against the best linear estimator (the floor), its
start-up transient and, with a controller in the plant file, the margins of the
loop. With --scenario the scenario is run and its limits are judged.

Exit status: 0 done, 1 the answer is no (a limit is not met, or the poles cannot
be placed because the sensors do not see every mode), 2 bad usage or bad input.

` + measures.Caution,
		Example: `  polewright design hoist.toml --poles "-4±3i, -6"
  polewright design hoist.toml --poles bessel@40 --scenario cold.toml --json`,
		Args: cobra.ExactArgs(1),
		RunE: func(cmd *cobra.Command, args []string) error {
			t, err := o.prepare(cmd, args[0])
			if err != nil {
				return err
			}
			if err := t.solve(); err != nil {
				return err
			}
			limits, err := t.limits(cmd)
			if err != nil {
				return err
			}
			if o.json {
				doc := measures.Build(t.Plant.Name, t.Model, t.designer.Analysis(), t.design, t.plane, limits)
				err = printJSON(cmd.OutOrStdout(), doc)
			} else {
				err = t.print(cmd.OutOrStdout(), limits)
			}
			if err != nil {
				return err
			}
			return limitsMet(limits)
		},
	}
	o.register(cmd)
	return cmd
}

// limits runs the scenario, where there is one, and judges its limits.
func (t *task) limits(cmd *cobra.Command) ([]scenarios.LimitResult, error) {
	if t.ScenarioFile == "" {
		return nil, nil
	}
	run, err := t.run(cmd.Context())
	if err != nil {
		return nil, err
	}
	return t.Scenario.Judge(t.design, t.Model, t.Plant, run), nil
}

func limitsMet(limits []scenarios.LimitResult) error {
	for _, l := range limits {
		if !l.Met {
			return &noError{fmt.Errorf("%w: %s", errLimits, l.Name)}
		}
	}
	return nil
}

func printJSON(w io.Writer, v any) error {
	b, err := json.MarshalIndent(v, "", "  ")
	if err != nil {
		return err
	}
	_, err = fmt.Fprintf(w, "%s\n", b)
	return err
}

// figure prints a number in five digits, or a dash where it is not defined.
func figure(v float64) string {
	switch {
	case math.IsNaN(v):
		return "–"
	case math.IsInf(v, 0):
		return "unlimited"
	}
	return fmt.Sprintf("%.5g", v)
}

// with is a figure with its unit where it is a number.
func with(v float64, unit string) string {
	if math.IsNaN(v) || math.IsInf(v, 0) {
		return figure(v)
	}
	return figure(v) + " " + unit
}

func (t *task) print(w io.Writer, limits []scenarios.LimitResult) error {
	tw := tabwriter.NewWriter(w, 0, 8, 2, ' ', 0)
	line := func(format string, args ...any) { fmt.Fprintf(tw, format+"\n", args...) }
	d, m := t.design, t.Model
	time := "continuous time"
	if m.Discrete() {
		time = fmt.Sprintf("every %g s, %s form", m.Period, measures.FormName(d.Form))
	}
	line("%s, %s", t.Plant.Name, time)
	line("")
	t.printPoles(line)
	line("")
	line("gain\t%s", strings.Join(m.SensorNames, "\t"))
	for i, name := range m.StateNames {
		row := name
		for j := range m.SensorNames {
			row += "\t" + figure(d.Gain.At(i, j))
		}
		line("%s", row)
	}
	line("")
	line("steady-state noise\tstd\tfloor\tover the floor")
	floor := t.designer.Analysis().Floor
	for i, name := range m.StateNames {
		std, best, ratio := math.NaN(), math.NaN(), math.NaN()
		if d.Noise.Std != nil {
			std, ratio = d.Noise.Std[i], d.Noise.OverFloor[i]
		}
		if floor != nil {
			best = floor.Std[i]
		}
		line("%s\t%s\t%s\t%s", name, figure(std), figure(best), figure(ratio))
	}
	for i, o := range d.Noise.Outputs {
		line("%s\t%s\t%s\t", m.OutputNames[i], figure(o.Std), figure(o.FloorStd))
	}
	line("")
	line("noise over the floor, all states\t%s", figure(d.Noise.OverFloorRMS))
	line("start-up settles to 2 %% in\t%s s", figure(d.Transient.Settle))
	line("start-up peak\t%s", figure(d.Transient.Peak))
	line("eigenvector condition\t%s", figure(d.EigenvectorCondition))
	t.printRounding(line)
	t.printLoop(line)
	if len(limits) > 0 {
		line("")
		line("limit\tvalue\tlimit\t")
		for _, l := range limits {
			met := "met"
			if !l.Met {
				met = "NOT MET"
			}
			line("%s\t%s\t%s\t%s", l.Name, figure(l.Value), figure(l.Limit), met)
		}
	}
	if len(d.Warnings) > 0 {
		line("")
	}
	for _, s := range d.Warnings {
		line("note: %s", s)
	}
	line("")
	line("%s", measures.Caution)
	return tw.Flush()
}

func (t *task) printPoles(line func(string, ...any)) {
	d := t.design
	line("poles (%s)\twanted\treached", t.plane)
	for i, v := range d.Reached {
		want := "–"
		if d.Wanted != nil {
			want = shown(d.Wanted[i], t.plane, t.Model.Period)
		}
		line("\t%s\t%s", want, shown(v, t.plane, t.Model.Period))
	}
	if d.Wanted != nil {
		line("worst relative error\t%.2g", d.WorstError)
	}
}

// shown is a pole of the model's own plane as it is printed in plane.
func shown(v complex128, plane string, period float64) string {
	if plane == "s" && period > 0 {
		s, ok := poles.ToS(v, period)
		if !ok {
			return "z = 0"
		}
		v = s
	}
	if imag(v) == 0 {
		return fmt.Sprintf("%.6g", real(v))
	}
	return fmt.Sprintf("%.6g %+.6gi", real(v), imag(v))
}

func (t *task) printLoop(line func(string, ...any)) {
	l := t.design.Loop
	if l == nil || !l.Stable {
		return
	}
	line("")
	line("loop margins at the plant input\t%s", worstInput(t.Model, l))
	line("gain\t%s to %s", with(l.GainMarginBelow, "dB"), with(l.GainMarginAbove, "dB"))
	line("phase\t%s", with(l.PhaseMargin, "deg"))
	line("delay\t%s", with(l.DelayMargin, "s"))
	line("sensitivity peak\t%s", figure(l.SensitivityPeak))
	for i, s := range l.InputStd {
		line("noise on %s\t%s", t.Model.InputNames[i], figure(s))
	}
}

func worstInput(m *estimator.Model, l *estimator.Loop) string {
	if len(m.InputNames) < 2 || l.Input < 0 {
		return ""
	}
	return "(worst at " + m.InputNames[l.Input] + ")"
}
