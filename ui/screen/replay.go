package screen

import (
	"github.com/charmbracelet/bubbles/key"
	tea "github.com/charmbracelet/bubbletea"

	"polewright/estimator"
	"polewright/ui/replays"
	"polewright/ui/study"
	"polewright/ui/views"
)

// replaying is what is known of the log.
type replaying struct {
	outcome *replays.Outcome
	of      *estimator.Design // that the outcome, or why there is none, is of
	trouble string
	asked   []study.Rival // of the replay that runs
	known   []knownRival
}

// knownRival is a kept design on the log. The design in hand makes no difference
// to it.
type knownRival struct {
	design *estimator.Design
	rival  replays.Rival
}

// openReplay shows the design in hand on the log.
func (m *Model) openReplay() tea.Cmd {
	switch {
	case m.cfg.Log == nil:
		m.refuse("there is no log of the real machine: start with --log FILE.csv")
		return nil
	case m.cfg.Study == nil:
		m.refuse("the replay of a log is not available here")
		return nil
	}
	return m.openView(replayView)
}

// find is the replay of a candidate; false before it is known.
func (r *replaying) find(d *estimator.Design) (replays.Rival, bool) {
	for _, k := range r.known {
		if same(k.design, d) {
			return k.rival, true
		}
	}
	return replays.Rival{}, false
}

// unknown are the candidates that were not replayed yet.
func (m *Model) unknown() []study.Rival {
	var out []study.Rival
	for _, c := range m.candidates {
		if c.Design == nil {
			continue
		}
		if _, ok := m.research.replay.find(c.Design); !ok {
			out = append(out, study.Rival{Name: c.Letter, Design: c.Design})
		}
	}
	return out
}

// replayDue tells whether something of a replay is missing for a design.
func (m *Model) replayDue(d *estimator.Design) bool {
	return !same(m.research.replay.of, d) || len(m.unknown()) > 0
}

func (m *Model) askReplay(d *estimator.Design) {
	m.research.replay.asked = m.unknown()
	m.askStudy(study.Request{Kind: study.Replay, Design: d, Log: m.cfg.Log, Rivals: m.research.replay.asked})
}

// replayed takes a replay as far as it has come.
func (m *Model) replayed(a *study.Answer) {
	r := &m.research.replay
	switch {
	case a.Err != nil:
		r.outcome, r.of, r.trouble = nil, m.research.of, "no replay: "+a.Err.Error()
	case a.Replay != nil:
		r.outcome, r.of, r.trouble = a.Replay, m.research.of, ""
	}
	var known []knownRival
	for _, k := range r.known {
		for _, c := range m.candidates {
			if c.Design == k.design {
				known = append(known, k)
				break
			}
		}
	}
	for i, rival := range a.Rivals {
		if i < len(r.asked) {
			if _, ok := r.find(r.asked[i].Design); !ok {
				known = append(known, knownRival{r.asked[i].Design, rival})
			}
		}
	}
	r.known = known
}

// replay is what the view shows now.
func (m *Model) replay() *views.Replay {
	r := &m.research.replay
	f := &views.Replay{Log: m.cfg.Log, Outcome: r.outcome, Trouble: r.trouble,
		Running: m.research.kind == study.Replay, Older: !same(r.of, m.now.design)}
	for _, c := range m.candidates {
		if rival, ok := r.find(c.Design); ok {
			rival.Name = c.Letter
			f.Rivals = append(f.Rivals, rival)
		}
	}
	return f
}

// replayKey changes the design in hand without leaving the view: the replay
// follows.
func (m *Model) replayKey(s stroke) tea.Cmd {
	k := m.keys
	if key.Matches(s, k.Faster, k.Slower, k.Floor, k.Undo, k.Redo, k.Recall, k.Keep) {
		return m.act(string(s))
	}
	return nil
}
