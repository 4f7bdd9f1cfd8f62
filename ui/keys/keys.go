// Package keys is the one list of the screen's keys. What a key does and what
// help says about it come from here, so that they cannot drift apart.
package keys

import "github.com/charmbracelet/bubbles/key"

// Map has one binding per thing that a key does. It implements help.KeyMap.
type Map struct {
	Next, Previous                          key.Binding
	Left, Right, Up, Down                   key.Binding
	FarLeft, FarRight, FarUp, FarDown       key.Binding
	Place, Pattern, Floor, Faster, Slower   key.Binding
	Undo, Redo, Better                      key.Binding
	Plane, ZoomIn, ZoomOut, Fit, Map        key.Binding
	Method, Form                            key.Binding
	NextState, PreviousState, Trace         key.Binding
	Band, Clock, Mouse                      key.Binding
	Keep, Recall, Compare, Readings         key.Binding
	Tradeoff, Sensors, Stress, Log          key.Binding
	Fastest, Quietest, OtherCurve           key.Binding
	Save, Copy, Help, Leave, Quit, Suspend  key.Binding
	ViewUp, ViewDown, ViewLeft, ViewRight   key.Binding
	PageUp, PageDown, Delete, Choose, Close key.Binding
}

func bind(shown, does string, names ...string) key.Binding {
	return key.NewBinding(key.WithKeys(names...), key.WithHelp(shown, does))
}

// Default returns the bindings. The letters O and A to D and the bracket [ are
// bound to nothing: they are what broken escape sequences leave.
func Default() Map {
	return Map{
		Next:     bind("Tab n", "hold the next pole", "tab", "n"),
		Previous: bind("Shift+Tab N", "hold the previous pole", "shift+tab", "N"),
		Left:     bind("h left", "one cell left: faster", "left", "h"),
		Right:    bind("l right", "one cell right: slower", "right", "l"),
		Up:       bind("k up", "one cell up; lifts two real poles in a cell off the axis", "up", "k"),
		Down:     bind("j down", "one cell down; a pair parts on the real axis", "down", "j"),
		FarLeft:  bind("H Shift+left", "five cells left", "shift+left", "H"),
		FarRight: bind("L Shift+right", "five cells right", "shift+right", "L"),
		FarUp:    bind("K Shift+up", "five cells up", "shift+up", "K"),
		FarDown:  bind("J Shift+down", "five cells down", "shift+down", "J"),
		Place:    bind("=", "type the place of the held pole: -6, -4+-3i, 10@0.7", "="),
		Pattern:  bind("p", "type all poles: a list, butterworth@W, bessel@W, equal@W, plant*K, controller*K, floor", "p"),
		Floor:    bind("f", "snap to the floor poles, those of the best linear estimator", "f"),
		Faster:   bind(">", "all poles 5 % faster", ">"),
		Slower:   bind("<", "all poles 5 % slower", "<"),
		Undo:     bind("u", "undo (a held key is one step)", "u"),
		Redo:     bind("U Ctrl+R", "redo", "U", "ctrl+r"),
		Better:   bind("g", "take the better gain that was found for these poles, when one is offered", "g"),
		Plane:    bind("z", "show the other plane: s or z", "z"),
		Map:      bind("M", "shade the plane by the noise that the held pole would give there, hatched where a limit breaks", "M"),
		ZoomIn:   bind("+", "zoom in", "+"),
		ZoomOut:  bind("-", "zoom out", "-"),
		Fit:      bind("0", "fit plane and traces to what there is", "0"),
		Form:     bind("c", "prediction or current form (sampled estimators)", "c"),

		Method: bind("m", "robust or least-noise gain (where several sensors leave a choice)", "m"),

		NextState:     bind(".", "traces of the next state", "."),
		PreviousState: bind(",", "traces of the previous state", ","),
		Trace:         bind("e", "traces: truth and estimate, error, innovation", "e"),
		Band:          bind("b", "traces: the predicted band of two standard deviations around the estimate", "b"),
		Mouse:         bind("P", "pointer: drag poles with the mouse; once more gives it back to the terminal", "P"),
		Clock:         bind("T", "traces: a time cursor with values; the arrows move it, Esc leaves it", "T"),

		Keep:     bind("a", "keep this design under the next letter", "a"),
		Recall:   bind("1 to 9", "recall candidate A to I", "1", "2", "3", "4", "5", "6", "7", "8", "9"),
		Compare:  bind("v", "candidates side by side", "v"),
		Readings: bind("r", "all readings, gains and warnings", "r"),

		Tradeoff: bind("t", "trade-off: noise against settle time, with the curves to walk along", "t"),
		Sensors:  bind("i", "instruments: what the sensors see, and what is lost without one", "i"),
		Stress:   bind("w", "worst case within the tolerances of the plant", "w"),
		Log:      bind("d", "data: the log of the real machine, and what it says of this design", "d"),
		Fastest:  bind("F", "seek the fastest poles within the limits; Enter takes what is found, Esc stops", "F"),
		Quietest: bind("Q", "seek the quietest poles that settle in a given time", "Q"),

		Save:    bind("s Ctrl+S", "save the session", "s", "ctrl+s"),
		Help:    bind("?", "help", "?"),
		Leave:   bind("Esc", "leave what is open", "esc"),
		Quit:    bind("q Ctrl+C", "quit; asks if something is unsaved", "q", "ctrl+c"),
		Copy:    bind("y", "copy the gain with all digits, as --use-gain takes it, to the terminal's clipboard (OSC 52)", "y"),
		Suspend: bind("Ctrl+Z", "suspend", "ctrl+z"),

		ViewUp:     bind("k up", "scroll up", "up", "k"),
		ViewDown:   bind("j down", "scroll down", "down", "j"),
		ViewLeft:   bind("h left", "the one before: candidate, sensor, point of a curve", "left", "h", "shift+tab", "N"),
		ViewRight:  bind("l right", "the one after", "right", "l", "tab", "n"),
		PageUp:     bind("b PgUp", "a page up", "pgup", "b"),
		PageDown:   bind("space PgDn", "a page down", "pgdown", " "),
		Delete:     bind("x", "delete the candidate", "x", "delete"),
		Choose:     bind("Enter", "take it: recall the candidate, take the point, unplug the sensor, run on the worst case", "enter"),
		OtherCurve: bind("Tab n", "trade-off: the other curve", "tab", "n", "shift+tab", "N"),
		Close:      bind("Esc q", "leave the view", "q"),
	}
}

