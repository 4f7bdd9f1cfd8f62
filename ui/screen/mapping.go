package screen

import (
	"fmt"
	"math"
	"slices"
	"time"

	tea "github.com/charmbracelet/bubbletea"

	"polewright/estimator"
	"polewright/ui/canvas"
	"polewright/ui/plane"
	"polewright/ui/plane/targets"
	"polewright/ui/readings"
	"polewright/ui/survey"
	"polewright/ui/theme"
)

// MapMsg brings a map of the plane, as far as it is known, to the screen.
type MapMsg struct{ survey.Answer }

// mapAfter is how long no key must have come before a map is asked for: a held
// key repeats sooner.
const mapAfter = 60 * time.Millisecond

type mapMsg struct{}

// ground is all that a map depends on. Where the held pole is on its lattice of
// cells matters little: such a map is shown until a better one is there.
type ground struct {
	others []complex128
	pair   bool
	form   estimator.Form
	method estimator.Method
	window plane.Window
}

func (a *ground) same(b *ground) bool {
	return a.pair == b.pair && a.form == b.form && a.method == b.method && a.window == b.window && slices.Equal(a.others, b.others)
}

// mapping is the map of the plane and its making.
type mapping struct {
	off     bool
	unasked bool // off for the look of the screen: a session does not keep that
	gen     uint64
	ground  ground            // of the newest request
	cells   []complex128      // of the newest request, own plane
	place   complex128        // of the held pole when it was made
	from    *estimator.Design // whose branch it follows
	shown   *survey.Answer    // nil while none fits what is in hand
	running bool              // asked for and not done
	ticking bool
	lastKey time.Time
	tones   []plane.Tone
}

// ground is what a map of the pole in the hand would stand on; false where there is
// none to make.
func (m *Model) ground() (ground, bool) {
	t, fixed, ok := m.heldTarget()
	if !ok || fixed || m.plot.off || m.cfg.Map == nil || m.lay.tooSmall {
		return ground{}, false
	}
	if _, ok := m.heldPlace(); !ok {
		return ground{}, false
	}
	g := ground{pair: t.Pair, form: m.now.form, method: m.now.method, window: m.window}
	rest := targets.Set{Period: m.period(), List: slices.Delete(slices.Clone(m.now.set.List), m.now.held, m.now.held+1)}
	g.others = rest.Poles()
	return g, true
}

// mapKey notes a key: the work in progress makes room for what the key asks.
func (m *Model) mapKey() {
	m.plot.lastKey = m.cfg.Now()
	if m.plot.running {
		m.plot.running = false
		m.cfg.Map(survey.Request{})
	}
}

// mapDue drops a map that no longer fits and lets the next one be asked for.
func (m *Model) mapDue() tea.Cmd {
	g, ok := m.ground()
	p := &m.plot
	if (p.shown != nil || p.tones != nil) && (!ok || !g.same(&p.ground)) {
		p.shown, p.tones = nil, nil
		m.dirty |= planeRegion | statusRegion
	}
	if !ok || p.ticking || p.running || m.mapped(&g) {
		return nil
	}
	p.ticking = true
	return tea.Tick(mapAfter, func(time.Time) tea.Msg { return mapMsg{} })
}

// mapped tells whether the map that is shown is whole and right.
func (m *Model) mapped(g *ground) bool {
	p := &m.plot
	return p.shown != nil && p.shown.Done && g.same(&p.ground) && m.onLattice() && m.keepsPromise()
}

// mapTick asks for a map once the hands rest and the design in hand is known.
func (m *Model) mapTick() {
	p := &m.plot
	p.ticking = false
	g, ok := m.ground()
	if !ok || p.running || m.mapped(&g) || m.cfg.Now().Sub(p.lastKey) < mapAfter-5*time.Millisecond || m.shownGen < m.gen && m.failure == nil {
		return // the Update around this sees whether to wait again
	}
	t, _, _ := m.heldTarget()
	at, _ := m.heldPlace()
	cells, w, h := m.window.Lattice(at, t.Pair)
	for i, c := range cells {
		if own, ok := m.now.set.Own(c, m.plane); ok {
			cells[i] = own
		} else {
			cells[i] = complex(math.NaN(), math.NaN())
		}
	}
	r := survey.Request{Form: g.form, Method: g.method, Others: g.others, Pair: g.pair, Width: w, Height: h, Cells: cells}
	if m.shown != nil && m.shown.Stable && m.shown.Form == g.form && m.shown.Method == g.method {
		r.From = m.shown
	}
	if p.shown != nil && g.same(&p.ground) && m.onLattice() && m.keepsPromise() {
		r.Known, r.From = p.shown.Spots, p.from // goes on
	}
	p.gen++
	r.Gen = p.gen
	p.ground, p.cells, p.place, p.from, p.running = g, cells, t.At, r.From, true
	m.cfg.Map(r)
}

