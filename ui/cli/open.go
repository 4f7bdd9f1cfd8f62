package cli

import (
	"fmt"
	"math"
	"os"
	"strings"

	"github.com/spf13/cobra"

	"polewright/estimator"
	"polewright/plants"
	"polewright/plants/library"
	"polewright/ui/desk"
	"polewright/ui/launch"
	"polewright/ui/measures"
	"polewright/ui/quiet"
	"polewright/ui/replays"
	"polewright/ui/session"
	"polewright/ui/theme"
)

// screenOptions are those of polewright without a command.
type screenOptions struct {
	scenario, form, gain, background, colours string
	period                                    float64
	ascii, calm, lines                        bool
	real                                      logOptions
	from                                      float64
}

func (o *screenOptions) register(cmd *cobra.Command) {
	f := cmd.Flags()
	f.StringVar(&o.scenario, "scenario", "", "scenario name (built-in plants) or file")
	o.real.register(cmd)
	f.Float64Var(&o.from, "from", math.Inf(-1), fmt.Sprintf("time in the log from which on it is held in memory, at most %d samples (default: its beginning)", replays.Most))
	f.StringVar(&o.form, "form", "prediction", "prediction or current (discrete estimators)")
	f.StringVar(&o.gain, "gain", "least-noise", "least-noise (at the floor poles it is the floor) or robust (best-conditioned eigenvectors); m changes it")
	f.Float64Var(&o.period, "period", 0, "sample period in seconds in place of the plant file's; 0 drops it")
	f.BoolVar(&o.ascii, "ascii", false, "draw with 7-bit characters only")
	f.BoolVar(&o.calm, "calm", false, "send little over a slow link: traces follow when the hands rest")
	f.BoolVar(&o.lines, "lines", false, "a dialogue in plain lines, for screen readers and scripts (also where TERM is dumb)")
	f.StringVar(&o.background, "background", "auto", "dark, light or auto (from COLORFGBG, else dark)")
	f.StringVar(&o.colours, "colours", "auto", "none, 16, 256, all or auto (from TERM, COLORTERM and NO_COLOR)")
	for name, words := range map[string][]string{
		"form": {"prediction", "current"}, "gain": {"least-noise", "robust"}, "background": {"auto", "dark", "light"}, "colours": {"auto", "none", "16", "256", "all"},
	} {
		cobra.CheckErr(cmd.RegisterFlagCompletionFunc(name, cobra.FixedCompletions(words, cobra.ShellCompDirectiveNoFileComp)))
	}
}

// theme decides the look from options and environment alone: no terminal is asked.
func (o *screenOptions) theme() (theme.Options, error) {
	t := theme.Options{ASCII: o.ascii || asciiLocale()}
	dark, err := word("background", o.background, map[string]bool{"auto": quiet.Dark(), "dark": true, "light": false})
	if err != nil {
		return t, err
	}
	t.Dark = dark
	t.Depth, err = word("colours", o.colours, map[string]theme.Depth{
		"auto": depth(), "none": theme.NoColour, "16": theme.Sixteen, "256": theme.Many, "all": theme.True})
	return t, err
}

func depth() theme.Depth {
	term, colour := os.Getenv("TERM"), os.Getenv("COLORTERM")
	switch {
	case os.Getenv("NO_COLOR") != "" || strings.HasPrefix(term, "vt"):
		return theme.NoColour
	case colour == "truecolor" || colour == "24bit":
		return theme.True
	case strings.Contains(term, "256"):
		return theme.Many
	}
	return theme.Sixteen
}

// asciiLocale reports a locale that says it has no UTF-8, and the Linux console,
// whose font lacks most of the marks.
func asciiLocale() bool {
	if os.Getenv("TERM") == "linux" {
		return true
	}
	for _, name := range []string{"LC_ALL", "LC_CTYPE", "LANG"} {
		if v := os.Getenv(name); v != "" {
			v = strings.ToUpper(v)
			return !strings.Contains(v, "UTF-8") && !strings.Contains(v, "UTF8")
		}
	}
	return false
}

