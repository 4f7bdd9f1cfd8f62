package cli

import (
	"fmt"
	"io"
	"math"
	"strings"
	"text/tabwriter"

	"github.com/spf13/cobra"

	"polewright/estimator"
	"polewright/plants"
	"polewright/ui/measures"
)

// subset is what one set of sensors sees.
type subset struct {
	Sensors []string            `json:"sensors"`
	Rank    int                 `json:"rank"`
	Fixed   []*measures.Complex `json:"fixed"`
	Weakest measures.Number     `json:"weakest_sigma"`
}

type modesDocument struct {
	Format        int                    `json:"format"`
	Plant         string                 `json:"plant"`
	StateNames    []string               `json:"state_names"`
	Observability measures.Observability `json:"observability"`
	Subsets       []subset               `json:"subsets"`
}

// maxSubsetSensors bounds the number of sensors for which every subset is judged.
const maxSubsetSensors = 6

func newModes() *cobra.Command {
	var asJSON bool
	var period float64
	cmd := &cobra.Command{
		Use:   "modes PLANT",
		Short: "Show which modes the sensors see and which nobody can move",
		Long: `For every eigenvalue of the plant, print how well the sensors see it (the smallest
singular value of [A − λI; C] in scaled coordinates) and whether an estimator can
move it at all; then the same for every smaller set of sensors, to see what is
lost with each.`,
		Args: cobra.ExactArgs(1),
		RunE: func(cmd *cobra.Command, args []string) error {
			src, err := loadPlant(args[0])
			if err != nil {
				return err
			}
			o, err := periodOption(cmd, &period)
			if err != nil {
				return err
			}
			doc, seen, err := examineModes(src, o)
			if err != nil {
				return err
			}
			if asJSON {
				return printJSON(cmd.OutOrStdout(), doc)
			}
			return printModes(cmd.OutOrStdout(), doc, seen)
		},
	}
	cmd.Flags().BoolVar(&asJSON, "json", false, "print JSON")
	cmd.Flags().Float64Var(&period, "period", 0, "sample period in seconds in place of the plant file's; 0 drops it")
	return cmd
}

func examineModes(src *source, o plants.Options) (*modesDocument, *estimator.Observability, error) {
	model, err := src.plant.Model(o)
	if err != nil {
		return nil, nil, err
	}
	d, err := estimator.NewDesigner(model, estimator.Options{})
	if err != nil {
		return nil, nil, fmt.Errorf("%s: %w", src.file, err)
	}
	seen := &d.Analysis().Observability
	doc := &modesDocument{Format: 1, Plant: src.plant.Name, StateNames: model.StateNames, Observability: measures.Observe(seen)}
	enabled := src.plant.Enabled()
	for _, set := range subsets(enabled) {
		o.Sensors = set
		sub, err := src.plant.Model(o)
		if err != nil {
			return nil, nil, err
		}
		part, err := estimator.NewDesigner(sub, estimator.Options{})
		if err != nil {
			return nil, nil, fmt.Errorf("%s: %w", src.file, err)
		}
		ob := &part.Analysis().Observability
		s := subset{Sensors: sub.SensorNames, Rank: ob.Rank, Fixed: measures.Observe(ob).Fixed, Weakest: measures.Number(math.Inf(1))}
		for _, m := range ob.Modes {
			s.Weakest = min(s.Weakest, measures.Number(m.Sigma))
		}
		doc.Subsets = append(doc.Subsets, s)
	}
	return doc, seen, nil
}

// subsets lists every non-empty set of the enabled sensors, larger sets first
// for few sensors; beyond maxSubsetSensors all of them and all but one each.
func subsets(enabled []bool) [][]bool {
	var on []int
	for i, e := range enabled {
		if e {
			on = append(on, i)
		}
	}
	pick := func(keep func(k int) bool) []bool {
		set := make([]bool, len(enabled))
		for k, i := range on {
			set[i] = keep(k)
		}
		return set
	}
	var out [][]bool
	if len(on) > maxSubsetSensors {
		out = append(out, pick(func(int) bool { return true }))
		for lost := range on {
			out = append(out, pick(func(k int) bool { return k != lost }))
		}
		return out
	}
	for bits := 1<<len(on) - 1; bits > 0; bits-- {
		out = append(out, pick(func(k int) bool { return bits>>k&1 == 1 }))
	}
	return out
}

func printModes(w io.Writer, doc *modesDocument, seen *estimator.Observability) error {
	tw := tabwriter.NewWriter(w, 0, 8, 2, ' ', 0)
	fmt.Fprintf(tw, "%s: %d states, %d of them seen by the sensors\n\n", doc.Plant, len(doc.StateNames), seen.Rank)
	fmt.Fprintf(tw, "mode\tsigma\t\n")
	for _, m := range seen.Modes {
		word := "seen"
		if !m.Observable {
			word = "NOT SEEN: no gain can move it"
		}
		fmt.Fprintf(tw, "%s\t%.3g\t%s\n", shown(m.Eigenvalue, "", 0), m.Sigma, word)
	}
	fmt.Fprintf(tw, "\nsensors\tstates seen\tweakest sigma\tfixed modes\n")
	for _, s := range doc.Subsets {
		var fixed []string
		for _, f := range s.Fixed {
			fixed = append(fixed, shown(complex(f[0], f[1]), "", 0))
		}
		fmt.Fprintf(tw, "%s\t%d\t%.3g\t%s\n", strings.Join(s.Sensors, " + "), s.Rank, float64(s.Weakest), strings.Join(fixed, ", "))
	}
	return tw.Flush()
}
