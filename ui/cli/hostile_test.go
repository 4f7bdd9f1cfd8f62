package cli_test

import (
	"encoding/json"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"
	"unicode"
)

// hostile is one file that means no good. The command is given as its words, with
// FILE for it; beside it lie a good session, saved, and a good log.
type hostile struct {
	name, file, text, command string
	says                      string
}

const (
	judge   = "design FILE --poles -1,-2"
	drive   = "simulate lift --poles floor --scenario FILE"
	check   = "verify FILE"
	replays = "replay lift --poles floor --log FILE"
)

func hostiles(good string) []hostile {
	times := strings.Repeat
	plant := func(old, replacement string) string { return strings.Replace(spring, old, replacement, 1) }
	const begun = "format = 1\nduration_s = 1\n"
	const log = "t,force command,draw-wire encoder\n"
	session := func(old, replacement string) string { return strings.Replace(good, old, replacement, 1) }
	json1 := func(a string) string { return `{"format": 1, "model": {"time": "continuous", "A": ` + a }
	list := []hostile{
		// nesting
		{"deep JSON", "p.json", json1(times("[", 900000)), judge, "32"},
		{"deep objects", "p.json", times(`{"a":`, 180000), judge, "32"},
		{"deep TOML", "p.toml", plant(plantA, "A = "+times("[", 900000)), judge, "line 5"},
		{"deep inline tables", "p.toml", times("a={", 300000), judge, "line 1"},
		{"deep dotted keys", "p.toml", "a" + times(".a", 400000) + "=1", judge, "a: unknown key"},
		{"deep headers", "p.toml", "[a" + times(".a", 400000) + "]", judge, "a: unknown key"},
		{"deep brackets", "p.toml", plant("-0.4", `"`+times("(", 99)+"1"+times(")", 99)+"/0\""), judge, "row 2"},
		{"a long chain of signs", "p.toml", plant("-0.4", `"`+times("-", 199)+"1e400\""), judge, "row 2"},
		{"deep scenario", "s.toml", begun + "initial = " + times("[", 900000), drive, "line 3"},
		{"deep session", "x.session.json", times("[", 5000000), check, ""},
		{"deep within a session", "x.session.json", session(`"candidates"`, `"extra": `+times("[", 5000000)+`, "candidates"`), check, ""},

		// sizes that are claimed
		{"a million rows", "p.toml", plant(plantA, "A = ["+times("[1],", 250000)+"]"), judge, "model, A"},
		{"a million columns", "p.toml", plant(plantA, "A = [["+times("0,", 500000)+"0]]"), judge, "1×500001"},
		{"a million samples of delay", "p.toml", plant(density, density+"\ndelay_samples = 1000000"), judge, "0 to 100"},
		{"too many bytes", "p.toml", spring + times("#", 1<<20), judge, "1048576"},
		{"a million blocks", "p.toml", spring + times("[[states]]\n", 90000), judge, "90000 blocks"},
		{"a million parameters", "p.toml", spring + "[parameters]\n" + parameters(20000), judge, "at most 200"},
		{"steps without end", "s.toml", "format = 1\nduration_s = 1e300\n", drive, "duration_s"},
		{"a million drives", "s.toml", begun + times("[[drive]]\n", 100000), drive, "at most 100"},
		{"a session of gigabytes", "x.session.json", times(" ", 64<<20) + "{}", check, "64"},
		{"a million candidates", "x.session.json", session(`"candidates": [`, `"candidates": [`+times("{},", 1000000)), check, "100"},
		{"a gain of a million rows", "x.session.json", session(`"gain": [`, `"gain": [`+times("[],", 1000000)), check, "gain"},
		{"a million columns in a log", "l.csv", "t" + times(",a", 500000) + "\n0\n", replays, "unknown column"},
		{"a line without end", "l.csv", log + "0,1," + times("1", 3<<20), replays, "longer than 1 MiB"},
		{"a gap of ages", "l.csv", log + "0,1,1\n0.01,1,1\n1e15,1,1\n", replays, "line 4"},
		{"samples of ages", "l.csv", log + "0,1,1\n1e-300,1,1\n1,1,1\n", replays, "a gap of 1 s"},

		// numbers
		{"a huge exponent", "p.toml", plant("-0.4", "1e999999999"), judge, "line 5"},
		{"a huge exponent in JSON", "p.json", json1(`[[1e999999999]]}}`), judge, "out of range"},
		{"a million digits", "p.toml", plant("-0.4", times("9", 1000000)), judge, "line 5"},
		{"a million digits in JSON", "p.json", json1("[[" + times("9", 1000000) + "]]}}"), judge, "out of range"},
		{"a tower", "p.toml", plant("-0.4", `"9^9^9^9^9^9^9^9"`), judge, "Inf"},
		{"a loop", "p.toml", plant("-0.4", `"reduce(1..1000000000, # + 1)"`), judge, "reduce"},
		{"a text that grows", "p.toml", plant("-0.4", `"repeat('x', 1000000000)"`), judge, "row 2"},
		{"a huge exponent in a scenario", "s.toml", "format = 1\nduration_s = 1e999999999\n", drive, "line 2"},
		{"a huge exponent in a session", "x.session.json", session(`"gain": [`, `"gain": [[1e999999999],`), check, "1e999999999"},
		{"a huge exponent in a log", "l.csv", log + "0,1e999999999,1\n0.01,1,1\n", replays, "1e999999999"},
		{"a huge time in a log", "l.csv", log + "0,1,1\n1e308,1,1\n", replays, "1e+308"},

		// names
		{"a parameter of itself", "p.toml", spring + "[parameters]\na = { value = \"a\" }\n", judge, "a, value"},
		{"two parameters of each other", "p.toml", spring + "[parameters]\na = { value = \"b\" }\nb = { value = \"a\" }\n", judge, "value"},
		{"a scenario that is its own truth", "s.toml", begun + "[truth]\nplant = \"s.toml\"\n", drive, "s.toml"},
		{"a truth far away", "s.toml", begun + "[truth]\nplant = \"../../../../etc/passwd\"\n", drive, ""},
		{"a name without end", "p.toml", plant("Spring", times("x", 900000)), judge, "at most 60"},
		{"a key without end", "p.toml", times("k", 900000) + " = 1\n" + spring, judge, "unknown key"},
		{"a column without end", "l.csv", "t," + times("c", 900000) + "\n0,1\n", replays, "unknown column"},
		{"a plant that is a folder", ".", "", judge, "directory"},
	}
	for name, evil := range evils {
		quoted, _ := json.Marshal(evil)
		list = append(list,
			hostile{name + " in a plant's name", "p.json", strings.Replace(json1("[[1]]")+`}, "name": NAME}`, "NAME", string(quoted), 1), judge, ""},
			hostile{name + " in a key", "p.json", `{` + string(quoted) + `: 1}`, judge, "unknown key"},
			hostile{name + " in arithmetic", "p.json", json1(`[[` + string(quoted) + `]]}}`), judge, ""},
			hostile{name + " in a unit", "p.toml", plant(`name = "push"`, "name = \"push\"\nunit = "+string(quoted)), judge, ""},
			hostile{name + " as it is in TOML", "p.toml", plant("Spring", evil), judge, ""},
			hostile{name + " in a scenario", "s.toml", begun + "[[drive]]\ninput = " + string(quoted) + "\nshape = \"step\"\nsize = 1\n", drive, ""},
			hostile{name + " in a session's program", "x.session.json", session(`"format": 1`, `"format": 2, "program": `+string(quoted)), check, ""},
			hostile{name + " in a column", "l.csv", "t," + evil + "\n0,1\n", replays, ""},
			hostile{name + " in a field", "l.csv", log + "0,1," + evil + "\n0.01,1,1\n", replays, ""},
		)
	}
	return list
}