// onLattice tells whether the cells of the map are those that the held pole moves
// over.
func (m *Model) onLattice() bool {
	p := &m.plot
	t, _, _ := m.heldTarget()
	at, _ := m.heldPlace()
	i, ok := m.heldCell()
	if len(p.cells) > 0 && t.At == p.place {
		return true
	}
	if !ok || i >= len(p.cells) {
		return len(p.cells) > 0 // out of sight
	}
	there, ok := targets.Shown(p.cells[i], m.plane, m.period())
	return ok && math.Abs(real(there)-real(at)) <= 1e-6*m.window.DX &&
		(!t.Pair || math.Abs(imag(there)-imag(at)) <= 1e-6*m.window.DY)
}

// keepsPromise tells whether landing gave what the map says. With several sensors
// the gain depends on the way there as well, or another one was taken; then the
// map is made anew from the design in hand, once.
func (m *Model) keepsPromise() bool {
	p := &m.plot
	t, _, _ := m.heldTarget()
	i, ok := m.heldCell()
	if !ok || t.At == p.place && p.from == m.shown || m.shown == nil || m.shownGen < m.gen || i >= len(p.shown.Spots) || !p.shown.Spots[i].Known {
		return true
	}
	said, is := p.shown.Spots[i].OverFloor, m.shown.Noise.OverFloorRMS
	return math.Abs(said-is) <= 0.002*is || math.IsNaN(said) && !(m.shown.Stable && is > 0)
}

// heldCell is the index of the held pole's cell in the map.
func (m *Model) heldCell() (int, bool) {
	at, ok := m.heldPlace()
	t, _, held := m.heldTarget()
	if !ok || !held || !m.window.Inside(at) {
		return 0, false
	}
	row := 0
	if t.Pair {
		row = m.window.Row(imag(at))
	}
	return row*m.window.W + m.window.Column(real(at)), row >= 0
}

// mapAnswer takes a map of what is in hand.
func (m *Model) mapAnswer(a *survey.Answer) {
	p := &m.plot
	g, ok := m.ground()
	if a.Gen != p.gen || !ok || !g.same(&p.ground) || a.Err == nil && len(a.Spots) != len(p.cells) {
		return
	}
	p.running = p.running && !a.Done && a.Err == nil
	if a.Err != nil {
		p.shown, p.tones = &survey.Answer{Done: true, Err: a.Err}, nil
		m.dirty |= planeRegion | statusRegion
		return
	}
	p.shown = a
	tones := make([]plane.Tone, len(a.Spots))
	for i, s := range a.Spots {
		if !s.Known && unstable(p.cells[i], m.period()) {
			continue // lent from the other side of the border
		}
		if s.Seen && (!math.IsNaN(s.OverFloor) || s.Broken >= 0) {
			tones[i] = plane.Tone{Level: plane.Level(s.OverFloor), Hatched: s.Broken >= 0}
		}
	}
	p.tones = tones
	m.dirty |= planeRegion | statusRegion
}

// toggleMap shows or hides the map.
func (m *Model) toggleMap() tea.Cmd {
	m.plot.off, m.plot.unasked = !m.plot.off, false
	m.plot.shown, m.plot.tones = nil, nil
	text := "the plane is shaded: noise over the floor if the held pole went there"
	if m.plot.off {
		text = "the plane is not shaded"
	}
	m.say(text)
	m.dirty |= planeRegion
	return nil
}

// promise says what the map says of the held pole's cell.
func (m *Model) promise() string {
	p := &m.plot
	i, ok := m.heldCell()
	if p.shown == nil || !ok || i >= len(p.shown.Spots) {
		return ""
	}
	s := p.shown.Spots[i]
	switch {
	case !s.Known:
		return ""
	case math.IsNaN(s.OverFloor) && s.Broken < 0:
		return "here: no stable estimator, or no floor"
	}
	text := fmt.Sprintf("here: noise %s x floor", readings.Fixed(s.OverFloor, 2, &m.theme.Glyphs))
	if math.IsNaN(s.OverFloor) {
		text = "here: no floor"
	}
	if s.Broken >= 0 && s.Broken < len(p.shown.Limits) {
		return text + "; limit broken: " + readings.LimitWords(p.shown.Limits[s.Broken])
	}
	return text
}

// mapLine shows the promise and, where there is room, the legend.
func (m *Model) mapLine(c *canvas.Canvas) {
	if m.plot.tones == nil || m.open != none || m.message == "" && m.searching() != "" {
		return
	}
	x := 0
	if m.message == "" && m.prompt == nil && m.question == nil {
		x = c.Text(0, 0, m.promise(), theme.Faint)
	} else {
		x = canvas.TextWidth(m.message)
	}
	if m.prompt == nil && m.question == nil {
		plane.Legend(c, m.w, 0, m.w-x-2, m.theme)
	}
}
