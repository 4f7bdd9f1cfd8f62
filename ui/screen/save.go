package screen

import (
	"errors"
	"path/filepath"
	"strings"

	tea "github.com/charmbracelet/bubbletea"
)

// ending of a session file.
const ending = ".session.json"

// save writes the session, after asking for a name where it has none.
func (m *Model) save() tea.Cmd {
	if m.cfg.Save == nil {
		m.refuse("saving is not available here")
		return nil
	}
	if m.file != "" {
		return m.write(m.file, false)
	}
	return m.saveAs()
}

// saveAs asks for a name. The session keeps the one that it has until it is saved
// under another.
func (m *Model) saveAs() tea.Cmd {
	return m.openPrompt("save as:", suggestion(m.cfg.Work.Bench.Plant.Name), func(m *Model, text string) (tea.Cmd, error) {
		if text == "" {
			return nil, errors.New("a name is needed, for instance bench" + ending)
		}
		if !strings.HasSuffix(text, ".json") {
			text += ending
		}
		return m.write(text, false), nil
	})
}

// suggestion is a file name from a plant's name, which cannot lead elsewhere.
func suggestion(plant string) string {
	clean := strings.Map(func(r rune) rune {
		if r < ' ' || r == 0x7f || strings.ContainsRune(`/\:*?"<>|`, r) {
			return '_'
		}
		return r
	}, strings.TrimSpace(plant))
	clean = strings.TrimLeft(clean, ".-")
	if clean == "" {
		clean = "estimator"
	}
	return clean + ending
}

// saveOrder is a save that waits.
type saveOrder struct {
	file    string
	replace bool
}

// write saves at once, or as soon as the design in hand has its gain and no other
// save is on its way: poles never go to a file with another design's gain.
func (m *Model) write(file string, replace bool) tea.Cmd {
	if m.failure != nil {
		m.refuse("not saved, there is no design: " + m.failure.Error())
		return nil
	}
	m.saveWanted = &saveOrder{file, replace}
	return m.saveDue()
}

func (m *Model) saveDue() tea.Cmd {
	if m.saveWanted == nil || m.saving || m.now.design == nil {
		return nil
	}
	file, replace := m.saveWanted.file, m.saveWanted.replace
	m.saveWanted = nil
	m.saving = true
	m.say("saving")
	m.dirty |= statusRegion
	w, revision, save := m.Work(), m.revision, m.cfg.Save
	w.File = file
	return func() tea.Msg { return savedMsg{file, revision, save(file, w, replace)} }
}

func (m *Model) savedResult(msg savedMsg) tea.Cmd {
	m.saving = false
	m.dirty |= statusRegion | headerRegion
	quit := m.quitAfterSave
	switch {
	case errors.Is(msg.err, errExists):
		text := filepath.Base(msg.file) + " exists"
		if msg.file == m.file {
			text = filepath.Base(msg.file) + " was changed by someone else"
		}
		m.question = &question{text: text + ".  r replace   a another name   n leave", choices: map[string]func(m *Model) tea.Cmd{
			"n": stay,
			"r": func(m *Model) tea.Cmd { return m.write(msg.file, true) },
			"a": (*Model).saveAs,
		}}
		return nil
	case msg.err != nil:
		m.question = &question{text: "not saved; a another name   n leave: " + msg.err.Error(), choices: map[string]func(m *Model) tea.Cmd{
			"n": stay,
			"a": (*Model).saveAs,
		}}
		return nil
	}
	m.file, m.saved, m.quitAfterSave = msg.file, msg.revision, false
	m.say("saved " + msg.file)
	if quit && !m.Unsaved() {
		return tea.Quit
	}
	m.quitAfterSave = quit && m.saveWanted != nil
	return m.saveDue()
}

// quit leaves, after a question where something would be lost.
func (m *Model) quit() tea.Cmd {
	if !m.Unsaved() || m.question != nil && m.question.text == unsavedText {
		return tea.Quit // asked twice means yes
	}
	if m.saving && !m.quitAfterSave {
		m.quitAfterSave = true // what is on its way may be all there is
		return nil
	}
	m.prompt = nil
	m.dirty |= statusRegion
	m.question = &question{text: unsavedText, choices: map[string]func(m *Model) tea.Cmd{
		"y": func(*Model) tea.Cmd { return tea.Quit },
		"n": stay,
		"s": func(m *Model) tea.Cmd { m.quitAfterSave = true; return m.save() },
	}}
	return nil
}

const unsavedText = "quit with unsaved work?  y quit   n stay   s save and quit"