// Group is a part of the help under one title.
type Group struct {
	Title    string
	Bindings []key.Binding
}

// Groups returns the bindings as help shows them.
func (m Map) Groups() []Group {
	return []Group{
		{"Hold and move", []key.Binding{m.Next, m.Previous, m.Left, m.Down, m.Up, m.Right, m.FarLeft, m.FarDown, m.FarUp, m.FarRight}},
		{"Place", []key.Binding{m.Place, m.Pattern, m.Floor, m.Faster, m.Slower, m.Fastest, m.Quietest, m.Undo, m.Redo, m.Better, m.Form, m.Method}},
		{"See", []key.Binding{m.Plane, m.ZoomIn, m.ZoomOut, m.Fit, m.Map, m.Mouse, m.NextState, m.PreviousState, m.Trace, m.Band, m.Clock, m.Readings, m.Tradeoff, m.Sensors, m.Stress, m.Log}},
		{"Candidates", []key.Binding{m.Keep, m.Recall, m.Compare}},
		{"Session", []key.Binding{m.Save, m.Copy, m.Help, m.Leave, m.Quit, m.Suspend}},
		{"In a view", []key.Binding{m.ViewUp, m.ViewDown, m.PageUp, m.PageDown, m.ViewLeft, m.ViewRight, m.OtherCurve, m.Choose, m.Delete, m.Close}},
	}
}

// ShortHelp is the hint of the status line.
func (m Map) ShortHelp() []key.Binding {
	return []key.Binding{m.Next, m.Place, m.Undo, m.Keep, m.Compare, m.Save, m.Help}
}

// FullHelp returns the groups without their titles.
func (m Map) FullHelp() [][]key.Binding {
	var out [][]key.Binding
	for _, g := range m.Groups() {
		out = append(out, g.Bindings)
	}
	return out
}
