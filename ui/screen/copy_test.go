package screen_test

import (
	"errors"
	"testing"

	"polewright/ui/desk"
	"polewright/ui/screen"
)

func TestCopyHandsOverTheGain(t *testing.T) {
	var copied []string
	var fails error
	r := start(t, func(c *screen.Config) {
		c.Copy = func(text string) error { copied = append(copied, text); return fails }
	})
	r.press("y")
	r.run()
	if len(copied) != 1 || copied[0][:2] != "[[" {
		t.Fatalf("copied %q", copied)
	}
	r.wantShown("sent to the terminal's clipboard")
	fails = errors.New("the terminal is gone")
	r.press("y")
	r.run()
	r.wantShown("not copied: the terminal is gone")
	r.press("left", "y") // not the gain of other poles
	r.run()
	if len(copied) != 2 {
		t.Error("copied a gain that is not that of these poles")
	}
	r.reply(desk.Judged)
}
