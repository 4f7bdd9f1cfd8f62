package screen

import (
	"strings"
	"time"

	tea "github.com/charmbracelet/bubbletea"
)

// gather is how long the pieces of an escape sequence may be apart.
const gather = 50 * time.Millisecond

// escape puts together escape sequences that a slow link delivers in pieces.
type escape struct {
	id      uint64 // of the newest piece
	stage   escapeStage
	lost    bool // its ESC is lost: what it means is not known
	pending string
}

type escapeStage uint8

const (
	atRest    escapeStage = iota
	afterEsc              // ESC
	inControl             // ESC [ and parameters
	inSingle              // ESC O
)

type escapeMsg struct{ id uint64 }

// key takes what the terminal sent. One message may hold several letters, which
// are several keys; a paste is text for a prompt and nothing else.
func (m *Model) key(msg tea.KeyMsg) tea.Cmd {
	if msg.Paste {
		if m.prompt != nil {
			m.prompt.insert(string(msg.Runes))
			m.dirty |= statusRegion
		}
		return nil
	}
	var cmds []tea.Cmd
	if msg.Alt { // ESC and a key in one read
		cmds = append(cmds, m.begin(afterEsc))
	}
	switch msg.Type {
	case tea.KeyRunes, tea.KeySpace:
		for _, r := range msg.Runes {
			cmds = append(cmds, m.letter(r))
		}
	case tea.KeyEsc:
		cmds = append(cmds, m.flush(), m.begin(afterEsc))
	default:
		name := tea.KeyMsg{Type: msg.Type}.String()
		cmds = append(cmds, m.flush(), m.press(name, 0))
	}
	return tea.Batch(cmds...)
}

// begin starts or goes on with a sequence and lets it time out.
func (m *Model) begin(stage escapeStage) tea.Cmd {
	m.input.stage = stage
	m.input.id++
	id := m.input.id
	return tea.Tick(gather, func(time.Time) tea.Msg { return escapeMsg{id} })
}

// flush ends a sequence that is not going on: a lone ESC is a key, a fragment is
// nothing.
func (m *Model) flush() tea.Cmd {
	was := m.input.stage
	m.input = escape{id: m.input.id}
	if was == afterEsc {
		return m.press("esc", 0)
	}
	return nil
}

func (m *Model) escapeTimeout(msg escapeMsg) tea.Cmd {
	if msg.id != m.input.id {
		return nil
	}
	return m.flush()
}

// letter takes one character: text, a key, or part of a sequence.
func (m *Model) letter(r rune) tea.Cmd {
	switch m.input.stage {
	case afterEsc:
		switch r {
		case '[':
			return m.begin(inControl)
		case 'O':
			return m.begin(inSingle)
		}
		return tea.Batch(m.flush(), m.letter(r))
	case inControl:
		if r >= '0' && r <= '9' || r == ';' || r == '<' { // < begins what a mouse does
			m.input.pending += string(r)
			return m.begin(inControl)
		}
		return m.sequence(controls[m.input.pending+string(r)])
	case inSingle:
		if strings.ContainsRune("ABCDHFPQRS", r) {
			return m.sequence(controls[string(r)])
		}
		m.input = escape{id: m.input.id}
		return m.letter(r)
	}
	if m.prompt == nil && (r == '[' || r == 'O') { // what comes may be the rest of a sequence
		m.input.lost = true
		if r == 'O' {
			return m.begin(inSingle)
		}
		return m.begin(inControl)
	}
	return m.press(string(r), r)
}

// sequence acts on a whole sequence; without its ESC, or unknown, it is nothing.
func (m *Model) sequence(name string) tea.Cmd {
	lost := m.input.lost
	m.input = escape{id: m.input.id}
	if lost || name == "" {
		return nil
	}
	return m.press(name, 0)
}

// controls are the sequences that are keys here, behind ESC [ or ESC O.
var controls = map[string]string{
	"A": "up", "B": "down", "C": "right", "D": "left", "H": "home", "F": "end", "Z": "shift+tab",
	"1;2A": "shift+up", "1;2B": "shift+down", "1;2C": "shift+right", "1;2D": "shift+left",
}

// press routes one key to who owns the keyboard.
func (m *Model) press(name string, text rune) tea.Cmd {
	switch {
	case name == "ctrl+c":
		return m.quit()
	case name == "ctrl+z":
		return tea.Suspend
	case m.question != nil:
		return m.answerQuestion(name)
	case m.prompt != nil:
		return m.promptKey(name, text)
	case m.open != none:
		return m.viewKey(name)
	}
	if m.clock.on && m.cursorKey(name) {
		return nil
	}
	return m.act(name)
}

// act does what a key does on the screen itself.
func (m *Model) act(name string) tea.Cmd {
	act, ok := m.actions[name]
	if !ok {
		return nil
	}
	m.say("")
	m.dirty |= statusRegion
	if !act.move {
		m.lastMove = ""
	}
	return act.do(m, name)
}
