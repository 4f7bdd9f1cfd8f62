// Package quiet keeps the program from asking the terminal for its background
// colour while it starts. bubbletea asks when its package is initialised, and a
// terminal that does not answer would cost the user five seconds.
//
// Packages are initialised in the order of their import paths as soon as what
// they import is ready. This package imports os alone, which is ready before
// anything that bubbletea needs from package unicode, so its init comes first: it
// hides TERM, which is what the question depends on. Restore puts it back. A test
// over a pseudo-terminal holds that no question is asked.
package quiet

import "os"

var (
	term  string
	known bool
)

func init() {
	if term, known = os.LookupEnv("TERM"); known {
		os.Setenv("TERM", "dumb")
	}
}

// Restore puts back the environment as it was at the start. It must be called
// before anything looks at the terminal.
func Restore() {
	if known {
		os.Setenv("TERM", term)
	}
}

// Dark decides whether the background is dark without asking the terminal: from
// COLORFGBG ("fg;bg", set by some terminals), else dark.
func Dark() bool {
	v := os.Getenv("COLORFGBG")
	last := ""
	for i := len(v) - 1; i >= 0; i-- {
		if v[i] == ';' {
			last = v[i+1:]
			break
		}
	}
	switch last {
	case "7", "9", "10", "11", "12", "13", "14", "15":
		return false
	}
	return true
}
