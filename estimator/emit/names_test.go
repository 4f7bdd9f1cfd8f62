package emit_test

import (
	"regexp"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"polewright/estimator/emit"
)

var valid = regexp.MustCompile(`^[a-z0-9]+(_[a-z0-9]+)*$`)

func TestIdentifiers(t *testing.T) {
	tests := []struct{ names, want []string }{
		{[]string{"gate position", "gate speed"}, []string{"gate_position", "gate_speed"}},
		{[]string{"int", "End_If", "3rd", "µ", ""}, []string{"int", "end_if", "3rd", "state_4", "state_5"}},
		{[]string{"a b", "A-B", "a_b_3", "a  b"}, []string{"a_b_1", "a_b_2", "a_b_3", "a_b_4"}},
		{[]string{"__x__", strings.Repeat("long ", 20)}, []string{"x", "long_long_long_long_long"}},
	}
	for _, test := range tests {
		got := emit.IDs(test.names, "state")
		for i := range got {
			if got[i] != test.want[i] {
				t.Errorf("%q: identifier %q, want %q", test.names[i], got[i], test.want[i])
			}
		}
	}
	for _, test := range []struct{ plant, candidate, want string }{
		{"Tide gate hoist", "quick", "pw_tide_gate_hoist_quick"},
		{"", "", "pw_estimator"}, {"日本", "*/", "pw_estimator"}, {"../../etc", "", "pw_etc"}, {"7up", "int", "pw_7up_int"},
	} {
		if got := emit.PrefixOf(test.plant, test.candidate); got != test.want {
			t.Errorf("prefix of %q, %q: %q, want %q", test.plant, test.candidate, got, test.want)
		}
	}
}

func TestIdentifiersAreValidAndUnique(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		name := rapid.OneOf(rapid.String(), rapid.StringMatching(`[aA][ _]?[bB]?(_[0-9])?`), rapid.StringMatching(`[a-z ]{20,40}`))
		names := rapid.SliceOfN(name, 1, 12).Draw(t, "names")
		seen := map[string]bool{}
		for i, id := range emit.IDs(names, "sensor") {
			if !valid.MatchString(id) || len(id) > 24 || seen[id] {
				t.Fatalf("%q: identifier %q", names[i], id)
			}
			seen[id] = true
		}
	})
}

func TestPlainTextCannotEndAComment(t *testing.T) {
	for text, want := range map[string]string{
		"a */ b":      "a * / b",
		"a *) (* b":   "a * ) ( * b",
		"// x /* y":   "/ / x / * y",
		"??/\\":       "<U+003F><U+003F>/<U+005C>",
		"a\nb\r":      "a<U+000A>b<U+000D>",
		"\u202eabc":   "<U+202E>abc",
		"\x1b[31m":    "<U+001B>[31m",
		"µm/s²":       "um/s^2",
		"\xff":        "<0xFF>",
		`"q" 'r' $ @`: "<U+0022>q<U+0022> <U+0027>r<U+0027> <U+0024> <U+0040>",
	} {
		if got := emit.Plain(text); got != want {
			t.Errorf("%q becomes %q, want %q", text, got, want)
		}
	}
	rapid.Check(t, func(t *rapid.T) {
		piece := rapid.OneOf(rapid.String(), rapid.SampledFrom([]string{"*", "/", "(", ")", "?", "\\", "\n", "*/", "*)"}))
		got := emit.Plain(strings.Join(rapid.SliceOf(piece).Draw(t, "text"), ""))
		for _, bad := range []string{"*/", "/*", "(*", "*)", "//", "?", "\\", "\n", "\"", "'"} {
			if strings.Contains(got, bad) {
				t.Fatalf("%q in %q", bad, got)
			}
		}
		for _, r := range got {
			if r < ' ' || r > '~' {
				t.Fatalf("%q", got)
			}
		}
	})
}

// hostile are texts that must not break out of a comment or a name.
var hostile = []string{
	"*/ int evil(void); /*", "*) evil := 1; (*", "??/\n#error evil", "\\\n", "end_if", "int", "\u202e\u2066evil\u2069",
	"\x00\x1b]0;evil\x07", "=evil()", "evil\",\"x", strings.Repeat("evil*/", 200), "\xff\xfe*/", "//\\", "$'evil'", "{evil}", "#include <evil>",
}

// Every text of a design may be hostile: the code still compiles, passes its
// self-test, and holds printable ASCII only.
func TestHostileTexts(t *testing.T) {
	sources := []emit.Source{}
	for i := 0; i+3 < len(hostile); i += 2 {
		src := gate()
		src.Model.StateNames = []string{hostile[i], hostile[i]}
		src.Model.InputNames = []string{hostile[i+1]}
		src.Model.SensorNames = []string{hostile[i+2]}
		src.States[0].Unit, src.Inputs[0].Unit, src.Sensors[0].Unit = hostile[i+3], hostile[i], hostile[i+1]
		src.Plant, src.Candidate, src.Version = hostile[i+2], hostile[i+1], hostile[i]
		src.PlantSHA256, src.SessionSHA256 = hostile[i], hostile[i+3]
		src.Cautions = []string{hostile[i], hostile[i+1], ""}
		sources = append(sources, src)
	}
	for i, src := range sources {
		for target := emit.C99; target <= emit.CSV; target++ {
			files, err := emit.Emit(src, target)
			if err != nil {
				t.Fatal(err)
			}
			for _, f := range files {
				checkHarmless(t, i, target, f)
			}
			if target == emit.StructuredText {
				checkST(t, files)
			}
			if target == emit.C99 {
				compileHostile(t, files)
			}
		}
	}
}

var fileName = regexp.MustCompile(`^pw(_[a-z0-9]+)+\.(h|c|st|json|csv)$`)

func checkHarmless(t *testing.T, i int, target emit.Target, f emit.File) {
	t.Helper()
	if !fileName.MatchString(f.Name) {
		t.Errorf("design %d: file name %q", i, f.Name)
	}
	for _, r := range string(f.Text) {
		if r == '\n' || target == emit.CSV && (r == '\r' || r > 0x9f && !(r >= 0x2000 && r < 0x2070)) {
			continue
		}
		if r < ' ' || r > '~' {
			t.Errorf("design %d: %s holds %q", i, f.Name, r)
		}
	}
	if target == emit.C99 && strings.Count(string(f.Text), "/*") != strings.Count(string(f.Text), "*/") {
		t.Errorf("design %d: comments of %s do not match", i, f.Name)
	}
}
