package screen

import (
	"math/cmplx"
	"time"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/scenarios"
	"polewright/ui/canvas"
	"polewright/ui/desk"
	"polewright/ui/keys"
	"polewright/ui/plane"
	"polewright/ui/plane/targets"
	"polewright/ui/readings"
	"polewright/ui/theme"
	"polewright/ui/traces"
)

// state is what undo goes back to.
type state struct {
	set    targets.Set
	held   int // index into the targets, behind them the fixed poles
	form   estimator.Form
	method estimator.Method
	// gain and its current form are judged as they stand, in place of placing the
	// poles; else nil.
	gain, gainCurrent *mat.Dense
	// What was found for exactly this state, nil until it came.
	design *estimator.Design
	limits []readings.Limit
	run    *scenarios.Run
	traced bool              // all is there
	better *estimator.Design // for the same poles, on offer; nil for none
	on     string            // the real plant of the run, empty for the scenario's own
}

// runsKept bounds the states before this one that keep their run, which is the
// large part of a state: an older one is run again when it is gone back to.
const runsKept = 20

// step is a state and those behind it. Steps are shared between the models of
// before and after a key, so they are not changed but for giving up a run.
type step struct {
	state
	next *step
}

// push puts a state on top. It costs the same however many there are.
func (s *step) push(top state) *step {
	deep := &step{state: top, next: s}
	old := deep
	for i := 0; old != nil && i < runsKept; i++ {
		old = old.next
	}
	if old != nil {
		old.run, old.traced = nil, false
	}
	return deep
}

// axisKey names a trace whose axis is kept.
type axisKey struct {
	mode  traces.Mode
	index int
}

// view is what is open on top of the screen.
type view uint8

const (
	none view = iota
	helpView
	readingsView
	compareView
	tradeoffView
	sensorsView
	stressView
	replayView
)

// viewNames are the views' names in a session file.
var viewNames = [...]string{none: "", helpView: "help", readingsView: "readings", compareView: "candidates",
	tradeoffView: "trade-off", sensorsView: "sensors", stressView: "stress", replayView: "log"}

// modeNames are what the traces show, in a session file.
var modeNames = [...]string{traces.Both: "", traces.Error: "error", traces.Innovation: "innovation"}

// Model is the root model. Update works on its own copy and returns it; slices
// and maps in it are replaced, not written to, except the axes and canvases,
// which only Update touches.
type Model struct {
	cfg     Config
	theme   *theme.Theme
	keys    keys.Map
	actions map[string]action

	// the design
	now            state
	past, future   *step
	fixed          []targets.Target
	analysis       *estimator.Analysis
	controller     []complex128 // poles of the loop that are not the estimator's
	candidates     []desk.Candidate
	current        string // letter of the candidate that is in hand
	keepWanted     bool   // keep the design as soon as its figures are there
	revision       uint64 // of what a session keeps
	saved          uint64
	file           string
	lastMove       string // key of the move that a repeat of it belongs to
	lastMoved      time.Time
	repeats        int
	stopped        string // key of the move that parted a pair: held on, it goes no further
	stoppedAt      time.Time
	quitAfterSave  bool
	saving         bool
	saveWanted     *saveOrder // until the figures of the design in hand are there
	lastEdit       time.Time
	resting        bool // a rest tick is on its way
	pending        time.Time
	ticking        bool // a lateness tick is on its way
	late           bool
	gen, shownGen  uint64
	runGen         uint64
	shown          *estimator.Design
	run            *scenarios.Run
	limits         []readings.Limit
	failure        error // why the newest request has no design
	message        string
	trouble        bool // the message is a refusal
	input          escape
	prompt         *prompt
	question       *question
	open           view
	research       research
	truth          truth
	scroll, cursor int

	// the picture
	w, h     int
	lay      layout
	plane    targets.Plane
	window   plane.Window
	half     float64 // height above the axis that the user zoomed to; 0 fits
	trace    int
	mode     traces.Mode
	axes     map[axisKey]traces.Axis
	wildAxes bool // they may be those of an unstable design
	dirty    region
	canvas   [4]canvas.Canvas
	drawn    [4][]string
	frame    string
	slow     trickle
	plot     mapping
	clock    timeCursor
	pointer  pointer
	band     bool // around the estimates
}

