package draw

import (
	"strconv"
	"strings"
	"unicode"
)

// Visible writes out as codes the characters that a reader cannot see and that
// could mislead: controls, invisible ones, those that turn the writing direction,
// broken encodings. Line ends and tabs become spaces.
func Visible(s string) string {
	var b strings.Builder
	for _, r := range s {
		switch {
		case r == '\n' || r == '\r' || r == '\t':
			b.WriteByte(' ')
		case r == unicode.ReplacementChar || unicode.IsControl(r) || unicode.In(r, unicode.Cf, unicode.Co, unicode.Cs, unicode.Zl, unicode.Zp) || !unicode.IsGraphic(r):
			q := strconv.QuoteRuneToASCII(r)
			b.WriteString(q[1 : len(q)-1])
		default:
			b.WriteRune(r)
		}
	}
	return b.String()
}
