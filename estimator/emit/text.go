package emit

import (
	"fmt"
	"strings"
	"unicode/utf8"
)

// Bounds on free text in a comment, in bytes.
const (
	maxText    = 200  // a name, a unit, a hash
	maxCaution = 1000 // a caution
)

// spelled are frequent characters of units that have a plain spelling.
var spelled = map[rune]string{
	'\u00b5': "u", '\u03bc': "u", '\u00b0': "deg", '\u00b2': "^2", '\u00b3': "^3",
	'\u03a9': "Ohm", '\u2126': "Ohm", '\u00b7': "*", '\u22c5': "*", '\u00d7': "x",
	'\u221a': "sqrt", '\u2212': "-", '\u2013': "-", '\u00b1': "+-",
	'\u00e4': "ae", '\u00f6': "oe", '\u00fc': "ue", '\u00df': "ss",
	'\u00c4': "Ae", '\u00d6': "Oe", '\u00dc': "Ue",
}

// harmless are the marks that stand for themselves in a comment. Backslash,
// question mark, quotes, braces, @, # and $ are left out: they could continue a
// line, start a trigraph, a pragma or a tool's command.
const harmless = " .,;:-+=/*()[]^%_!|&"

// plain makes free text fit for a comment of C or structured text: printable
// ASCII on one line, without anything that opens or ends a comment. All else is
// written as its code point, <U+202E>.
func plain(text string) string { return plainTo(text, maxText) }

// plainTo is plain with a bound of its own.
func plainTo(text string, most int) string {
	var b strings.Builder
	for len(text) > 0 {
		r, size := utf8.DecodeRuneInString(text)
		piece := text[:size]
		text = text[size:]
		switch {
		case r == utf8.RuneError && size <= 1:
			piece = fmt.Sprintf("<0x%02X>", piece[0])
		case isWord(r) || strings.ContainsRune(harmless, r):
		case spelled[r] != "":
			piece = spelled[r]
		default:
			piece = fmt.Sprintf("<U+%04X>", r)
		}
		if b.Len()+len(piece) > most {
			b.WriteString("...")
			return strings.TrimSpace(b.String())
		}
		if opensOrEnds(b.String(), piece) {
			b.WriteByte(' ')
		}
		b.WriteString(piece)
	}
	return strings.TrimSpace(b.String())
}

func isWord(r rune) bool {
	return r >= 'a' && r <= 'z' || r >= 'A' && r <= 'Z' || r >= '0' && r <= '9'
}

// opensOrEnds tells whether two neighbours would form a comment's mark.
func opensOrEnds(before, next string) bool {
	if before == "" {
		return false
	}
	switch before[len(before)-1:] + next[:1] {
	case "*/", "/*", "(*", "*)", "//":
		return true
	}
	return false
}

// wrapText breaks a text into lines of at most width bytes at its spaces.
func wrapText(text string, width int) []string {
	var lines []string
	line := ""
	for _, word := range strings.Fields(text) {
		for len(word) > width {
			if line != "" {
				lines = append(lines, line)
				line = ""
			}
			lines = append(lines, word[:width])
			word = word[width:]
		}
		switch {
		case line == "":
			line = word
		case len(line)+1+len(word) <= width:
			line += " " + word
		default:
			lines = append(lines, line)
			line = word
		}
	}
	if line != "" {
		lines = append(lines, line)
	}
	return lines
}

// unitOf returns the unit as a comment shows it.
func (s named) unitOf() string {
	if u := plain(s.unit); u != "" {
		return "[" + u + "]"
	}
	return "[no unit]"
}

// describe returns name and unit as a comment shows them.
func (s named) describe() string {
	return plain(s.name) + " " + s.unitOf()
}
