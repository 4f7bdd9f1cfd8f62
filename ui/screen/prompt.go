package screen

import (
	"strings"
	"unicode"

	tea "github.com/charmbracelet/bubbletea"

	"polewright/ui/canvas"
)

// prompt is one line of typing in the status line. What is typed is kept while
// it is refused.
type prompt struct {
	label  string
	text   []rune
	cursor int
	// offered says that the text was suggested and not touched: typing replaces it,
	// any key that edits takes it on.
	offered bool
	// done takes what was typed; an error keeps the prompt open and is shown.
	done func(m *Model, text string) (tea.Cmd, error)
}

const longestInput = 2000

// insert puts text at the cursor, without control characters, or in place of what
// was suggested.
func (p *prompt) insert(s string) {
	var add []rune
	for _, r := range s {
		if unicode.IsPrint(r) && canvas.Width(r) > 0 {
			add = append(add, r)
		}
	}
	if p.offered && len(add) > 0 {
		p.text, p.cursor, p.offered = nil, 0, false
	}
	if len(p.text)+len(add) > longestInput {
		return
	}
	text := append([]rune(nil), p.text[:p.cursor]...)
	text = append(text, add...)
	p.text = append(text, p.text[p.cursor:]...)
	p.cursor += len(add)
}

// edit takes a key that edits; false where it is none.
func (p *prompt) edit(name string) bool {
	switch name {
	case "backspace", "ctrl+h":
		if p.cursor > 0 {
			p.text = append(append([]rune(nil), p.text[:p.cursor-1]...), p.text[p.cursor:]...)
			p.cursor--
		}
	case "delete":
		if p.cursor < len(p.text) {
			p.text = append(append([]rune(nil), p.text[:p.cursor]...), p.text[p.cursor+1:]...)
		}
	case "left":
		p.cursor = max(p.cursor-1, 0)
	case "right":
		p.cursor = min(p.cursor+1, len(p.text))
	case "home", "ctrl+a":
		p.cursor = 0
	case "end", "ctrl+e":
		p.cursor = len(p.text)
	case "ctrl+u":
		p.text, p.cursor = p.text[p.cursor:], 0
	case "ctrl+w":
		head := strings.TrimRight(string(p.text[:p.cursor]), " ")
		cut := len([]rune(head[:strings.LastIndexByte(head, ' ')+1]))
		p.text = append(append([]rune(nil), p.text[:cut]...), p.text[p.cursor:]...)
		p.cursor = cut
	default:
		return false
	}
	p.offered = false
	return true
}

// shown returns the label and as much of the text around the cursor as fits, and
// the cursor's column.
func (p *prompt) shown(w int) (label, text string, cursor int) {
	label = canvas.Cut(p.label, w/2, '~') + " "
	room := max(w-canvas.TextWidth(label)-2, 1)
	from := 0
	for canvas.TextWidth(string(p.text[from:p.cursor])) > room {
		from++
	}
	to := from
	for to < len(p.text) && canvas.TextWidth(string(p.text[from:to+1])) <= room {
		to++
	}
	return label, string(p.text[from:to]), canvas.TextWidth(label) + canvas.TextWidth(string(p.text[from:p.cursor]))
}

func (m *Model) openPrompt(label, text string, done func(m *Model, text string) (tea.Cmd, error)) tea.Cmd {
	m.prompt = &prompt{label: label, text: []rune(text), cursor: len([]rune(text)), offered: text != "", done: done}
	m.dirty |= statusRegion
	return nil
}

// promptKey gives a key to the prompt.
func (m *Model) promptKey(name string, text rune) tea.Cmd {
	m.dirty |= statusRegion
	m.say("")
	p := *m.prompt
	switch {
	case name == "esc":
		m.prompt = nil
		m.quitAfterSave = false
		m.say("")
		return nil
	case name == "enter":
		m.say("")
		cmd, err := p.done(m, strings.TrimSpace(string(p.text)))
		if err != nil {
			m.refuse(err.Error())
			return nil
		}
		if m.prompt != nil && m.prompt.label == p.label {
			m.prompt = nil
		}
		return cmd
	case p.edit(name):
	case text != 0:
		p.insert(string(text))
	}
	m.prompt = &p
	return nil
}

// question is a choice of one key in the status line.
type question struct {
	text    string
	choices map[string]func(m *Model) tea.Cmd // by key; Esc always leaves things as they are
}

func (m *Model) answerQuestion(name string) tea.Cmd {
	m.dirty |= statusRegion
	if name == "esc" {
		m.question, m.quitAfterSave = nil, false
		m.say("")
		return nil
	}
	do, ok := m.question.choices[name]
	if !ok {
		return nil
	}
	m.question = nil
	m.say("")
	return do(m)
}

// stay is the choice that changes nothing.
func stay(m *Model) tea.Cmd {
	m.quitAfterSave = false
	return nil
}
