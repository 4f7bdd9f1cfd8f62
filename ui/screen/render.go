package screen

import (
	"fmt"
	"strings"

	"polewright/estimator"
	"polewright/ui/canvas"
	"polewright/ui/measures"
	"polewright/ui/plane"
	"polewright/ui/plane/targets"
	"polewright/ui/readings"
	"polewright/ui/theme"
	"polewright/ui/traces"
	"polewright/ui/views"
)

// region is a set of parts of the screen whose text is kept until it changes.
type region uint8

const (
	headerRegion region = 1 << iota
	planeRegion
	tracesRegion
	readingsRegion
	statusRegion
	viewRegion
	everything = headerRegion | planeRegion | tracesRegion | readingsRegion | statusRegion | viewRegion
)

// indices of the canvases and their lines
const (
	planeCanvas = iota
	tracesCanvas
	readingsCanvas
	lineCanvas
)

// refresh redraws what is dirty and puts the frame together.
func (m *Model) refresh() {
	if m.dirty == 0 && m.frame != "" {
		return
	}
	if m.lay.tooSmall {
		text := fmt.Sprintf("This terminal is %dx%d; polewright needs at least %dx%d.", m.w, m.h, leastWidth, leastHeight)
		m.frame = strings.Join(canvas.Wrap(text, m.w), "\n")
		m.dirty = 0
		return
	}
	var b strings.Builder
	b.Grow(len(m.frame) + 512)
	b.WriteString(m.header())
	b.WriteByte('\n')
	if m.open != none {
		m.viewBody(&b)
	} else {
		m.body(&b)
	}
	b.WriteString(m.status())
	frame := b.String()
	if !m.cfg.KeepBlanks {
		frame = shorten(frame)
	}
	if m.cfg.Calm {
		frame = m.calm(frame)
	}
	m.frame, m.dirty = frame, 0
}

// body draws plane, traces and readings, those that are dirty.
func (m *Model) body(b *strings.Builder) {
	l := m.lay
	if m.dirty&planeRegion != 0 {
		c := &m.canvas[planeCanvas]
		c.Reset(l.left, l.plane.y+l.plane.h)
		m.planeTitle(c)
		plane.Draw(c, 0, l.plane.y, m.window, m.marks(), m.theme)
		plane.Shade(c, 0, l.plane.y, m.window, m.plot.tones, m.theme)
		m.drawn[planeCanvas] = c.Lines(m.theme, false)
	}
	if m.dirty&tracesRegion != 0 {
		c := &m.canvas[tracesCanvas]
		c.Reset(l.left, l.traces.h)
		m.drawTraces(c)
		m.drawn[tracesCanvas] = c.Lines(m.theme, false)
	}
	if m.dirty&readingsRegion != 0 {
		c := &m.canvas[readingsCanvas]
		c.Reset(l.readings.w, l.readings.h)
		readings.Draw(c, 0, 0, c.W, c.H, m.facts(), m.theme)
		m.drawn[readingsCanvas] = c.Lines(m.theme, true)
	}
	above := len(m.drawn[planeCanvas])
	for y := range l.body {
		var left string
		if y < above {
			left = m.drawn[planeCanvas][y]
		} else {
			left = m.drawn[tracesCanvas][y-above]
		}
		join(b, left, m.drawn[readingsCanvas][y], m.theme)
		b.WriteByte('\n')
	}
}

// join writes two parts of a line with the gap between them. An ink that ends the
// first and begins the second is not left in between.
func join(b *strings.Builder, left, right string, t *theme.Theme) {
	const blanks = "   "
	plain := t.Open(theme.Text)
	if right == "" {
		b.WriteString(left)
		return
	}
	if strings.HasSuffix(left, plain) && strings.HasPrefix(right, "\x1b[") {
		left = left[:len(left)-len(plain)]
		if i := strings.LastIndex(left, "\x1b["); i >= 0 {
			ink := left[i : i+strings.IndexByte(left[i:], 'm')+1]
			right = strings.TrimPrefix(right, ink)
		}
	}
	b.WriteString(left)
	b.WriteString(blanks)
	b.WriteString(right)
}

func (m *Model) viewBody(b *strings.Builder) {
	var lines []string
	switch m.open {
	case helpView:
		lines = views.Help(m.w, m.keys, m.theme)
	case readingsView:
		lines = views.Readings(m.w, m.facts(), m.theme)
	case compareView:
		lines = views.Compare(m.w, m.cfg.Work.Bench, m.analysis, m.plane, m.columns(), m.cursor, m.theme)
	case tradeoffView:
		lines = m.tradeoff().Lines(m.w, m.lay.body, m.theme)
	case sensorsView:
		lines = m.sensors().Lines(m.w, m.theme)
	case stressView:
		lines = m.stress().Lines(m.w, m.theme)
	case replayView:
		lines = m.replay().Lines(m.w, m.lay.body, m.theme)
	}
	m.scroll = max(min(m.scroll, len(lines)-m.lay.body), 0)
	for y := range m.lay.body {
		if k := y + m.scroll; k < len(lines) {
			b.WriteString(lines[k])
		}
		b.WriteByte('\n')
	}
}

