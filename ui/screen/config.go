// Package screen is the root of the terminal screen: it owns the keyboard, the
// design in hand and its history, and routes what changes to the regions. It
// does no work of its own and no input or output but through its Config.
package screen

import (
	"io/fs"
	"time"

	tea "github.com/charmbracelet/bubbletea"

	"polewright/estimator"
	"polewright/ui/desk"
	"polewright/ui/keys"
	"polewright/ui/plane/targets"
	"polewright/ui/replays"
	"polewright/ui/study"
	"polewright/ui/survey"
	"polewright/ui/theme"
	"polewright/ui/traces"
)

// Config is what the screen needs from outside. Only Work.Bench and Ask are
// required.
type Config struct {
	Work desk.Work

	// Ask takes a request for the background and returns at once. Answers come
	// back as AnswerMsg.
	Ask func(desk.Request)

	// Study takes a request for what takes longer than a drag and returns at once;
	// one of kind None stops the work in progress. Answers come back as StudyMsg.
	// Without it there are no curves, worst cases and searches.
	Study func(study.Request)

	// Log is a log of the real machine in memory; nil without.
	Log *replays.Log

	// Map takes a request for a map of the plane and returns at once; one without
	// cells stops the work in progress. Answers come back as MapMsg. Without it
	// there is no map.
	Map func(survey.Request)

	// Save writes a session file. It fails with an error that is fs.ErrExist where
	// the file exists and is not what this session read or wrote; the person is then
	// asked, and replace is set once they say so. It runs outside Update.
	Save func(file string, w desk.Work, replace bool) error

	// Resolve turns a pole list or a pattern, typed in a plane ("s" or "z"), into
	// movable poles of the model's own plane. It runs inside Update: short.
	Resolve func(text, plane string, form estimator.Form) ([]complex128, error)

	// Copy hands text to the clipboard of the person's terminal; nil for none. It runs
	// outside Update.
	Copy func(text string) error

	Theme theme.Options
	// Calm sends little while poles move, for a slow link: the rest follows when
	// the hands rest.
	Calm bool
	// KeepBlanks sends blanks as such. Otherwise long runs of them are sent as
	// erasing and moving on, which takes fewer bytes and which every terminal does
	// that knows ECH and CUF of ECMA-48.
	KeepBlanks bool
	// Unsaved says that Work is in no file: it was recovered.
	Unsaved bool
	// Width and Height stand in for the terminal's until it tells; 0 means 80x24.
	Width, Height int
	// Now is the clock, for tests; nil is time.Now.
	Now func() time.Time
	// Message greets, in the status line: a journal was found, a file is new.
	Message string
}

// AnswerMsg brings an answer of the background to the screen.
type AnswerMsg struct{ desk.Answer }

// errExists is what Save says of a file that is already there.
var errExists = fs.ErrExist

// New returns the screen.
func New(cfg Config) Model {
	if cfg.Now == nil {
		cfg.Now = time.Now
	}
	w := cfg.Work
	m := Model{
		cfg: cfg, theme: theme.New(cfg.Theme), keys: keys.Default(),
		file: w.File, current: w.Current, candidates: append([]desk.Candidate(nil), w.Candidates...),
		trace: max(w.View.Trace, 0), plane: targets.S, axes: map[axisKey]traces.Axis{},
		message: cfg.Message,
	}
	if cfg.Unsaved {
		m.revision++
	}
	m.plot.unasked = cfg.Theme.ASCII && !w.View.MapOff // its marks bury the rest there
	m.plot.off = w.View.MapOff || m.plot.unasked
	m.actions = m.bindings()
	m.keys.Log.SetEnabled(cfg.Log != nil)
	if w.View.Plane == "z" && m.period() > 0 || w.View.Plane == "" && m.period() > 0 && !w.Bench.Plant.Continuous {
		m.plane = targets.Z
	}
	if set, err := targets.From(w.Poles, m.period()); err == nil {
		m.now.set = set
	}
	m.now.form, m.now.method, m.now.gain, m.now.gainCurrent = w.Form, w.Method, w.Gain, w.GainCurrent
	m.now.held = min(max(w.View.Selected, 0), max(len(m.now.set.List)-1, 0))
	if n, _, _ := w.Bench.Model.Dims(); m.trace >= n {
		m.trace = 0
	}
	for v, name := range viewNames {
		if name == w.View.Focus && (view(v) != replayView || cfg.Log != nil) {
			m.open = view(v)
		}
	}
	for mode, name := range modeNames {
		if name == w.View.Shows {
			m.mode = traces.Mode(mode)
		}
	}
	m.band = w.View.Band
	m.resize(cfg.Width, cfg.Height)
	m.half = w.View.Zoom
	m.fitPlane()
	m.refresh()
	return m
}

// startMsg makes the first request, once the loop runs.
type startMsg struct{}

// Init asks for the first design.
func (m Model) Init() tea.Cmd {
	return func() tea.Msg { return startMsg{} }
}

// Work returns what a session keeps, as it is now.
func (m Model) Work() desk.Work {
	w := m.cfg.Work
	w.File, w.Form, w.Method = m.file, m.now.form, m.now.method
	w.Poles = m.now.set.Poles()
	w.Gain, w.GainCurrent = m.now.gain, m.now.gainCurrent
	if m.now.design != nil {
		w.Gain, w.GainCurrent = m.now.design.Gain, m.now.design.GainCurrent
	}
	w.Candidates = append([]desk.Candidate(nil), m.candidates...)
	w.Current = m.current
	w.View = desk.View{Plane: string(byte(m.plane)), Zoom: m.half, Selected: m.now.held, Trace: m.trace, Focus: viewNames[m.open],
		MapOff: m.plot.off && !m.plot.unasked, Shows: modeNames[m.mode], Band: m.band}
	return w
}

// Unsaved reports whether something would be lost.
func (m Model) Unsaved() bool { return m.revision != m.saved }
