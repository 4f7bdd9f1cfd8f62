package quiet_test

import (
	"testing"

	"polewright/ui/quiet"
)

func TestDark(t *testing.T) {
	for value, want := range map[string]bool{"": true, "15;0": true, "0;15": false, "0;default;7": false, "nonsense": true} {
		t.Setenv("COLORFGBG", value)
		if got := quiet.Dark(); got != want {
			t.Errorf("COLORFGBG=%q: dark %v, expected %v", value, got, want)
		}
	}
}