func (m *Model) period() float64 { return m.cfg.Work.Bench.Model.Period }

// heldTarget returns what is in the hand and whether it is fixed; false where
// nothing is.
func (m *Model) heldTarget() (t targets.Target, fixed, ok bool) {
	n := len(m.now.set.List)
	switch {
	case m.now.held < n && m.now.held >= 0:
		return m.now.set.List[m.now.held], false, true
	case m.now.held >= n && m.now.held-n < len(m.fixed):
		return m.fixed[m.now.held-n], true, true
	}
	return targets.Target{}, false, false
}

func (m *Model) holdable() int { return len(m.now.set.List) + len(m.fixed) }

// heldPlace is where the held pole is in the plane shown; false where nowhere.
func (m *Model) heldPlace() (complex128, bool) {
	t, _, ok := m.heldTarget()
	if !ok {
		return 0, false
	}
	return targets.Shown(t.At, m.plane, m.period())
}

func (m *Model) facts() readings.Facts {
	f := readings.Facts{
		Bench: m.cfg.Work.Bench, Plane: m.plane, Analysis: m.analysis, Design: m.shown, Limits: m.limits,
		Cell: m.window.DX, Late: m.failure != nil || m.late && m.shownGen < m.gen,
	}
	t, fixed, ok := m.heldTarget()
	if !ok {
		return f
	}
	f.Held = readings.Held{Index: m.now.held, Of: m.holdable(), At: t.At, Pair: t.Pair, Fixed: fixed}
	for _, other := range m.now.set.List {
		if near(other.At, t.At) {
			f.Held.Here++
		}
	}
	if m.analysis != nil && m.analysis.Floor != nil {
		for _, p := range m.analysis.Floor.Poles {
			f.Held.OnFloor = f.Held.OnFloor || near(p, t.At)
		}
	}
	return f
}

// near says that two poles are the same for a person: 1e-9 of their size.
func near(a, b complex128) bool { return cmplx.Abs(a-b) <= 1e-9*(cmplx.Abs(a)+1e-9) }

// marks are all poles of the picture, those of pairs twice.
func (m *Model) marks() []plane.Mark {
	var out []plane.Mark
	add := func(own complex128, k plane.Kind) {
		at, ok := targets.Shown(own, m.plane, m.period())
		out = append(out, plane.Mark{At: at, Place: ok, Kind: k})
	}
	if m.analysis != nil {
		for _, mode := range m.analysis.Observability.Modes {
			add(mode.Eigenvalue, plane.Plant)
		}
		if m.analysis.Floor != nil {
			for _, p := range m.analysis.Floor.Poles {
				add(p, plane.Floor)
			}
		}
	}
	for _, p := range m.controller {
		add(p, plane.Controller)
	}
	pick := func(list []targets.Target, k plane.Kind, first int) {
		for i, t := range list {
			kind := k
			if first+i == m.now.held {
				kind = plane.Selected
				if k == plane.Fixed {
					kind = plane.SelectedFixed
				}
			}
			add(t.At, kind)
			if t.Pair {
				add(cmplx.Conj(t.At), kind)
			}
		}
	}
	pick(m.now.set.List, plane.Target, 0)
	pick(m.fixed, plane.Fixed, len(m.now.set.List))
	return out
}

// fitPlane chooses the window: what the user zoomed to, else all that is there.
func (m *Model) fitPlane() {
	w, h := m.lay.plane.w, m.lay.plane.h
	if m.half > 0 {
		held, _ := m.heldPlace()
		m.window = plane.WithHeight(m.half, held, m.plane, m.period(), w, h)
		return
	}
	var points []complex128
	for _, mark := range m.marks() {
		if mark.Place && !cmplx.IsInf(mark.At) && !cmplx.IsNaN(mark.At) {
			points = append(points, mark.At)
		}
	}
	m.window = plane.Fit(points, m.plane, m.period(), w, h)
}