// openScreen shows the screen on a plant, a session, or without either on the
// first built-in plant.
func openScreen(cmd *cobra.Command, o screenOptions, args []string) error {
	quiet.Restore()
	look, err := o.theme()
	if err != nil {
		return err
	}
	w, known, err := o.work(cmd, args)
	if err != nil {
		return err
	}
	if o.lines || os.Getenv("TERM") == "dumb" {
		if o.real.log != "" {
			return usageError("log", "given for the dialogue in lines", "the screen, or the command replay")
		}
		return talk(cmd, w, known)
	}
	log, err := o.readLog(cmd, w.Bench, strings.Join(args, ""))
	if err != nil {
		return err
	}
	in, out, ok := launch.IsTerminal(cmd.InOrStdin(), cmd.OutOrStdout())
	if !ok {
		return &plants.Error{Where: "terminal", Wrong: "input and output are no terminal, which the screen needs", Expected: "expected a terminal, or --lines for a dialogue in plain lines"}
	}
	left, err := launch.Run(cmd.Context(), launch.Options{Work: *w, Log: log, Known: known, Any: len(args) == 0, Program: "polewright " + Version, Theme: look, Calm: o.calm, In: in, Out: out})
	if left.Gain != nil {
		fmt.Fprintln(cmd.OutOrStdout(), "gain L, prediction form: "+measures.GainText(left.Gain))
	}
	if left.Saved != "" {
		fmt.Fprintln(cmd.OutOrStdout(), "saved in "+left.Saved)
	}
	return err
}

// readLog reads the log of the real machine where one is named.
func (o *screenOptions) readLog(cmd *cobra.Command, b *desk.Bench, arg string) (*replays.Log, error) {
	if o.real.log != "" {
		return o.real.window(cmd, b, arg, o.from)
	}
	for _, name := range []string{"map", "input-lag", "skip", "start", "resample", "from"} {
		if cmd.Flags().Changed(name) {
			return nil, usageError(name, "given without a log", "--log FILE.csv with it")
		}
	}
	return nil, nil
}

// work is what the screen starts from, and what stands for the content of the
// session file where it was read from one.
func (o *screenOptions) work(cmd *cobra.Command, args []string) (w *desk.Work, known session.Sum, err error) {
	form, err := word("form", o.form, map[string]estimator.Form{"prediction": estimator.Prediction, "current": estimator.Current})
	if err != nil {
		return nil, known, err
	}
	method, err := word("gain", o.gain, methods)
	if err != nil {
		return nil, known, err
	}
	if len(args) == 1 && session.Is(args[0]) {
		for _, name := range []string{"period", "scenario", "form", "gain"} {
			if cmd.Flags().Changed(name) {
				return nil, known, usageError(name, "given with a session", "the session's own")
			}
		}
		if w, known, err = session.LoadSum(args[0]); err != nil {
			return nil, known, fileError(args[0], "a session file", err)
		}
		return w, known, nil
	}
	name := library.Names()[0]
	if len(args) == 1 {
		name = args[0]
	}
	src, err := loadPlant(name)
	if err != nil {
		return nil, known, err
	}
	scenario := o.scenario
	if own := library.Scenarios(src.builtIn); scenario == "" && len(own) > 0 {
		scenario = scenarioWord(own[0].Name)
	}
	mo, err := periodOption(cmd, &o.period)
	if err != nil {
		return nil, known, err
	}
	b, err := src.bench(scenario, mo)
	if err != nil {
		return nil, known, err
	}
	if form == estimator.Current && !b.Model.Discrete() {
		return nil, known, usageError("form", "current for an estimator in continuous time", "prediction, or a sample period")
	}
	if len(b.Model.SensorNames) == 1 && !cmd.Flags().Changed("gain") {
		method = estimator.Robust // the gain is unique
	}
	return &desk.Work{Bench: b, Form: form, Method: method}, known, nil
}
