package report

import (
	"strings"

	"polewright/ui/report/draw"
)

// Markdown writes the document out as Markdown with tables; figures are SVG inside
// it.
func (d *Document) Markdown() []byte {
	var b strings.Builder
	b.WriteString("# " + mark(d.Title) + "\n\n" + mark(d.Subtitle) + "\n")
	for _, block := range d.Blocks {
		b.WriteString("\n")
		switch v := block.(type) {
		case *Heading:
			b.WriteString(strings.Repeat("#", v.Level+1) + " " + mark(v.Text) + "\n")
		case *Text:
			v.markdown(&b)
		case *Table:
			v.markdown(&b)
		case *Figure:
			b.WriteString("<div>\n" + v.SVG + "\n</div>\n\n*" + mark(v.Caption) + "*\n")
		}
	}
	return []byte(b.String())
}

func (t *Text) markdown(b *strings.Builder) {
	for i, part := range paragraphs(t.Text) {
		if i > 0 {
			b.WriteString("\n")
		}
		switch t.Kind {
		case Caution:
			b.WriteString("> **Caution.** " + mark(part) + "\n")
		case Warning:
			b.WriteString("> " + mark(part) + "\n")
		default:
			b.WriteString(mark(part) + "\n")
		}
	}
}

func (t *Table) markdown(b *strings.Builder) {
	if t.Caption != "" {
		b.WriteString("*" + mark(t.Caption) + "*\n\n")
	}
	row := func(cells []string) { b.WriteString("| " + strings.Join(cells, " | ") + " |\n") }
	head, rule := make([]string, len(t.Head)), make([]string, len(t.Head))
	for i, h := range t.Head {
		head[i], rule[i] = mark(h), "---:"
		if t.class(i) != "" {
			rule[i] = ":---"
		}
	}
	row(head)
	row(rule)
	for _, r := range t.Rows {
		cells := make([]string, len(r))
		for i, c := range r {
			cells[i] = mark(c.Text)
			if c.Strong && cells[i] != "" {
				cells[i] = "**" + cells[i] + "**"
			}
		}
		row(cells)
	}
}

// entities keep HTML and links out; the rest of what Markdown could take for more
// than text gets a backslash.
var entities = strings.NewReplacer("&", "&amp;", "<", "&lt;", ">", "&gt;",
	`\`, `\\`, "`", "\\`", "*", `\*`, "_", `\_`, "[", `\[`, "]", `\]`, "{", `\{`, "}", `\}`,
	"|", `\|`, "~", `\~`, "#", `\#`, "!", `\!`, "$", `\$`, "://", "&#58;//", "www.", "www&#46;", "@", "&#64;")

// mark makes a text of any origin harmless on one line of Markdown.
func mark(s string) string {
	s = strings.TrimSpace(entities.Replace(draw.Visible(s)))
	if s == "" {
		return s
	}
	// What would start a list, a rule or a heading.
	digits := len(s) - len(strings.TrimLeft(s, "0123456789"))
	switch {
	case strings.HasPrefix(s, "- "), strings.HasPrefix(s, "+ "), s == "-", s == "+", strings.HasPrefix(s, "--"), strings.HasPrefix(s, "=="), s == "=":
		return `\` + s
	case digits > 0 && digits < len(s) && (s[digits] == '.' || s[digits] == ')') && (digits+1 == len(s) || s[digits+1] == ' '):
		return s[:digits] + `\` + s[digits:]
	}
	return s
}
