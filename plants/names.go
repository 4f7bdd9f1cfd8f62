package plants

import (
	"cmp"
	"fmt"
	"maps"
	"slices"
	"strings"
	"unicode/utf8"
)

// Bounds on texts, in characters.
const (
	maxName = 60
	maxUnit = 20
	maxNote = 10000
)

// checkName refuses what cannot stand on a screen or in a file's header.
func checkName(at, name string) *Error {
	switch {
	case strings.TrimSpace(name) == "":
		return &Error{Where: at, Wrong: "empty", Expected: "expected a name"}
	case strings.ContainsFunc(name, unsafeRune):
		return &Error{Where: at, Wrong: "control characters in " + quoted(name), Expected: "expected visible characters only"}
	case name != strings.TrimSpace(name):
		return &Error{Where: at, Wrong: "space around " + quoted(name), Expected: "expected a name without it"}
	case utf8.RuneCountInString(name) > maxName:
		return &Error{Where: at, Wrong: fmt.Sprintf("%d characters long", utf8.RuneCountInString(name)), Expected: fmt.Sprintf("expected at most %d", maxName)}
	}
	return nil
}

func checkUnit(at, unit string) *Error {
	if strings.ContainsFunc(unit, unsafeRune) {
		return &Error{Where: at, Wrong: "control characters in " + quoted(unit), Expected: "expected visible characters only"}
	}
	if utf8.RuneCountInString(unit) > maxUnit {
		return &Error{Where: at, Wrong: fmt.Sprintf("%d characters long", utf8.RuneCountInString(unit)), Expected: fmt.Sprintf("expected at most %d", maxUnit)}
	}
	return nil
}

func checkNote(at, note string) *Error {
	if n := utf8.RuneCountInString(note); n > maxNote {
		return &Error{Where: at, Wrong: fmt.Sprintf("%d characters long", n), Expected: fmt.Sprintf("expected at most %d", maxNote)}
	}
	if strings.ContainsFunc(note, func(r rune) bool { return r != '\n' && r != '\r' && r != '\t' && unsafeRune(r) }) {
		return &Error{Where: at, Wrong: "control characters", Expected: "expected visible characters and line ends only"}
	}
	return nil
}

// distinct makes sure that a name means one thing where it is looked up: among
// states and outputs (limits), and among inputs and sensors (columns of a log).
func (r *reader) distinct() *Error {
	p := r.plant
	const time = "the time column of logs"
	judged, measured := map[string]string{"t": time}, map[string]string{"t": time}
	take := func(seen map[string]string, block string, i int, name string) *Error {
		at := fmt.Sprintf("%s %d", block, i+1)
		if first, twice := seen[name]; twice {
			return &Error{Where: where(at, "name"), Wrong: fmt.Sprintf("%s is also %s", quoted(name), first), Expected: "expected a name of its own"}
		}
		seen[name] = at
		return nil
	}
	var bad *Error
	for i, s := range p.States {
		bad = cmp.Or(bad, take(judged, "states", i, s.Name))
	}
	for i, s := range p.Outputs {
		bad = cmp.Or(bad, take(judged, "outputs", i, s.Name))
	}
	for i, s := range p.Inputs {
		bad = cmp.Or(bad, take(measured, "inputs", i, s.Name))
	}
	for i, s := range p.Sensors {
		bad = cmp.Or(bad, take(measured, "sensors", i, s.Name))
	}
	return bad
}

// blockCount accepts no blocks at all or one per signal.
func blockCount(key string, have, want int, one string) (given bool, bad *Error) {
	if have != 0 && have != want {
		return false, &Error{Where: key, Wrong: count(have, "block"), Expected: fmt.Sprintf("expected %d (one per %s) or none", want, one)}
	}
	return have != 0, nil
}

func tooMany(at string, have, most int) *Error {
	return &Error{Where: at, Wrong: fmt.Sprintf("%d of them", have), Expected: fmt.Sprintf("expected at most %d", most)}
}

func unknownName[T any](at, kind, name string, list []T, of func(T) string) *Error {
	return &Error{Where: at, Wrong: fmt.Sprintf("unknown %s %s", kind, quoted(name)), Expected: expectedNames(list, of)}
}

func expectedNames[T any](list []T, of func(T) string) string {
	if len(list) == 0 {
		return "there is none"
	}
	names := make([]string, len(list))
	for i, item := range list {
		names[i] = quoted(of(item))
	}
	if len(names) > 6 {
		names = append(names[:6], "...")
	}
	return "expected one of " + strings.Join(names, ", ")
}

// count says "1 entry", "2 entries".
func count(n int, one string) string {
	switch {
	case n == 1:
		return "1 " + one
	case strings.HasSuffix(one, "y"):
		return fmt.Sprintf("%d %sies", n, strings.TrimSuffix(one, "y"))
	}
	return fmt.Sprintf("%d %ss", n, one)
}

func sortedKeysOf[V any](m map[string]V) []string { return slices.Sorted(maps.Keys(m)) }
