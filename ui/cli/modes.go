package cli

import (
	"fmt"
	"io"
	"math"
	"slices"
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
	// Sampling lists the modes that the sample period folds together; null where
	// the plant is not continuous, or not sampled.
	Sampling     []fold `json:"sampling"`
	SamplingNote string `json:"sampling_note,omitempty"` // why it could not be judged
}

// fold is modes of the continuous plant that sampling maps onto each other.
type fold struct {
	Modes   []measures.Complex `json:"modes"`   // s-plane
	Sampled measures.Complex   `json:"sampled"` // z-plane
	Period  measures.Number    `json:"period_s"`
	Verdict string             `json:"verdict"` // told apart, faint or gone
	// Visible is what is left of how well the sensors see the modes, 1 being all.
	Visible measures.Number `json:"visible"`
	Better  measures.Number `json:"better_period_s"`
	Text    string          `json:"text"`
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
lost with each. For a continuous plant with a sample period, modes are named that
sampling maps onto each other, so that the sensors no longer tell them apart.`,
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
	doc.Sampling, doc.SamplingNote = examineSampling(src.plant, model.Period)
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

// examineSampling names what a sample period hides of a continuous plant. Delays in
// samples have no continuous counterpart and are left out; they hide nothing.
func examineSampling(p *plants.Plant, period float64) (list []fold, note string) {
	if !p.Continuous || period == 0 {
		return nil, ""
	}
	bare := *p
	bare.Inputs, bare.Sensors = slices.Clone(p.Inputs), slices.Clone(p.Sensors)
	for i := range bare.Inputs {
		bare.Inputs[i].DelaySamples = 0
	}
	for i := range bare.Sensors {
		bare.Sensors[i].DelaySamples = 0
	}
	var folds []estimator.Fold
	m, err := bare.Model(plants.Options{Period: new(float64)})
	if err == nil {
		folds, err = estimator.Folds(m, period)
	}
	if err != nil {
		return nil, oneLine(err)
	}
	list = []fold{}
	for _, f := range folds {
		entry := fold{Sampled: measures.Complex{real(f.Sampled), imag(f.Sampled)}, Period: measures.Number(f.Period),
			Verdict: f.Verdict.String(), Visible: measures.Number(f.Sigma), Better: measures.Number(f.Better), Text: f.String()}
		for _, v := range f.Modes {
			entry.Modes = append(entry.Modes, measures.Complex{real(v), imag(v)})
		}
		list = append(list, entry)
	}
	return list, ""
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
	if len(doc.Sampling) > 0 || doc.SamplingNote != "" {
		fmt.Fprintf(tw, "\nsampling\n")
	}
	for _, f := range doc.Sampling {
		fmt.Fprintf(tw, "%s\n", f.Text)
	}
	if doc.SamplingNote != "" {
		fmt.Fprintf(tw, "not judged: %s\n", doc.SamplingNote)
	}
	return tw.Flush()
}
