package cli_test

import (
	"context"
	"encoding/json"
	"regexp"
	"strings"
	"testing"

	tea "github.com/charmbracelet/bubbletea"
	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/estimator/poles"
	"polewright/plants"
	"polewright/scenarios"
	"polewright/ui/aim"
	"polewright/ui/desk"
	"polewright/ui/screen"
	"polewright/ui/solver"
)

var (
	styling = regexp.MustCompile(`\x1b\[[0-9;]*[A-Za-z]`)
	unaware = regexp.MustCompile(`(?i)\b(nan|[-+]?inf)\b`)
)

// The same designs on the screen: a figure or a reason, and never a word that is no
// number.
func TestDesignsAtTheEdgeOnTheScreen(t *testing.T) {
	shown := 0
	for _, c := range edges() {
		t.Run(c.name, func(t *testing.T) {
			p, err := plants.Parse("spring.toml", []byte(c.text(t)))
			if err != nil {
				return // refused before there is a screen
			}
			m, err := p.Model(plants.Options{})
			if err != nil {
				return // refused before there is a screen
			}
			work := desk.Work{Bench: &desk.Bench{Plant: p, PlantFile: "spring.toml", Model: m, Scenario: scenarios.Default(p)}}
			if !c.want(t, &work) {
				return // refused where it is typed
			}
			shown++
			view := onScreen(work)
			if flat := strings.Join(strings.Fields(view), " "); c.status == 0 && !strings.Contains(flat, c.says) {
				t.Errorf("nothing about %q:\n%s", c.says, view)
			}
			if word := unaware.FindString(view); word != "" {
				t.Errorf("%q is shown:\n%s", word, view)
			}
			if c.status == 0 && !strings.Contains(view, "settle") {
				t.Errorf("no figures:\n%s", view)
			}
		})
	}
	if shown < 35 {
		t.Errorf("only %d cases came to the screen", shown)
	}
}

// want sets the poles or the gain that the case asks for; false where these are
// refused on the way.
func (c *edge) want(t *testing.T, w *desk.Work) bool {
	t.Helper()
	words := strings.Fields(c.args)
	plane := "s"
	for i := 0; i+1 < len(words); i += 2 {
		switch words[i] {
		case "--plane":
			plane = words[i+1]
		case "--form":
			w.Form = estimator.Current
		case "--use-gain":
			var gain [][]float64
			if json.Unmarshal([]byte(words[i+1]), &gain) != nil || len(gain) != 2 || len(gain[0]) != 1 {
				return false
			}
			w.Gain = mat.NewDense(2, 1, []float64{gain[0][0], gain[1][0]})
		}
	}
	d, err := estimator.NewDesigner(w.Bench.Model, estimator.Options{Form: w.Form})
	if err != nil || w.Gain != nil {
		return err == nil
	}
	spec, err := poles.Parse(words[1])
	if err != nil {
		return false
	}
	w.Poles, err = aim.Own(spec, plane, w.Bench.Model, d)
	return err == nil
}

// onScreen is what is shown once the work's design is there, without colour.
func onScreen(work desk.Work) string {
	var asked desk.Request
	var m tea.Model = screen.New(screen.Config{Work: work, Ask: func(r desk.Request) { asked = r }, Width: 200, Height: 60})
	m, _ = m.Update(m.Init()())
	m, _ = m.Update(screen.AnswerMsg{Answer: solver.NewDirect(work.Bench).Answer(context.Background(), asked)})
	first := m.View()
	m, _ = m.Update(tea.KeyMsg{Type: tea.KeyRunes, Runes: []rune("r")}) // all warnings
	return styling.ReplaceAllString(first+"\n"+m.View(), " ")
}