// evils are what a terminal, a page or a path could take for more than text.
var evils = map[string]string{
	"an escape sequence":    "a\x1b[2J\x1b]0;owned\x07",
	"a C1 control":          "a\u009b2J",
	"a turned direction":    "a\u202etxt.exe",
	"an isolated direction": "a\u2066b\u2069",
	"a line separator":      "a\u2028b",
	"nothing to see":        "a\u200b\ufeffb",
}

func parameters(n int) string {
	var b strings.Builder
	for i := range n {
		b.WriteString("p")
		b.WriteString(strings.Repeat("q", i%20))
		for d := i; ; d /= 10 {
			b.WriteByte('0' + byte(d%10))
			if d < 10 {
				break
			}
		}
		b.WriteString("={value=1}\n")
	}
	return b.String()
}

// calm holds that a line is short and that nothing in it moves a terminal.
func calm(t *testing.T, line string) {
	t.Helper()
	if strings.Count(line, "\n") != 1 || len(line) > 600 {
		t.Errorf("not one short line: %d bytes, %.300q", len(line), line)
	}
	for _, r := range strings.TrimSuffix(line, "\n") {
		if !unicode.IsPrint(r) || r == unicode.ReplacementChar {
			t.Errorf("%q in %.300q", r, line)
		}
	}
}