// line starts a one-line canvas.
func (m *Model) line() *canvas.Canvas {
	c := &m.canvas[lineCanvas]
	c.Reset(m.w, 1)
	return c
}

// header names the plant, what kind of estimator it is, and what is in hand.
func (m *Model) header() string {
	c, g := m.line(), &m.theme.Glyphs
	right := "unsaved"
	if !m.Unsaved() {
		right = ""
	}
	if m.current != "" {
		right = strings.TrimSpace("candidate " + m.current + "  " + right)
	}
	c.Right(m.w, 0, right, theme.Faint)
	room := m.w - canvas.TextWidth(right) - 2
	if m.truth.name != "" {
		text := canvas.CutList(strings.Split("real plant: "+m.truth.name, ", "), min(room, m.w/2), g.Ellipsis)
		c.Right(room, 0, text, theme.Title)
		room -= canvas.TextWidth(text) + 2
	}
	bench := m.cfg.Work.Bench
	x := c.Text(0, 0, canvas.Cut(bench.Plant.Name, min(room, m.w/2), g.Ellipsis), theme.Title) + 2
	kind := "continuous"
	if T := m.period(); T > 0 {
		form := "prediction form"
		if m.now.form == estimator.Current {
			form = "current form"
		}
		kind = fmt.Sprintf("every %g s%s%s", T, g.Middle, form)
	}
	if _, _, p := bench.Model.Dims(); p > 1 {
		kind += g.Middle + measures.MethodName(m.now.method) + " gain"
	}
	c.Text(x, 0, canvas.Cut(kind, room-x, g.Ellipsis), theme.Faint)
	return c.Lines(m.theme, true)[0]
}

// planeTitle names the plane and, where there is room, the marks.
func (m *Model) planeTitle(c *canvas.Canvas) {
	g := &m.theme.Glyphs
	title := "s-plane, rad/s"
	if m.plane == targets.Z {
		title = "z-plane"
	}
	x := c.Text(0, 0, title, theme.Title) + 2
	used := map[plane.Kind]bool{}
	for _, mark := range m.marks() {
		used[mark.Kind] = true
	}
	end := c.W
	for i := len(views.Marks) - 1; i >= 0; i-- {
		mark := views.Marks[i]
		if !used[mark.Kind] || mark.Kind == plane.Target && c.W < 52 {
			continue
		}
		start := end - 2 - canvas.TextWidth(mark.Short)
		if start < x {
			continue
		}
		c.Set(start, 0, plane.Glyph(mark.Kind, g), plane.Ink(mark.Kind))
		c.Text(start+2, 0, mark.Short, theme.Faint)
		end = start - 2
	}
}

func (m *Model) drawTraces(c *canvas.Canvas) {
	bench := m.cfg.Work.Bench
	panels := m.panels()
	n := max(len(panels), 1)
	width := (c.W - (n-1)*gap) / n
	for i, key := range panels {
		p := traces.Panel{Mode: key.mode, Curves: traces.Curves(m.run, key.mode, key.index), Axis: m.axes[key]}
		if p.Axis == (traces.Axis{}) {
			p.Axis = traces.Axis{Low: -1, High: 1}
		}
		if key.mode == traces.Innovation {
			p.Title, p.Unit = sensor(bench.Model.SensorNames, key.index), ""
		} else {
			p.Title, p.Unit = readings.StateName(bench, key.index), readings.StateUnit(bench, key.index)
		}
		if m.shown != nil && key.mode != traces.Innovation && key.index < len(m.shown.Noise.Std) {
			p.Band = 2 * m.shown.Noise.Std[key.index]
		}
		if m.run != nil {
			if k := len(m.run.T); k > 0 {
				p.End = m.run.T[k-1]
				p.Cursor = m.cursorTime(p.End)
			}
			if m.run.Diverged {
				p.Note = "the run diverged"
			}
		}
		p.Late = m.late && m.runGen < m.gen || m.failure != nil
		if i == 0 && bench.ScenarioFile == "" {
			p.Run = []string{"no scenario: start-up, one scale off", "start-up, one scale off", "no scenario"}
		}
		p.Around, p.Events = m.band, traces.Events(bench.Scenario)
		traces.Draw(c, i*(width+gap), 0, width, c.H, p, m.theme)
	}
}

