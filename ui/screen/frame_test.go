package screen_test

import (
	"sort"
	"strings"
	"testing"

	tea "github.com/charmbracelet/bubbletea"

	"polewright/ui/desk"
	"polewright/ui/screen"
)

// drag moves a pole back and forth by a cell and answers each move.
func drag(r *rig, i int) {
	k := "left"
	if i/8%2 == 1 {
		k = "right"
	}
	r.send(keyMsg(k))
	r.reply(desk.Traced)
}

// The renderer takes every line anew in which one cell changed; what of that goes
// to the terminal is measured there. Fewer lines are less work all the same.
func TestBytesWhileDragging(t *testing.T) {
	for _, c := range []struct {
		name   string
		opt    option
		budget int
	}{{"colour", colour, 2500}, {"ascii", seven, 1300}} {
		r := start(t, c.opt, func(c *screen.Config) { c.KeepBlanks = false })
		r.send(tea.WindowSizeMsg{Width: 120, Height: 40})
		var sizes []int
		before := strings.Split(r.m.View(), "\n")
		for i := range 40 {
			drag(r, i)
			now := strings.Split(r.m.View(), "\n")
			n := 0
			for y := range now {
				if now[y] != before[y] {
					n += len(now[y]) + 2
				}
			}
			sizes, before = append(sizes, n), now
		}
		sort.Ints(sizes)
		t.Logf("%s: median %d, 90 %% %d bytes", c.name, sizes[20], sizes[36])
		if sizes[20] > c.budget {
			t.Errorf("%s: median of %d bytes a key, budget %d", c.name, sizes[20], c.budget)
		}
	}
}

var sink string

func BenchmarkFrame(b *testing.B) {
	for _, c := range []struct {
		name string
		step func(r *rig, i int)
	}{
		{"key", func(r *rig, i int) { r.send(keyMsg([]string{"left", "right"}[i%2])) }},
		{"key+answer", drag},
		{"view", func(r *rig, i int) { r.send(nil) }},
	} {
		b.Run(c.name, func(b *testing.B) {
			r := start(b, colour)
			r.send(tea.WindowSizeMsg{Width: 120, Height: 40})
			b.ReportAllocs()
			for i := range b.N {
				c.step(r, i)
				sink = r.m.View()
				r.asked, r.cmds = r.asked[len(r.asked)-1:], nil
			}
		})
	}
}
