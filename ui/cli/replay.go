package cli

import (
	"context"
	"io"
	"os"

	"github.com/spf13/cobra"

	"polewright/scenarios"
	"polewright/scenarios/logs"
	"polewright/ui/measures"
	"polewright/ui/session"
)

// replayOptions are those of replay alone.
type replayOptions struct {
	logOptions
	out          string
	sweep, force bool
}

func newReplay() *cobra.Command {
	var o designOptions
	var r replayOptions
	cmd := &cobra.Command{
		Use:   "replay PLANT|SESSION --poles LIST|--candidate NAME --log FILE.csv",
		Short: "Run an estimator over a recorded log of the real machine",
		Long: `Run one design over a log of the real machine and hold its innovations against what
the model, the noise figures and this gain promise.

The log is CSV with a header: a column t in seconds, then columns named as the
plant's inputs and sensors; a column named as a state is a reference to compare
with. An empty field or NaN is a lost sample, which the estimator predicts through.
Row k has the sensors sampled at t and the inputs held from t to the next row.

Logs of any length are read in constant memory. The statistics leave out the first
tenth of the samples, or --skip seconds. With --sweep the log is read once more, for
the speed of the poles that predicts it best.

` + measures.Caution,
		Example: `  polewright replay hoist.toml --poles bessel@40 --log monday.csv
  polewright replay hoist.session.json --candidate B --log monday.csv --map "u_cmd=cable force" --out b.csv`,
		Args: cobra.ExactArgs(1),
		RunE: func(cmd *cobra.Command, args []string) error {
			return r.run(cmd, &o, args[0])
		},
	}
	o.register(cmd)
	f := cmd.Flags()
	r.logOptions.register(cmd)
	f.StringVar(&r.out, "out", "", "CSV file to write: time, estimates, innovations")
	f.BoolVar(&r.sweep, "sweep", false, "find the best speed for this log: the least one-step-ahead error over speeds of the poles and the floor's family")
	f.BoolVar(&r.force, "force", false, "overwrite an existing file")
	return cmd
}

func (r *replayOptions) run(cmd *cobra.Command, o *designOptions, arg string) error {
	if r.log == "" {
		return usageError("log", "not given", "a CSV file")
	}
	q, names, err := r.read(cmd)
	if err != nil {
		return err
	}
	t, err := o.prepare(cmd, arg)
	if err != nil {
		return err
	}
	layout, err := logs.NewLayout(t.Plant, t.Model)
	if err != nil {
		return inFile(arg, err)
	}
	if err := t.solve(); err != nil {
		return err
	}
	q.Model, q.Gain = t.Model, logs.GainOf(t.design)
	if q.Floor, err = logs.FloorGain(t.Model, t.designer.Analysis()); err != nil {
		return inFile(arg, err)
	}
	if err := r.outIsFree(); err != nil {
		return err
	}
	src, size, err := openLog(r.log)
	if err != nil {
		return err
	}
	defer src.Close()
	shown := newProgress(cmd.ErrOrStderr(), src, size)
	defer shown.clear()
	shown.begin("checking the log")
	log, err := logs.Open(cmd.Context(), shown, layout, logs.Options{File: r.log, Names: names, InputLag: r.inputLag, Resample: r.resample})
	if err != nil {
		return r.failed(err)
	}
	var best *swept
	if r.sweep {
		shown.begin("sweeping")
		if best, err = bestSpeed(cmd.Context(), log, t, q); err != nil {
			return r.failed(err)
		}
	}
	shown.begin("replaying")
	result, err := r.replay(cmd.Context(), log, q)
	if err != nil {
		return r.failed(err)
	}
	shown.clear()
	return r.report(cmd, t, log.Survey(), result, best)
}

// outIsFree refuses an output that cannot be written before a long log is read.
func (r *replayOptions) outIsFree() error {
	if r.out == "" {
		return nil
	}
	old, err := os.Stat(r.out)
	if err != nil {
		return nil // what is wrong with it, writing says
	}
	if log, err := os.Stat(r.log); err == nil && os.SameFile(old, log) {
		return usageError("out", r.out+" is the log itself", "another file")
	}
	if !r.force {
		return fileError(r.out, newFile, os.ErrExist)
	}
	return nil
}

// newFile is what an output must be.
const newFile = "a new file in an existing folder (--force overwrites)"

// replay runs the estimator, and writes its rows where a file is wanted.
func (r *replayOptions) replay(ctx context.Context, log *logs.Log, q logs.Request) (result *logs.Result, err error) {
	if r.out == "" {
		return logs.Replay(ctx, log, q)
	}
	var inside error
	err = session.WriteStream(r.out, r.force, func(w io.Writer) error {
		result, inside = writeReplay(ctx, w, log, q)
		return inside
	})
	if err != nil && inside == nil {
		err = fileError(r.out, newFile, err)
	}
	return result, err
}

func writeReplay(ctx context.Context, w io.Writer, log *logs.Log, q logs.Request) (*logs.Result, error) {
	rows, err := logs.NewWriter(w, log.Layout())
	if err != nil {
		return nil, err
	}
	q.Each = rows.Row
	result, err := logs.Replay(ctx, log, q)
	if err != nil {
		return nil, err
	}
	return result, rows.Flush()
}

// replayed is what `replay --json` prints.
type replayed struct {
	Format int        `json:"format"`
	Plant  string     `json:"plant"`
	Form   string     `json:"form"`
	Log    replayedOf `json:"log"`
	*logs.Result
	Noise   *logs.NoiseFigures `json:"noise_figures"` // null where the log gives none
	NoNoise string             `json:"noise_figures_missing,omitempty"`
	Sweep   *swept             `json:"sweep,omitempty"` // with --sweep
	Limits  []measures.Limit   `json:"limits,omitempty"`
	Caution string             `json:"caution"`
}

type replayedOf struct {
	File    string      `json:"file"`
	Rows    int64       `json:"rows"`
	Start   logs.Number `json:"start_s"`
	End     logs.Number `json:"end_s"`
	Ignored []string    `json:"ignored_columns"`
}

// report prints what came out. Limits are judged where a scenario was named.
func (r *replayOptions) report(cmd *cobra.Command, t *task, v *logs.Survey, result *logs.Result, best *swept) error {
	var limits []scenarios.LimitResult
	if cmd.Flags().Changed("scenario") {
		var err error
		if limits, err = t.limits(cmd); err != nil {
			return err
		}
	}
	noise, noNoise := result.NoiseFigures()
	var err error
	if t.opt.json {
		doc := &replayed{Format: 1, Plant: t.Plant.Name, Form: measures.FormName(t.design.Form), Result: result, Noise: noise, Sweep: best, Caution: measures.Caution,
			Log: replayedOf{File: r.log, Rows: v.Rows, Start: logs.Number(v.Start), End: logs.Number(v.End), Ignored: append([]string{}, v.PassedOver...)}}
		if noNoise != nil {
			doc.Noise, doc.NoNoise = nil, noNoise.Error()
		}
		for _, l := range limits {
			doc.Limits = append(doc.Limits, measures.Limit{Name: l.Name, Value: measures.Number(l.Value), Limit: measures.Number(l.Limit), Met: l.Met})
		}
		err = printJSON(cmd.OutOrStdout(), doc)
	} else {
		s := &replaySheet{task: t, options: r, survey: v, result: result, noise: noise, noNoise: noNoise, best: best, limits: limits}
		if cmd.Flags().Changed("skip") {
			s.skip = &r.skip
		}
		err = s.print(cmd.OutOrStdout())
	}
	if err != nil {
		return err
	}
	return limitsMet(limits)
}
