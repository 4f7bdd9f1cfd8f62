package report_test

import (
	"encoding/xml"
	"errors"
	"io"
	"path/filepath"
	"regexp"
	"slices"
	"strings"
	"testing"

	"polewright/ui/internal/sample"
	"polewright/ui/report"
	"polewright/ui/session"
)

// A plant whose every text tries to be more than text.
const hostile = `
format = 1
name = "<script>alert(1)</script>"
note = """
<img src=x onerror=alert(2)> & "quotes" 'single' ` + "`code`" + `
# not a heading
- not a list
1. not a list either
---

| not | a | table |
[link](http://example.com) ![picture](x) http://example.com www.example.com
"""
[parameters]
mass = { value = 2.0, unit = "</td><td>", tolerance = 0.1 }
[model]
time = "continuous"
period_s = 0.1
A = [[0, 1], [0, "-1/mass"]]
B = [[0], [1]]
C = [[1, 0]]
[[states]]
name = "\" onload=\"alert(3)"
unit = "a|b"
[[states]]
name = "</text></svg><script>"
unit = "&amp;"
[[inputs]]
name = "--> ]]> <!--"
unit = "*N*"
[[sensors]]
name = "|x|\\|"
unit = "_m_"
noise_std = 0.01
[process_noise]
density = [0.1, 0.1]
`

const hostileScenario = `
format = 1
name = "<b>|</b> *x*"
duration_s = 3.0
[limits]
settle_s = 100.0
[limits.std]
"</text></svg><script>" = 1e-9
`

func hostileReport(t *testing.T) *report.Document {
	t.Helper()
	b, err := sample.Bench("<i>.toml", []byte(hostile), "<u>.toml", []byte(hostileScenario))
	if err != nil {
		t.Fatal(err)
	}
	w, err := sample.Work(b, sample.Entry{Poles: "-2±1i", Note: "<iframe> | \u202eturned"})
	if err != nil {
		t.Fatal(err)
	}
	w.Candidates[0].Letter, w.Current = "<A>", "<A>"
	file := filepath.Join(t.TempDir(), "work"+session.Ending)
	if err := session.Save(file, "<program> \u202e\x1b[31m", w, false); err != nil {
		t.Fatal(err)
	}
	return document(t, load(t, file))
}

func TestHTMLIsOnlyOurs(t *testing.T) {
	page := string(hostileReport(t).HTML())
	tags := strings.Fields("html head meta title style body header h1 h2 h3 p table thead tbody tr th td strong figure figcaption svg line circle path polygon text")
	for _, m := range regexp.MustCompile(`<[/!]?([A-Za-z0-9]*)([^<>]*)>`).FindAllStringSubmatch(page, -1) {
		if !slices.Contains(tags, m[1]) && m[0] != "<!DOCTYPE html>" {
			t.Errorf("a tag that is not ours: %s", m[0])
		}
		if strings.Contains(m[2], "alert") && !strings.Contains(m[2], "data-figure") && !strings.Contains(m[2], "aria-label") {
			t.Errorf("in a tag: %s", m[0])
		}
	}
	for _, bad := range []string{"<script", "<img", "<iframe", `" onload="`, "\u202e", "\x1b"} {
		if strings.Contains(page, bad) {
			t.Errorf("the page holds %q", bad)
		}
	}
	for _, good := range []string{"&lt;script&gt;alert(1)&lt;/script&gt;", "a|b", "&lt;img src=x onerror=alert(2)&gt;", "&lt;program&gt;"} {
		if !strings.Contains(page, good) {
			t.Errorf("the page lacks %q", good)
		}
	}
	wellFormed(t, page)
}

// wellFormed reads the body as XML, strictly: nothing is left open or unquoted.
func wellFormed(t *testing.T, page string) {
	t.Helper()
	body := page[strings.Index(page, "<body>"):strings.Index(page, "</html>")]
	d := xml.NewDecoder(strings.NewReader(body))
	for {
		if _, err := d.Token(); err != nil {
			if !errors.Is(err, io.EOF) {
				t.Errorf("not well-formed: %v", err)
			}
			return
		}
	}
}

var svg = regexp.MustCompile(`(?s)<div>\n<svg.*?</svg>\n</div>`)

func TestMarkdownIsOnlyOurs(t *testing.T) {
	page := string(hostileReport(t).Markdown())
	for _, s := range svg.FindAllString(page, -1) {
		if strings.Contains(s, "\n\n") {
			t.Error("an empty line ends a figure")
		}
		wellFormed(t, "<body>"+s+"</body></html>")
	}
	columns := 0
	pipe := regexp.MustCompile(`\\.|\|`)
	for _, line := range strings.Split(svg.ReplaceAllString(page, ""), "\n") {
		if strings.Contains(line, "<") || strings.Contains(strings.TrimPrefix(line, "> "), ">") {
			t.Errorf("HTML: %s", line)
		}
		if strings.Contains(line, "://") || strings.Contains(line, "www.") {
			t.Errorf("a link: %s", line)
		}
		n := 0
		for _, m := range pipe.FindAllString(line, -1) {
			if m == "|" {
				n++
			}
		}
		switch {
		case !strings.HasPrefix(line, "|"):
			if n > 0 {
				t.Errorf("a bar outside of a table: %s", line)
			}
			columns = 0
		case columns == 0:
			columns = n
		case columns != n:
			t.Errorf("%d bars, the head has %d: %s", n, columns, line)
		}
		for _, start := range []string{"- ", "1. ", "---", "# not"} {
			if strings.HasPrefix(line, start) {
				t.Errorf("more than text: %s", line)
			}
		}
	}
	if strings.Contains(page, "\u202e") || strings.Contains(page, "\x1b") {
		t.Error("control characters in the page")
	}
	for _, good := range []string{`&lt;script&gt;alert(1)&lt;/script&gt;`, `a\|b`, `\*N\*`, `\_m\_`, `\[link\]`, `\|x\|\\\|`} {
		if !strings.Contains(page, good) {
			t.Errorf("the page lacks %q", good)
		}
	}
}
