package screen

import (
	"time"

	tea "github.com/charmbracelet/bubbletea"
)

// lateAfter is when figures that are older than asked for are dimmed; restAfter
// when the hands count as resting.
const (
	lateAfter = 100 * time.Millisecond
	restAfter = 700 * time.Millisecond
)

type (
	lateMsg  struct{}
	restMsg  struct{}
	savedMsg struct {
		file     string
		revision uint64
		err      error
	}
)

// Update takes one message. It alone changes the model.
func (m Model) Update(msg tea.Msg) (tea.Model, tea.Cmd) {
	var cmd tea.Cmd
	switch msg := msg.(type) {
	case tea.KeyMsg:
		m.mapKey()
		cmd = m.key(msg)
	case tea.MouseMsg:
		m.mapKey()
		cmd = m.mouse(msg)
	case escapeMsg:
		cmd = m.escapeTimeout(msg)
	case AnswerMsg:
		cmd = m.answer(&msg.Answer)
	case MapMsg:
		m.mapAnswer(&msg.Answer)
	case mapMsg:
		m.mapTick()
	case StudyMsg:
		cmd = m.studyAnswer(&msg.Answer)
	case seenMsg:
		cmd = m.seenAnswer(msg)
	case startMsg:
		cmd = m.begun()
	case lateMsg:
		cmd = m.lateTick()
	case restMsg:
		cmd = m.restTick()
	case copiedMsg:
		m.copied(msg)
	case savedMsg:
		cmd = m.savedResult(msg)
	case calmMsg:
		m.slow.ticks = false
		m.dirty |= statusRegion
	case tea.WindowSizeMsg:
		m.resize(msg.Width, msg.Height)
		m.fitPlane()
	case tea.ResumeMsg:
		m.dirty = everything
	default:
		return m, nil
	}
	due := m.mapDue()
	m.refresh()
	return m, tea.Batch(cmd, due, m.catchUp())
}

// View returns the frame that the last Update left.
func (m Model) View() string { return m.frame }

// ask sends the design in hand to the background. It never waits: a newer
// request replaces an older one there.
func (m *Model) ask() tea.Cmd {
	m.gen++
	m.failure = nil
	if m.pending.IsZero() {
		m.pending = m.cfg.Now()
	}
	m.cfg.Ask(m.request())
	return m.watch()
}

// watch starts the one tick that notices lateness.
func (m *Model) watch() tea.Cmd {
	if m.ticking {
		return nil
	}
	m.ticking = true
	return tea.Tick(lateAfter, func(time.Time) tea.Msg { return lateMsg{} })
}

func (m *Model) lateTick() tea.Cmd {
	m.ticking = false
	if m.pending.IsZero() {
		return nil
	}
	if m.cfg.Now().Sub(m.pending) < lateAfter-5*time.Millisecond {
		return m.watch()
	}
	if !m.late {
		m.late = true
		m.dirty |= readingsRegion | tracesRegion
	}
	return nil
}

// rest starts the one tick that notices resting hands.
func (m *Model) rest() tea.Cmd {
	m.lastEdit = m.cfg.Now()
	if m.resting {
		return nil
	}
	m.resting = true
	return tea.Tick(restAfter, func(time.Time) tea.Msg { return restMsg{} })
}

func (m *Model) restTick() tea.Cmd {
	m.resting = false
	if m.cfg.Now().Sub(m.lastEdit) < restAfter-20*time.Millisecond {
		m.resting = true
		return tea.Tick(restAfter-m.cfg.Now().Sub(m.lastEdit), func(time.Time) tea.Msg { return restMsg{} })
	}
	m.settleAxes()
	m.dirty |= tracesRegion
	return nil
}

func (m *Model) say(text string)    { m.message, m.trouble = text, false }
func (m *Model) refuse(text string) { m.message, m.trouble = text, true }
