package plants

import (
	"fmt"
	"strconv"
	"strings"
	"unicode"
)

// Error is one thing wrong with a file, said in one line.
type Error struct {
	File     string // as the user named it
	Where    string // key or line
	Wrong    string // what is wrong
	Expected string // what is expected instead
}

// Error formats "FILE: where: what is wrong; what is expected" without control
// or direction-changing characters. Parts that are empty are left out.
func (e *Error) Error() string {
	var b strings.Builder
	for _, part := range []string{e.File, e.Where} {
		if part != "" {
			b.WriteString(part + ": ")
		}
	}
	b.WriteString(e.Wrong)
	if e.Expected != "" {
		b.WriteString("; " + e.Expected)
	}
	return printable(b.String())
}

// printable escapes whatever a terminal could take for a command.
func printable(s string) string {
	clean := true
	for _, r := range s {
		if unsafeRune(r) {
			clean = false
			break
		}
	}
	if clean {
		return s
	}
	var b strings.Builder
	for _, r := range s {
		if unsafeRune(r) {
			q := strconv.QuoteRuneToASCII(r)
			b.WriteString(q[1 : len(q)-1])
		} else {
			b.WriteRune(r)
		}
	}
	return b.String()
}

// unsafeRune reports control characters, invisible format characters (among
// them those that change the writing direction) and broken encodings.
func unsafeRune(r rune) bool {
	return r == unicode.ReplacementChar || unicode.IsControl(r) ||
		unicode.In(r, unicode.Cf, unicode.Co, unicode.Cs, unicode.Zl, unicode.Zp)
}

// quoted shortens a text from a file for a message and puts it in quotes.
func quoted(s string) string { return strconv.Quote(shortened(s)) }

func shortened(s string) string {
	if r := []rune(s); len(r) > maxName {
		return string(r[:maxName-3]) + "..."
	}
	return s
}

// where joins the steps of a place in a file.
func where(steps ...any) string {
	parts := make([]string, 0, len(steps))
	for _, s := range steps {
		if t := fmt.Sprint(s); t != "" {
			parts = append(parts, t)
		}
	}
	return strings.Join(parts, ", ")
}