// Whatever a file holds, the command ends quickly, with status 2 and one line.
func TestHostileFiles(t *testing.T) {
	golden, err := os.ReadFile("../session/testdata/format1.session.json")
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range hostiles(string(golden)) {
		t.Run(c.name, func(t *testing.T) {
			if testing.Short() && len(c.text) > 1<<17 {
				t.Skip("a large file")
			}
			dir := t.TempDir()
			file := filepath.Join(dir, c.file)
			if c.file != "." {
				if err := os.WriteFile(file, []byte(c.text), 0o600); err != nil {
					t.Fatal(err)
				}
			}
			args := strings.Fields(c.command)
			for i, a := range args {
				if a == "FILE" {
					args[i] = file
				}
			}
			began := time.Now()
			status, out, errs := run(t, args...)
			if d := time.Since(began); d > 2*time.Minute { // for ever, on any machine
				t.Errorf("took %v", d)
			}
			errs = strings.ReplaceAll(errs, dir, "")
			if status != 2 || out != "" {
				t.Errorf("status %d, prints %.200q, says %.300q", status, out, errs)
			}
			calm(t, errs)
			if !strings.Contains(errs, c.says) {
				t.Errorf("%.300q, expected something about %q", errs, c.says)
			}
		})
	}
}

// A session opens whatever its texts are called; what is shown, written and emitted
// of it is text alone, and no file leads out of the folder.
func TestHostileNamesInASession(t *testing.T) {
	golden, err := os.ReadFile("../session/testdata/format1.session.json")
	if err != nil {
		t.Fatal(err)
	}
	evil, _ := json.Marshal(evils["an escape sequence"] + evils["a turned direction"] + `/../../x*/ --><script>alert(1)</script>` + strings.Repeat("y", 5000))
	for _, old := range []string{`"file": "balancer.toml"`, `"program": "polewright 0.1.0"`, `"name": "A"`, `"note": `} {
		key, _, _ := strings.Cut(old, ":")
		text := strings.Replace(string(golden), old, key+": "+string(evil), 1)
		if key == `"note"` {
			text = strings.Replace(string(golden), `"name": "A"`, `"name": "A", "note": `+string(evil), 1)
		}
		if text == string(golden) {
			t.Fatalf("no %s in the session", old)
		}
		dir := t.TempDir()
		t.Chdir(dir)
		if err := os.WriteFile("x.session.json", []byte(text), 0o600); err != nil {
			t.Fatal(err)
		}
		shown, written := "", ""
		for _, args := range [][]string{
			{"verify", "x.session.json"}, {"design", "x.session.json", "--candidate", "B"}, {"report", "x.session.json", "--out", "r.md"}, {"report", "x.session.json", "--out", "r.html"},
			{"emit", "x.session.json", "--candidate", "B", "--as", "c99", "--out", "."}, {"emit", "x.session.json", "--candidate", "B", "--as", "st", "--out", "."}} {
			status, out, errs := run(t, args...)
			if status == 2 {
				calm(t, errs)
				t.Logf("%s, %s: %s", key, args[0], errs)
			}
			shown += out + errs
		}
		files, err := os.ReadDir(".")
		if err != nil {
			t.Fatal(err)
		}
		for _, f := range files[:len(files):len(files)] {
			if f.Name() == "x.session.json" {
				continue
			}
			shown += f.Name()
			data, err := os.ReadFile(f.Name())
			if err != nil {
				t.Fatal(err)
			}
			written += string(data)
			bad := "<script>alert"
			if ext := filepath.Ext(f.Name()); ext != ".html" && ext != ".md" {
				bad = "x*/" // the end of a comment
			}
			if at := strings.Index(string(data), bad); at >= 0 {
				t.Errorf("%s, %s: %q", key, f.Name(), data[max(0, at-200):at+50])
			}
		}
		for _, r := range shown + written {
			if r != '\n' && r != '\t' && !unicode.IsPrint(r) {
				t.Errorf("%s: %q is shown", key, r)
				break
			}
		}
	}
}

// What is typed on the command line is kept from the terminal as well.
func TestHostileArguments(t *testing.T) {
	for name, evil := range evils {
		for _, args := range [][]string{
			{evil}, {"design", evil, "--poles", "-1"}, {"design", "lift", "--poles", evil}, {"design", "lift", "--poles", "floor", "--scenario", evil},
			{"design", "lift", "--" + evil}, {"design", "lift", "--poles", "floor", "--plane", evil}, {"design", "lift", "--use-gain", evil},
			{"verify", evil}, {"replay", "lift", "--poles", "floor", "--log", evil}, {"library", "copy", evil, "."}, {"library", evil},
			{"simulate", "lift", "--poles", "floor", "--out", evil + "/x"}, {"report", evil, "--out", "x.md"},
		} {
			status, out, errs := run(t, args...)
			if status != 2 || out != "" {
				t.Errorf("%s, %q: status %d, prints %.200q", name, args, status, out)
			}
			calm(t, errs)
		}
	}
}
