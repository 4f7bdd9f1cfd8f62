package screen_test

import (
	"math"
	"math/cmplx"
	"testing"
	"time"

	tea "github.com/charmbracelet/bubbletea"
	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/plants"
	"polewright/scenarios"
	"polewright/ui/desk"
	"polewright/ui/screen"
	"polewright/ui/theme"
)

// hoist is an invented plant with a light load, sampled every 10 ms.
const hoist = `
format = 1
name = "Test hoist"
[model]
time = "continuous"
period_s = 0.01
A = [[0, 1, 0], [-9, -0.6, 1], [0, 0, -4]]
B = [[0], [0], [4]]
C = [[1, 0, 0]]
G = [[0], [1], [0]]
[[states]]
name = "height"
unit = "m"
[[states]]
name = "climb speed"
unit = "m/s"
[[states]]
name = "cable force"
unit = "N"
[[inputs]]
name = "winch"
unit = "N"
[[sensors]]
name = "encoder"
unit = "m"
noise_std = 0.001
[process_noise]
density = [0.01]
[feedback]
K = [[1, 2, 0]]
`

func bench(t testing.TB, text string) *desk.Bench {
	t.Helper()
	p, err := plants.Parse("hoist.toml", []byte(text))
	if err != nil {
		t.Fatal(err)
	}
	model, err := p.Model(plants.Options{})
	if err != nil {
		t.Fatal(err)
	}
	return &desk.Bench{Plant: p, PlantFile: "hoist.toml", PlantText: []byte(text), Model: model, Scenario: scenarios.Default(p)}
}

// rig is a screen with a fake background, a clock and a file store.
type rig struct {
	patience time.Duration // how long run waits for a command; 0 is 20 ms
	t        testing.TB
	m        tea.Model
	asked    []desk.Request
	clock    time.Time
	saved    map[string]desk.Work
	exist    map[string]bool
	own      string // file of the session; someone else changes it where this is emptied
	broken   error  // why nothing can be saved
	quit     bool
	cmds     []tea.Cmd // not yet run
	T        float64
}

type option func(*screen.Config)

func newRig(t testing.TB, poles []complex128, opts ...option) *rig {
	r := &rig{t: t, clock: time.Unix(1000, 0), saved: map[string]desk.Work{}, exist: map[string]bool{}}
	b := bench(t, hoist)
	r.T = b.Model.Period
	cfg := screen.Config{
		Work: desk.Work{Bench: b, Poles: poles},
		Ask:  func(q desk.Request) { r.asked = append(r.asked, q) },
		Save: func(file string, w desk.Work, replace bool) error {
			if r.broken != nil {
				return r.broken
			}
			if r.exist[file] && !replace && file != r.own {
				return errExist
			}
			r.saved[file], r.exist[file], r.own = w, true, file
			return nil
		},
		Resolve: func(text, plane string, form estimator.Form) ([]complex128, error) {
			if text != "slow" {
				return nil, errTest
			}
			return []complex128{0.9, 0.92, 0.94}, nil
		},
		KeepBlanks: true,
		Now:        func() time.Time { return r.clock },
	}
	for _, o := range opts {
		o(&cfg)
	}
	r.m = screen.New(cfg)
	r.send(r.m.Init()())
	return r
}

// z is a pole of the s-plane under the rig's period.
func z(s complex128) complex128 { return cmplx.Exp(s * 0.01) }

// start are a pair and a real pole, and the rig after the first answer.
func start(t testing.TB, opts ...option) *rig {
	r := newRig(t, []complex128{z(-8 + 6i), z(-8 - 6i), z(-12)}, opts...)
	r.reply(desk.Traced)
	return r
}

func (r *rig) send(msg tea.Msg) {
	var cmd tea.Cmd
	r.m, cmd = r.m.Update(msg)
	if cmd != nil {
		r.cmds = append(r.cmds, cmd)
	}
}

// press sends keys; a word of more than one letter is the key of that name, or
// else typed.
func (r *rig) press(keys ...string) {
	for _, k := range keys {
		r.clock = r.clock.Add(time.Second)
		r.send(keyMsg(k))
	}
}

// hold sends the same key as fast as a keyboard repeats it.
func (r *rig) hold(k string, n int) {
	for range n {
		r.clock = r.clock.Add(30 * time.Millisecond)
		r.send(keyMsg(k))
	}
}

func keyMsg(k string) tea.KeyMsg {
	named := map[string]tea.KeyType{"tab": tea.KeyTab, "shift+tab": tea.KeyShiftTab, "left": tea.KeyLeft, "right": tea.KeyRight,
		"up": tea.KeyUp, "down": tea.KeyDown, "shift+left": tea.KeyShiftLeft, "enter": tea.KeyEnter, "esc": tea.KeyEsc,
		"backspace": tea.KeyBackspace, "home": tea.KeyHome, "ctrl+r": tea.KeyCtrlR, "ctrl+s": tea.KeyCtrlS, "ctrl+c": tea.KeyCtrlC, "ctrl+z": tea.KeyCtrlZ}
	if t, ok := named[k]; ok {
		return tea.KeyMsg{Type: t}
	}
	return tea.KeyMsg{Type: tea.KeyRunes, Runes: []rune(k)}
}

