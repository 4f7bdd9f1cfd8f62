package cli

import (
	"fmt"
	"io"
	"text/tabwriter"

	"github.com/spf13/cobra"

	"polewright/ui/measures"
	"polewright/ui/session"
	"polewright/ui/verify"
)

// shownDifferences bounds what is printed for a person; --json has them all.
const shownDifferences = 6

func newVerify() *cobra.Command {
	var asJSON bool
	cmd := &cobra.Command{
		Use:   "verify SESSION",
		Short: "Recompute every candidate of a session and hold it against the limits",
		Long: `Recompute every candidate of a session from the plant and scenario texts inside it
and its stored gain, compare with the figures that were saved, run the scenario and
hold each candidate against the limits. Nothing is designed anew and nothing written.

How far a figure may be off follows from its own conditioning: beside each design a
few neighbours are judged whose numbers differ by some units of the last place.
Figures that this leaves alone are held to nine digits.

Exit status: 0 all is as saved and every limit is met, 1 something differs or a
limit is not met, 2 bad usage or bad input.

` + measures.Caution,
		Example: `  polewright verify hoist.session.json`,
		Args:    cobra.ExactArgs(1),
		RunE: func(cmd *cobra.Command, args []string) error {
			file := args[0]
			k, err := session.LoadKept(file)
			if err != nil {
				return fileError(file, "a session file", err)
			}
			r, err := verify.Check(cmd.Context(), k, "polewright "+Version)
			if err != nil {
				return inFile(file, err)
			}
			if asJSON {
				err = printJSON(cmd.OutOrStdout(), r)
			} else {
				err = printVerified(cmd.OutOrStdout(), file, r)
			}
			if err != nil {
				return err
			}
			if bad := r.Verdict(); bad != nil {
				return &noError{fmt.Errorf("%s: %w", file, bad)}
			}
			return nil
		},
	}
	cmd.Flags().BoolVar(&asJSON, "json", false, "print JSON with every figure")
	return cmd
}

func printVerified(w io.Writer, file string, r *verify.Report) error {
	tw := tabwriter.NewWriter(w, 0, 8, 2, ' ', 0)
	line := func(format string, args ...any) { fmt.Fprintf(tw, format+"\n", args...) }
	line("%s, saved by %s", file, r.SavedBy)
	line("%s; %s", r.Plant, r.Scenario)
	line("")
	for _, t := range r.Texts {
		said := "as saved"
		if !t.Matches {
			said = "CHANGED since it was saved"
		}
		line("%s text\t%s\t%s", t.What, t.File, said)
	}
	line("")
	line("candidate\tform\tfigures compared\t\tlimits\tsettle, s\tnoise, x floor")
	for i := range r.Candidates {
		c := &r.Candidates[i]
		line("%s\t%s\t%d\t%s\t%s\t%s\t%s", c.Name, c.Form, c.Compared, differWords(len(c.Differences)), limitWords(c),
			figure(float64(c.Settle)), figure(float64(c.OverFloor)))
	}
	if len(r.Candidates) == 0 {
		line("none\t\t0\t\t\t\t")
	}
	if r.InHand.Checked {
		line("(in hand)\t\t\t%s\t\t\t", differWords(len(r.InHand.Differences)))
	}
	if err := tw.Flush(); err != nil {
		return err
	}
	for i := range r.Candidates {
		c := &r.Candidates[i]
		printDifferences(line, c.Name, c.Differences)
		printBroken(line, c)
	}
	printDifferences(line, "(in hand)", r.InHand.Differences)
	for _, c := range r.Candidates {
		if len(c.Warnings) > 0 {
			line("")
		}
		for _, s := range c.Warnings {
			line("note, %s: %s", c.Name, s)
		}
	}
	line("")
	line("%s", measures.Caution)
	return tw.Flush()
}

func differWords(n int) string {
	switch n {
	case 0:
		return "the same"
	case 1:
		return "1 DIFFERS"
	}
	return fmt.Sprintf("%d DIFFER", n)
}

func limitWords(c *verify.Candidate) string {
	broken := 0
	for _, l := range c.Limits {
		if !l.Met {
			broken++
		}
	}
	switch {
	case len(c.Limits) == 0 && !c.LimitsMet:
		return "not judged"
	case len(c.Limits) == 0:
		return "none set"
	case broken > 0:
		return fmt.Sprintf("%d of %d NOT MET", broken, len(c.Limits))
	}
	return fmt.Sprintf("all %d met", len(c.Limits))
}

func printDifferences(line func(string, ...any), name string, list []verify.Difference) {
	if len(list) == 0 {
		return
	}
	line("")
	line("%s\tstored\trecomputed\tallowed", name)
	for i, d := range list {
		if i == shownDifferences {
			line("... and %d more (--json has all)", len(list)-i)
			break
		}
		key := d.Key
		if d.At != "" {
			key += ", " + d.At
		}
		allowed := ""
		if t := float64(d.Tolerance); t == t {
			allowed = fmt.Sprintf("± %.2g", t)
		}
		line("%s\t%s\t%s\t%s", oneLine(fmt.Errorf("%s", key)), anyFigure(d.Stored), anyFigure(d.Recomputed), allowed)
	}
}

// anyFigure prints a number so that it reads back, and short words.
func anyFigure(v any) string {
	switch v := v.(type) {
	case nil:
		return "–"
	case float64:
		return fmt.Sprint(v)
	case string:
		if r := []rune(v); len(r) > 60 {
			v = string(r[:57]) + "..."
		}
		return fmt.Sprintf("%q", v)
	case bool:
		return fmt.Sprint(v)
	}
	return "a table"
}

func printBroken(line func(string, ...any), c *verify.Candidate) {
	first := true
	for _, l := range c.Limits {
		if l.Met {
			continue
		}
		if first {
			line("")
			line("%s\tvalue\tlimit\t", c.Name)
			first = false
		}
		line("%s\t%s\t%s\tNOT MET", l.Name, figure(float64(l.Value)), figure(float64(l.Limit)))
	}
}
