package screen_test

import (
	"testing"

	tea "github.com/charmbracelet/bubbletea"
)

// Sequences in pieces are keys; what is left of broken ones is nothing.
func TestEscapeSequencesInPieces(t *testing.T) {
	for name, pieces := range map[string][]tea.KeyMsg{
		"ESC, [, D":     {{Type: tea.KeyEsc}, keyMsg("["), keyMsg("D")},
		"ESC, [D":       {{Type: tea.KeyEsc}, keyMsg("[D")},
		"ESC[, D":       {{Type: tea.KeyRunes, Runes: []rune("["), Alt: true}, keyMsg("D")},
		"ESC, O, D":     {{Type: tea.KeyEsc}, keyMsg("O"), keyMsg("D")},
		"ESCO, D":       {{Type: tea.KeyRunes, Runes: []rune("O"), Alt: true}, keyMsg("D")},
		"whole":         {keyMsg("left")},
		"nothing but h": {keyMsg("h")},
	} {
		t.Run(name, func(t *testing.T) {
			r, want := start(t), start(t)
			want.press("left")
			for _, p := range pieces {
				r.send(p)
			}
			r.wantPoles(want.work().Poles...)
		})
	}
	r, want := start(t), start(t)
	want.press("H")
	for _, k := range []tea.KeyMsg{{Type: tea.KeyEsc}, keyMsg("["), keyMsg("1;"), keyMsg("2"), keyMsg("D")} {
		r.send(k)
	}
	r.wantPoles(want.work().Poles...)
}

func TestFragmentsDoNothing(t *testing.T) {
	for _, text := range []string{"[", "O", "A", "B", "C", "D", "[A", "OB", "[1;2A", "[3~", "[<0;10;12M", "]"} {
		r := start(t)
		asked := len(r.asked)
		before := r.work()
		r.send(keyMsg(text))
		if len(r.asked) != asked || len(r.work().Candidates) != len(before.Candidates) {
			t.Errorf("%q did something", text)
		}
		r.wantPoles(before.Poles...)
		r.timeout()
		r.press("h")
		if len(r.asked) != asked+1 {
			t.Errorf("a key after %q was swallowed", text)
		}
	}
}

func TestEscapeAloneLeaves(t *testing.T) {
	r := start(t)
	screen := r.m.View()
	r.press("?")
	r.wantShown("hold the next pole")
	r.press("esc")
	r.timeout()
	if r.m.View() != screen {
		t.Error("Esc did not leave help")
	}
	r.press("?", "esc")
	r.press("tab") // another key settles that it was alone
	r.wantShown("pole 2 of 2")
}
