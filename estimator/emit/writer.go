package emit

import (
	"bytes"
	"fmt"
	"strings"

	"polewright/estimator"
)

// writer collects lines of code. Free text reaches it only through plain.
type writer struct{ bytes.Buffer }

func (w *writer) line(format string, args ...any) {
	fmt.Fprintf(w, format, args...)
	w.WriteByte('\n')
}

// lines writes a block of code with the placeholders replaced; pairs are old,
// new, old, new ... The block's first line break is dropped.
func (w *writer) lines(block string, pairs ...string) {
	w.WriteString(strings.NewReplacer(pairs...).Replace(strings.TrimPrefix(block, "\n")))
}

// indented writes what f writes one level deeper.
func (w *writer) indented(f func(w *writer)) {
	var inner writer
	f(&inner)
	for l := range strings.Lines(inner.String()) {
		w.WriteString("    " + l)
	}
}

// headNotes are the lines of the comment at the head of a code file.
func headNotes(p *program, what string) []string {
	form := "prediction form: the estimate after sample k is of sample k+1"
	if p.form == estimator.Current {
		form = "current form: the estimate after sample k is of sample k"
	}
	notes := []string{
		what, "",
		"Plant:      " + orNone(plain(p.src.Plant)),
		"Candidate:  " + orNone(plain(p.src.Candidate)),
		"Plant file SHA-256:   " + orNone(plain(p.src.PlantSHA256)),
		"Session file SHA-256: " + orNone(plain(p.src.SessionSHA256)),
		"Made by polewright " + orNone(plain(p.src.Version)) + ". Generated: change the design, not this file.",
		"",
		fmt.Sprintf("%d states, %d inputs, %d sensors; %s.", p.n, p.m, p.p, form),
		fmt.Sprintf("Sample period %s s. Values going in and out are absolute.", full(p.period)),
		"", "Cautions:",
	}
	for _, c := range p.cautions {
		for i, l := range wrapText(plainTo(c, maxCaution), 84) {
			if i == 0 {
				notes = append(notes, "- "+l)
			} else {
				notes = append(notes, "  "+l)
			}
		}
	}
	return notes
}

func orNone(s string) string {
	if s == "" {
		return "(not given)"
	}
	return s
}

// table writes numbers separated by commas, perLine to a line.
func (w *writer) table(v []float64, perLine int, indent string, number func(float64) string) {
	for i, x := range v {
		if i%perLine == 0 {
			w.WriteString(indent)
		}
		w.WriteString(number(x))
		switch {
		case i == len(v)-1:
			w.WriteByte('\n')
		case i%perLine == perLine-1:
			w.WriteString(",\n")
		default:
			w.WriteString(", ")
		}
	}
}

// chunk is how many numbers of a row go on one line.
func chunk(n int) int { return max(1, min(n, 4)) }
