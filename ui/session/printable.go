package session

import (
	"math"
	"path"
	"strings"
	"unicode"

	"polewright/ui/desk"
)

// Printable keeps from the terminal what a file holds beyond text: control
// characters, invisible ones, those that turn the writing direction, broken
// encodings, and what is beyond a length.
func Printable(s string, most int) string {
	var out []rune
	for _, r := range s {
		if len(out) == most {
			break
		}
		if r != unicode.ReplacementChar && unicode.IsPrint(r) {
			out = append(out, r)
		}
	}
	return string(out)
}

// fileName is the name of a file that a session holds, as a name alone: it leads
// to no folder and is never taken for an option.
func fileName(s string) string {
	ending := path.Ext(s)
	s = Printable(strings.TrimSuffix(s, ending), maxFileName)
	s = s[strings.LastIndexAny(s, `/\:`)+1:]
	s = strings.TrimLeft(s, "-. ")
	if s == "" {
		s = "unnamed"
	}
	switch ending {
	case ".toml", ".json":
		return s + ending
	}
	return s + ".toml"
}

// view keeps of a view what a screen can show.
func view(v desk.View) desk.View {
	if v.Plane != "s" && v.Plane != "z" {
		v.Plane = ""
	}
	if !(v.Zoom >= 0) || math.IsInf(v.Zoom, 0) {
		v.Zoom = 0
	}
	v.Selected, v.Trace = max(v.Selected, 0), max(v.Trace, 0)
	v.Focus, v.Shows = Printable(v.Focus, maxLetter), Printable(v.Shows, maxLetter)
	return v
}
