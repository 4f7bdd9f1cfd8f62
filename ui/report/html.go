package report

import (
	"strconv"
	"strings"

	"polewright/ui/report/draw"
)

// HTML writes the document out as one page that needs nothing else.
func (d *Document) HTML() []byte {
	var b strings.Builder
	tables := 0
	b.WriteString("<!DOCTYPE html>\n<html lang=\"en\">\n<head>\n<meta charset=\"utf-8\">\n")
	b.WriteString("<meta name=\"viewport\" content=\"width=device-width, initial-scale=1\">\n")
	b.WriteString("<meta http-equiv=\"Content-Security-Policy\" content=\"default-src 'none'; style-src 'unsafe-inline'\">\n")
	b.WriteString("<title>" + esc(d.Title) + "</title>\n<style>\n" + style + "</style>\n</head>\n<body>\n")
	b.WriteString("<header>\n<h1>" + esc(d.Title) + "</h1>\n<p class=\"sub\">" + esc(d.Subtitle) + "</p>\n</header>\n")
	for _, block := range d.Blocks {
		switch v := block.(type) {
		case *Heading:
			v.html(&b)
		case *Text:
			v.html(&b)
		case *Table:
			v.html(&b, &tables)
		case *Figure:
			b.WriteString("<figure>\n" + v.SVG + "\n<figcaption>" + esc(v.Caption) + "</figcaption>\n</figure>\n")
		}
	}
	b.WriteString("</body>\n</html>\n")
	return []byte(b.String())
}

func esc(s string) string { return draw.Escape(s) }

func (h *Heading) html(b *strings.Builder) {
	tag := "h" + strconv.Itoa(h.Level+1)
	class := ""
	if h.Page {
		class = ` class="page"`
	}
	b.WriteString("<" + tag + class + ">" + esc(h.Text) + "</" + tag + ">\n")
}

var textClass = map[Kind]string{Caution: ` class="caution"`, Warning: ` class="warning"`, Faint: ` class="faint"`}

func (t *Text) html(b *strings.Builder) {
	for _, part := range paragraphs(t.Text) {
		word := ""
		if t.Kind == Caution {
			word = "<strong>Caution.</strong> "
		}
		b.WriteString("<p" + textClass[t.Kind] + ">" + word + esc(part) + "</p>\n")
	}
}

// paragraphs parts a text at empty lines.
func paragraphs(s string) []string {
	var out []string
	var part []string
	for _, line := range append(strings.Split(strings.ReplaceAll(s, "\r\n", "\n"), "\n"), "") {
		if line = strings.TrimSpace(line); line != "" {
			part = append(part, line)
			continue
		}
		if len(part) > 0 {
			out = append(out, strings.Join(part, " "))
			part = nil
		}
	}
	return out
}

func (t *Table) html(b *strings.Builder, tables *int) {
	label := ""
	if t.Caption != "" { // not a <caption>, which is as narrow as its table
		*tables++
		id := "t" + strconv.Itoa(*tables)
		b.WriteString("<p class=\"caption\" id=\"" + id + "\">" + esc(t.Caption) + "</p>\n")
		label = " aria-labelledby=\"" + id + "\""
	}
	b.WriteString("<table" + label + ">\n")
	if strings.Join(t.Head, "") != "" {
		b.WriteString("<thead><tr>")
		for i, h := range t.Head {
			b.WriteString("<th scope=\"col\"" + t.class(i) + ">" + esc(h) + "</th>")
		}
		b.WriteString("</tr></thead>\n")
	}
	b.WriteString("<tbody>\n")
	for _, row := range t.Rows {
		b.WriteString("<tr>")
		for i, c := range row {
			tag := "td"
			if i == 0 {
				tag = `th scope="row"`
			}
			key := ""
			if c.Key != "" {
				key = ` data-figure="` + esc(c.Key) + `"`
			}
			text := esc(c.Text)
			if c.Strong {
				text = "<strong>" + text + "</strong>"
			}
			b.WriteString("<" + tag + t.class(i) + key + ">" + text + "</" + tag[:2] + ">")
		}
		b.WriteString("</tr>\n")
	}
	b.WriteString("</tbody>\n</table>\n")
}

func (t *Table) class(i int) string {
	if i == 0 || i < len(t.Words) && t.Words[i] {
		return ` class="w"`
	}
	return ""
}

// style is sober on a screen and on A4 paper, and says nothing by colour alone.
const style = `:root { color-scheme: light; }
body { max-width: 178mm; margin: 2em auto; padding: 0 1em; font: 10.5pt/1.45 Charter, "Bitstream Charter", Cambria, Georgia, serif; color: #1b1b1b; background: #fff; }
header { border-bottom: 2.5pt solid #1f4e79; margin-bottom: 1.2em; }
h1 { font-size: 19pt; line-height: 1.2; margin: 0 0 .1em; }
h2 { font-size: 14pt; margin: 2em 0 .5em; padding-bottom: .1em; border-bottom: .75pt solid #1b1b1b; break-after: avoid; }
h3 { font-size: 11.5pt; margin: 1.5em 0 .4em; break-after: avoid; }
p { margin: .4em 0 .8em; orphans: 3; widows: 3; overflow-wrap: anywhere; }
.sub, .faint { color: #555; }
.caution { border: 1.25pt solid #1b1b1b; padding: .5em .8em; }
.warning { border-left: 3pt double #1b1b1b; padding-left: .7em; }
table { border-collapse: collapse; margin: .6em 0 1.3em; font-size: 9pt; line-height: 1.35; font-variant-numeric: tabular-nums lining-nums; border-top: 1pt solid #1b1b1b; border-bottom: 1pt solid #1b1b1b; }
.caption { font-style: italic; font-size: 9.5pt; margin: 1em 0 .3em; break-after: avoid; }
th, td { text-align: right; padding: .16em .7em .16em 0; vertical-align: baseline; font-weight: normal; overflow-wrap: anywhere; }
th.w, td.w { text-align: left; }
thead { display: table-header-group; }
thead th { border-bottom: .5pt solid #1b1b1b; color: #444; }
tr { break-inside: avoid; }
strong { font-weight: bold; }
.caption + table { margin-top: 0; }
figure { margin: .8em 0 1.4em; break-inside: avoid; }
figure svg { max-width: 100%; height: auto; }
figcaption { font-size: 9pt; color: #444; margin-top: .3em; }
@page { size: A4; margin: 17mm 16mm 18mm; }
@media print {
  body { max-width: none; margin: 0; padding: 0; font-size: 9.5pt; }
  h2.page { break-before: page; }
}
`