func sensor(names []string, i int) string {
	if i < len(names) {
		return names[i]
	}
	return fmt.Sprintf("y%d", i+1)
}

// status are the last two lines: what there is to say, and the keys.
func (m *Model) status() string {
	c, g := m.line(), &m.theme.Glyphs
	switch {
	case m.prompt != nil:
		m.drawPrompt(c)
	case m.question != nil:
		c.Text(0, 0, canvas.Cut(m.question.text, m.w, g.Ellipsis), theme.Title)
	case m.message != "":
		ink := theme.Text
		if m.trouble {
			ink = theme.Trouble
		}
		c.Text(0, 0, canvas.Cut(m.message, m.w, g.Ellipsis), ink)
	case m.searching() != "":
		c.Text(0, 0, canvas.Cut(m.searching(), m.w, g.Ellipsis), theme.Text)
	}
	m.mapLine(c)
	first := c.Lines(m.theme, true)[0]
	c = m.line()
	if m.prompt != nil && m.message != "" { // why what was typed is refused
		c.Text(0, 0, canvas.Cut(m.message, m.w, g.Ellipsis), theme.Trouble)
	} else {
		m.hints(c)
	}
	return first + "\n" + c.Lines(m.theme, true)[0]
}

func (m *Model) drawPrompt(c *canvas.Canvas) {
	label, text, cursor := m.prompt.shown(m.w)
	x := c.Text(0, 0, label, theme.Title)
	ink := theme.Text
	if m.prompt.offered {
		ink = theme.Faint
	}
	c.Text(x, 0, text, ink)
	if r := c.At(cursor, 0); r == ' ' {
		c.Set(cursor, 0, m.theme.Glyphs.Cursor, theme.Hold)
	} else {
		c.Set(cursor, 0, r, theme.Hold)
	}
}

// hints are the keys that serve now, as many as fit.
func (m *Model) hints(c *canvas.Canvas) {
	type hint struct{ key, does string }
	list := []hint{{"Tab", "next"}, {m.theme.Glyphs.Arrows, "move"}, {"=", "place"}, {"u", "undo"}, {"?", "help"}, {"a", "keep"}, {"v", "compare"}, {"s", "save"}, {"z", "plane"}, {"f", "floor"}, {"p", "patterns"}, {"< >", "speed"}, {"r", "readings"}, {"t", "trade-off"}, {"i", "sensors"}, {"w", "worst case"}, {"F Q", "search"}}
	switch {
	case m.research.offer != nil:
		list = append([]hint{{"Enter", "takes it"}, {"Esc", "leaves it"}}, list...)
	case m.research.hunt != nil:
		list = append([]hint{{"Esc", "stops the search"}}, list...)
	}
	switch {
	case m.prompt != nil:
		list = []hint{{"Enter", "takes it"}, {"Esc", "leaves it"}}
	case m.question != nil:
		list = []hint{{"Esc", "leaves things as they are"}}
	case m.open == none && m.clock.on:
		list = append([]hint{{"h l", "move the time"}, {"H L", "far"}, {"Esc", "leaves the traces"}}, list[2:]...)
	case m.open == compareView:
		list = []hint{{"h l", "choose"}, {"Enter", "recall"}, {"x", "delete"}, {"j k", "scroll"}, {"Esc", "leave"}}
	case m.open == tradeoffView:
		list = []hint{{"h l", "walk"}, {"H L", "far"}, {"Tab", "other curve"}, {"Enter", "take this point"}, {"Esc", "leave"}}
	case m.open == sensorsView:
		list = []hint{{"h l", "choose"}, {"Enter", "unplug or plug in"}, {"j k", "scroll"}, {"Esc", "leave"}}
	case m.open == stressView:
		list = []hint{{"Enter", "run on the hardest case, or back"}, {"j k", "scroll"}, {"Esc", "leave"}}
	case m.open == replayView:
		list = []hint{{"< >", "speed"}, {"u", "undo"}, {"1 to 9", "recall"}, {"a", "keep"}, {"j k", "scroll"}, {"space b", "page"}, {"Esc", "leave"}}
	case m.open != none:
		list = []hint{{"j k", "scroll"}, {"space b", "page"}, {"Esc", "leave"}}
	}
	x := 0
	for _, h := range list {
		if x+canvas.TextWidth(h.key)+1+len(h.does) > m.w {
			break
		}
		x = c.Text(x, 0, h.key, theme.Text) + 1
		x = c.Text(x, 0, h.does, theme.Faint) + 2
	}
}