// run runs the commands that are waiting and those that follow from them, but
// for those that wait for time.
func (r *rig) run() {
	for round := 0; len(r.cmds) > 0 && round < 3; round++ {
		list := r.cmds
		r.cmds = nil
		for _, c := range list {
			done := make(chan tea.Msg, 1)
			go func() { done <- c() }()
			select {
			case msg := <-done:
				r.took(msg)
			case <-time.After(max(r.patience, 20*time.Millisecond)):
			}
		}
	}
}

func (r *rig) took(msg tea.Msg) {
	switch msg := msg.(type) {
	case nil:
	case tea.QuitMsg:
		r.quit = true
	case tea.BatchMsg:
		for _, c := range msg {
			if c != nil {
				r.cmds = append(r.cmds, c)
			}
		}
	default:
		r.send(msg)
	}
}

func (r *rig) last() desk.Request { return r.asked[len(r.asked)-1] }

// reply answers the newest request.
func (r *rig) reply(stage desk.Stage) { r.send(screen.AnswerMsg{Answer: answer(r.last(), stage)}) }

func (r *rig) work() desk.Work { return r.m.(screen.Model).Work() }

var analysis = &estimator.Analysis{
	Observability: estimator.Observability{Rank: 3, Modes: []estimator.Mode{
		{Eigenvalue: z(-0.3 + 2.985i), Observable: true}, {Eigenvalue: z(-0.3 - 2.985i), Observable: true}, {Eigenvalue: z(-4), Observable: true}}},
	Floor: &estimator.Floor{Std: []float64{0.0005, 0.01, 0.2}, Poles: []complex128{z(-7 + 5i), z(-7 - 5i), z(-4)},
		Gain: mat.NewDense(3, 1, []float64{0.2, 1.1, 0.01})},
}

// answer makes up figures that follow the first pole: the faster, the noisier.
func answer(q desk.Request, stage desk.Stage) desk.Answer {
	speed := 10.0
	if len(q.Poles) > 0 {
		speed = -math.Log(cmplx.Abs(q.Poles[0])) / 0.01
	}
	noise := math.Sqrt(1 + speed/20)
	d := &estimator.Design{
		Form: q.Form, Method: q.Method, Wanted: q.Poles, Reached: q.Poles,
		Gain: mat.NewDense(3, 1, []float64{0.1 * speed, speed, 0.3}), GainNorm: 1.1 * speed, EigenvectorCondition: 12.5, Stable: true,
		Noise:     estimator.Noise{Std: []float64{0.0005 * noise, 0.01 * noise, 0.2}, OverFloor: []float64{noise, noise, 1}, OverFloorRMS: noise},
		Transient: estimator.Transient{Settle: 4 / speed, Peak: 1 + speed/10},
		Loop: &estimator.Loop{Stable: true, Poles: []complex128{z(-3 + 3i), z(-3 - 3i), z(-5)}, GainMarginBelow: math.Inf(-1), GainMarginAbove: 11.2,
			PhaseMargin: 48.1, DelayMargin: 0.0312, DelayMarginSamples: 3, SensitivityPeak: 1.62, InputStd: []float64{0.4}},
		Warnings: []string{"the slowest pole of the estimator is slower than the controller's"},
	}
	if q.Poles == nil {
		d.Wanted, d.Reached = nil, analysis.Floor.Poles
	}
	d.Loop.Poles = append(d.Loop.Poles, d.Reached...)
	a := desk.Answer{Gen: q.Gen, Stage: stage, Analysis: analysis, Movable: 3, Design: d,
		Limits: []scenarios.LimitResult{{Name: "settle_s", Value: d.Transient.Settle, Limit: 0.6, Met: d.Transient.Settle <= 0.6}}}
	if stage == desk.Traced {
		a.Limits = append(a.Limits, scenarios.LimitResult{Name: "error height", Value: 0.004, Limit: 0.01, Met: true})
		a.Run = fakeRun(speed)
	}
	return a
}

func fakeRun(speed float64) *scenarios.Run {
	run := &scenarios.Run{True: make([][]float64, 3), Estimate: make([][]float64, 3), Innovations: make([][]float64, 1)}
	for k := range 201 {
		t := 0.01 * float64(k)
		run.T = append(run.T, t)
		truth := math.Cos(3*t) * math.Exp(-0.3*t)
		for i := range 3 {
			run.True[i] = append(run.True[i], truth)
			run.Estimate[i] = append(run.Estimate[i], truth*(1-math.Exp(-speed*t)))
		}
		run.Innovations[0] = append(run.Innovations[0], math.Exp(-speed*t)*truth)
	}
	return run
}

func plain(o *screen.Config)  { o.Theme = theme.Options{} }
func colour(o *screen.Config) { o.Theme = theme.Options{Depth: theme.True, Dark: true} }
func seven(o *screen.Config)  { o.Theme = theme.Options{ASCII: true} }
