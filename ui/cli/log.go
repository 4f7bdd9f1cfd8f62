package cli

import (
	"context"
	"errors"
	"fmt"
	"math"
	"os"
	"strconv"
	"strings"

	"github.com/spf13/cobra"

	"polewright/plants"
	"polewright/scenarios/logs"
	"polewright/ui/desk"
	"polewright/ui/replays"
)

// logOptions say which log is read, and how.
type logOptions struct {
	log, start string
	maps       []string
	inputLag   int
	skip       float64
	resample   bool
}

func (r *logOptions) register(cmd *cobra.Command) {
	f := cmd.Flags()
	f.StringVar(&r.log, "log", "", "CSV file to replay")
	f.StringArrayVar(&r.maps, "map", nil, `rename a column: "u_cmd=cable force"; "note=" leaves one out, "*=" all that the plant does not know`)
	f.IntVar(&r.inputLag, "input-lag", 0, "shift the inputs by so many rows: row k gets those of row k - N")
	f.Float64Var(&r.skip, "skip", 0, "seconds at the start that stay out of the statistics (default: a tenth of the log)")
	f.StringVar(&r.start, "start", "", `estimate before the first sample: deviations like "0.3,0", or first-sample to solve for the sensors (default zero deviation)`)
	f.BoolVar(&r.resample, "resample", false, "hold the last row on the design's period where the log has another")
}

// read turns the options into a request and names of columns.
func (r *logOptions) read(cmd *cobra.Command) (q logs.Request, names map[string]string, err error) {
	names = map[string]string{}
	for _, m := range r.maps {
		from, to, ok := strings.Cut(m, "=")
		if !ok || from == "" {
			return q, nil, usageError("map", strconv.Quote(m), `COLUMN=NAME, like "u_cmd=cable force"`)
		}
		if _, twice := names[from]; twice {
			return q, nil, usageError("map", fmt.Sprintf("%q given twice", from), "once")
		}
		names[from] = to
	}
	if cmd.Flags().Changed("skip") {
		if !(r.skip >= 0) || math.IsInf(r.skip, 0) {
			return q, nil, usageError("skip", fmt.Sprintf("%g", r.skip), "seconds, 0 or more")
		}
		q.Skip = &r.skip
	}
	switch r.start {
	case "":
		return q, names, nil
	case "first-sample":
		q.Start.FirstSample = true
		return q, names, nil
	}
	for _, field := range strings.Split(r.start, ",") {
		v, err := strconv.ParseFloat(strings.TrimSpace(field), 64)
		if err != nil {
			return q, nil, usageError("start", strconv.Quote(r.start), `deviations like "0.3,0", one per state, or first-sample`)
		}
		q.Start.State = append(q.Start.State, v)
	}
	return q, names, nil
}

func openLog(file string) (*os.File, int64, error) {
	const what = "a CSV file"
	info, err := os.Stat(file)
	if err == nil && !info.Mode().IsRegular() {
		err = errors.New("not a regular file")
	}
	if err != nil {
		return nil, 0, fileError(file, what, err)
	}
	f, err := os.Open(file)
	if err != nil {
		return nil, 0, fileError(file, what, err)
	}
	return f, info.Size(), nil
}

// failed says in one line why a log could not be replayed.
func (r *logOptions) failed(err error) error {
	var content *plants.Error
	switch {
	case errors.Is(err, context.Canceled):
		return &plants.Error{File: r.log, Where: "replay", Wrong: "interrupted", Expected: "nothing was written"}
	case errors.As(err, &content):
		if content.File == "" && content.Where == "start" {
			return usageError("start", content.Wrong, content.Expected)
		}
		return inFile(r.log, content)
	}
	return fileError(r.log, "a log that can be read to its end", err)
}

// window reads the log for the screen: as much of it as is held in memory, from the
// time `from` in s on where that is given.
func (r *logOptions) window(cmd *cobra.Command, b *desk.Bench, arg string, from float64) (*replays.Log, error) {
	q, names, err := r.read(cmd)
	if err != nil {
		return nil, err
	}
	layout, err := logs.NewLayout(b.Plant, b.Model)
	if err != nil {
		return nil, inFile(arg, err)
	}
	if err := q.Start.Check(b.Model); err != nil {
		return nil, r.failed(err)
	}
	src, size, err := openLog(r.log)
	if err != nil {
		return nil, err
	}
	defer src.Close()
	shown := newProgress(cmd.ErrOrStderr(), src, size)
	defer shown.clear()
	shown.begin("checking the log")
	log, err := logs.Open(cmd.Context(), shown, layout, logs.Options{File: r.log, Names: names, InputLag: r.inputLag, Resample: r.resample})
	if err != nil {
		return nil, r.failed(err)
	}
	shown.begin("reading the log")
	out, err := replays.Load(cmd.Context(), log, from, replays.Most)
	switch {
	case errors.Is(err, replays.ErrEmpty):
		v := log.Survey()
		return nil, usageError("from", fmt.Sprintf("%g s, but the log goes from %g to %g s", from, v.Start, v.End), "a time within it")
	case err != nil:
		return nil, r.failed(err)
	}
	out.Start, out.Skip = q.Start, q.Skip
	return out, nil
}
