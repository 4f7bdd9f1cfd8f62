package keys_test

import (
	"strings"
	"testing"

	"github.com/charmbracelet/bubbles/help"

	"polewright/ui/keys"
)

var _ help.KeyMap = keys.Map{}

// What a broken escape sequence leaves on the line must do nothing.
func TestFragmentsAreUnbound(t *testing.T) {
	for _, g := range keys.Default().Groups() {
		for _, b := range g.Bindings {
			for _, k := range b.Keys() {
				if len(k) == 1 && strings.Contains("[]OABCD;~", k) {
					t.Errorf("%q (%s) is bound", k, b.Help().Desc)
				}
			}
		}
	}
}

func TestNoKeyTwice(t *testing.T) {
	seen := map[string]string{}
	groups := keys.Default().Groups()
	for _, g := range groups[:len(groups)-1] { // a view has keys of its own
		for _, b := range g.Bindings {
			for _, k := range b.Keys() {
				if other, ok := seen[k]; ok {
					t.Errorf("%q is bound to %q and %q", k, other, b.Help().Desc)
				}
				seen[k] = b.Help().Desc
			}
		}
	}
	for _, k := range strings.Fields("tab shift+tab n N h j k l H J K L left right up down shift+left shift+right shift+up shift+down = u U ctrl+r ctrl+s s ? esc q ctrl+c ctrl+z") {
		if _, ok := seen[k]; !ok {
			t.Errorf("%q is bound to nothing", k)
		}
	}
}
