package screen_test

import (
	"math/cmplx"
	"slices"
	"strings"
	"testing"
	"time"

	tea "github.com/charmbracelet/bubbletea"

	"polewright/ui/desk"
)

func (r *rig) mouse(a tea.MouseAction, x, y int) {
	r.clock = r.clock.Add(time.Second) // slower than any held key
	r.send(tea.MouseMsg{X: x, Y: y, Action: a, Button: tea.MouseButtonLeft})
}

// find returns the cell of a text on the screen.
func find(t *testing.T, r *rig, text string) (x, y int) {
	t.Helper()
	for y, l := range strings.Split(strip(r.m.View()), "\n") {
		if y < 2 { // the key of the marks
			continue
		}
		if k := strings.Index(l, text); k >= 0 {
			return len([]rune(l[:k])), y
		}
	}
	t.Fatalf("no %q:\n%s", text, strip(r.m.View()))
	return 0, 0
}

// A click takes the nearest pole, a drag moves it, and the whole drag is one step
// of undo.
func TestMouseDrags(t *testing.T) {
	r := start(t)
	x, y := find(t, r, "□") // the real pole
	r.mouse(tea.MouseActionPress, x, y)
	r.mouse(tea.MouseActionRelease, x, y)
	if r.work().View.Selected != 0 {
		t.Fatal("the mouse does something before it is asked for")
	}
	r.press("P")
	r.mouse(tea.MouseActionPress, x+1, y)
	if r.work().View.Selected != 1 {
		t.Fatal("the nearest pole was not taken")
	}
	before := r.work().Poles
	for k := range 6 {
		r.mouse(tea.MouseActionMotion, x-k-1, y)
		r.reply(desk.Traced)
	}
	r.mouse(tea.MouseActionRelease, x-6, y)
	if gotX, gotY := find(t, r, "●"); gotX != x-6 || gotY != y {
		t.Errorf("the pole is at %d, %d, the mouse at %d, %d", gotX, gotY, x-6, y)
	}
	moved := r.work().Poles
	r.mouse(tea.MouseActionMotion, x-20, y)
	if !slices.Equal(r.work().Poles, moved) {
		t.Error("it moves with no button held")
	}
	r.mouse(tea.MouseActionPress, x-6, y)
	r.mouse(tea.MouseActionMotion, x-8, y)
	r.mouse(tea.MouseActionRelease, x-8, y)
	r.press("u")
	if !slices.Equal(r.work().Poles, moved) {
		t.Error("undo does not lead to where the second drag began")
	}
	r.press("u")
	if !slices.Equal(r.work().Poles, before) {
		t.Error("a drag is more than one step of undo")
	}
}

// A pair is dragged by either half; over the axis it parts and joins again.
func TestMouseDragsAPair(t *testing.T) {
	r := start(t)
	r.press("P")
	x, y := find(t, r, "●")
	axis, _ := 0, 0
	_, axis = find(t, r, "□")
	mirror := 2*axis - y
	r.mouse(tea.MouseActionPress, x, mirror)
	r.mouse(tea.MouseActionMotion, x-3, mirror+1)
	if gotX, gotY := find(t, r, "●"); gotX != x-3 || gotY != y-1 {
		t.Errorf("the upper half is at %d, %d, expected %d, %d", gotX, gotY, x-3, y-1)
	}
	r.mouse(tea.MouseActionMotion, x-3, axis)
	real := 0
	for _, p := range r.work().Poles {
		if imag(p) == 0 {
			real++
		}
	}
	if real != 3 {
		t.Errorf("%d real poles on the axis, expected 3", real)
	}
	r.mouse(tea.MouseActionMotion, x-3, axis-2)
	if p := r.work().Poles[0]; imag(cmplx.Log(p)) == 0 {
		t.Error("lifted off the axis, the two do not join")
	}
	r.mouse(tea.MouseActionMotion, -5, 99) // beyond everything
	fits(t, r.m.View(), 80, 24)
}
