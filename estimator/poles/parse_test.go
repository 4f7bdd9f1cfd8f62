package poles_test

import (
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"

	"polewright/estimator/poles"
)

func TestParseLists(t *testing.T) {
	for text, want := range map[string][]complex128{
		"-4±3i, -6, -8x2":       {-4 + 3i, -4 - 3i, -6, -8, -8},
		"-4+-3i":                {-4 + 3i, -4 - 3i},
		"-4+-3j":                {-4 + 3i, -4 - 3i},
		"−4 ± 3 i":              {-4 + 3i, -4 - 3i},
		"-4-3i, -4+3i":          {-4 - 3i, -4 + 3i},
		"-4+3i x2, -4-3ix2":     {-4 + 3i, -4 + 3i, -4 - 3i, -4 - 3i},
		"i,-i":                  {1i, -1i},
		"2j, −2j":               {2i, -2i},
		"±2i":                   {2i, -2i},
		"+-i":                   {1i, -1i},
		"1e-05":                 {1e-05},
		"-1E+2, .5, 5.":         {-100, 0.5, 5},
		"-1e−3±2e-05i x3":       {-1e-3 + 2e-5i, -1e-3 - 2e-5i, -1e-3 + 2e-5i, -1e-3 - 2e-5i, -1e-3 + 2e-5i, -1e-3 - 2e-5i},
		"0x2":                   {0, 0},
		"-0":                    {0},
		"3±0i":                  {3, 3},
		"10@0.6":                {-6 + 8i, -6 - 8i},
		"10@0":                  {10i, -10i},
		"10@-0.6":               {6 + 8i, 6 - 8i},
		"2@1":                   {-2, -2},
		"4@1.25x2":              {-8, -2, -8, -2},
		"  -1 ,\t-2 ":           {-1, -2},
		"-4+1e-3i,-4-0.001i":    {-4 + 1e-3i, -4 - 1e-3i},
		"-1X3":                  {-1, -1, -1},
		"0.9±0.1i, 0.5, 0, 0x1": {0.9 + 0.1i, 0.9 - 0.1i, 0.5, 0, 0},
	} {
		spec, err := poles.Parse(text)
		if err != nil {
			t.Errorf("%q: %v", text, err)
			continue
		}
		if diff := cmp.Diff(want, spec.Poles); diff != "" || spec.Kind != poles.List {
			t.Errorf("%q: %v %s", text, spec.Kind, diff)
		}
	}
}

func TestParseMarksFrequencyAndDamping(t *testing.T) {
	spec, err := poles.Parse("0.5, 10@0.6, 0.25x2, 3@2")
	if err != nil {
		t.Fatal(err)
	}
	want := []bool{false, true, true, false, false, true, true}
	if diff := cmp.Diff(want, spec.InS); diff != "" {
		t.Error(diff)
	}
	if spec, err := poles.Parse("0.5x2"); err != nil || spec.InS != nil {
		t.Errorf("%v, %v", spec, err)
	}
}

func TestParsePatterns(t *testing.T) {
	for text, want := range map[string]poles.Spec{
		"butterworth@20":   {Kind: poles.Butterworth, Value: 20},
		" Bessel @ 1e2 ":   {Kind: poles.Bessel, Value: 100},
		"equal@.5":         {Kind: poles.Equal, Value: 0.5},
		"plant*3":          {Kind: poles.Plant, Value: 3},
		"controller * 2.5": {Kind: poles.Controller, Value: 2.5},
		"floor":            {Kind: poles.Floor},
	} {
		spec, err := poles.Parse(text)
		if err != nil {
			t.Errorf("%q: %v", text, err)
			continue
		}
		if diff := cmp.Diff(want, *spec); diff != "" {
			t.Errorf("%q: %s", text, diff)
		}
		again, err := poles.Parse(spec.String())
		if err != nil || cmp.Diff(spec, again) != "" {
			t.Errorf("%q reads back from %q as %v, %v", text, spec, again, err)
		}
	}
}

// badLists holds what is refused and the exact words.
var badLists = [][2]string{
	{"", "the list is empty; expected poles like -4±3i, -6 or a pattern like butterworth@20"},
	{" \t", "the list is empty; expected poles like -4±3i, -6 or a pattern like butterworth@20"},
	{"-1,,-2", `entry 2 "": empty; expected a pole like -6 or a pair like -4±3i`},
	{"-1,", `entry 2 "": empty; expected a pole like -6 or a pair like -4±3i`},
	{"-4+3i", `pole -4+3i: its conjugate is missing; expected the pair -4±3i`},
	{"-4+3i, -4-3i x2", `pole -4-3i: its conjugate is missing; expected the pair -4±3i`},
	{"i", `pole 1i: its conjugate is missing; expected the pair ±1i`},
	{"-4±3", `entry 1 "-4±3": the part after ± has no i; expected a pair like -4±3i`},
	{"±", `entry 1 "±": it ends too early; expected a number`},
	{"-4+3", `entry 1 "-4+3": the second part has no i; expected a pair like -4±3i`},
	{"-4±-3i", `entry 1 "-4±-3i": two signs; expected a pair like -4±3i`},
	{"fast", `entry 1 "fast": not a pole; expected a number, a pair like -4±3i, or frequency@damping like 10@0.7`},
	{"-1, nan", `entry 2 "nan": not a pole; expected a number, a pair like -4±3i, or frequency@damping like 10@0.7`},
	{"inf", `entry 1 "inf": not a pole; expected a number, a pair like -4±3i, or frequency@damping like 10@0.7`},
	{"--4", `entry 1 "--4": not a pole; expected a number, a pair like -4±3i, or frequency@damping like 10@0.7`},
	{"-", `entry 1 "-": it ends too early; expected a number`},
	{"1e", `entry 1 "1e": the exponent has no digits; expected a number like 1e-05`},
	{"1e999", `entry 1 "1e999": the number is too large; expected a finite number`},
	{"1e300@1e300", `entry 1 "1e300@1e300": the pole is not finite; expected a smaller number`},
	{"-8x", `entry 1 "-8x": the repeat is no count; expected x1 to x200`},
	{"-8x0", `entry 1 "-8x0": the repeat is no count; expected x1 to x200`},
	{"-8x-2", `entry 1 "-8x-2": the repeat is no count; expected x1 to x200`},
	{"-8x201", `entry 1 "-8x201": the repeat is too large; expected x1 to x200`},
	{"-8x99999999999999999999", `entry 1 "-8x99999999999999999999": the repeat is too large; expected x1 to x200`},
	{"-1±1i x150", `entry 1 "-1±1i x150": more than 200 poles; expected at most 200`},
	{"-1x200, -2", `entry 2 "-2": more than 200 poles; expected at most 200`},
	{"-8 7", `entry 1 "-8 7": unexpected "7"; expected a comma or the end of the list`},
	{"-8x2x2", `entry 1 "-8x2x2": unexpected "x2"; expected a comma or the end of the list`},
	{"0@0.7", `entry 1 "0@0.7": the natural frequency is not above zero; expected frequency@damping like 10@0.7`},
	{"10@", `entry 1 "10@": it ends too early; expected a number`},
	{"-1\n\x1b[2J", `entry 1 "-1\n\x1b[2J": unexpected "\x1b[2J"; expected a comma or the end of the list`},
	{"butterworth", `"butterworth": the pattern lacks its @; expected butterworth@W with W in rad/s, like butterworth@20`},
	{"plant@3", `"plant@3": the pattern lacks its *; expected plant*K with a factor K, like plant*3`},
	{"bessel@-3", `"bessel@-3": the value is not above zero; expected bessel@W with W in rad/s, like bessel@20`},
	{"bessel@3, -4", `"bessel@3, -4": a pattern stands alone; expected bessel@W with W in rad/s, like bessel@20`},
	{"equal@3i", `"equal@3i": unexpected "i"; expected equal@W with W in rad/s, like equal@20`},
	{"controller*x", `"controller*x": not a pole; expected a number, a pair like -4±3i, or frequency@damping like 10@0.7`},
	{"floor, -1", `"floor, -1": a pattern stands alone; expected floor`},
	{"-1, floor", `entry 2 "floor": not a pole; expected a number, a pair like -4±3i, or frequency@damping like 10@0.7`},
}

func TestParseRefuses(t *testing.T) {
	for _, c := range badLists {
		spec, err := poles.Parse(c[0])
		if err == nil {
			t.Errorf("%q reads as %v", c[0], spec)
			continue
		}
		if diff := cmp.Diff(c[1], err.Error()); diff != "" {
			t.Errorf("%q: %s", c[0], diff)
		}
	}
}

func TestParseRefusesLongTextBriefly(t *testing.T) {
	for _, text := range []string{strings.Repeat("-1,", 1e6), strings.Repeat("9", 1e6), strings.Repeat("±", 1e6), strings.Repeat(" ", 1e5) + "?"} {
		if _, err := poles.Parse(text); err == nil || len(err.Error()) > 400 || strings.Contains(err.Error(), "\n") {
			t.Errorf("%d bytes: %v", len(text), err)
		}
	}
}

func TestParseOne(t *testing.T) {
	for text, want := range map[string][]complex128{"-6": {-6}, " -4±3i": {-4 + 3i, -4 - 3i}, "10@0.6": {-6 + 8i, -6 - 8i}, "2@1": {-2, -2}} {
		if have, err := poles.ParseOne(text); err != nil || cmp.Diff(want, have) != "" {
			t.Errorf("%q: %v, %v", text, have, err)
		}
	}
	for text, want := range map[string]string{
		"":       `"": empty; expected a pole like -6 or a pair like -4±3i`,
		"-6x2":   `"-6x2": a repeat has no meaning here; expected one place`,
		"-4+3i":  `pole -4+3i: its conjugate is missing; expected the pair -4±3i`,
		"-6, -7": `"-6, -7": unexpected ", -7"; expected a comma or the end of the list`,
	} {
		if have, err := poles.ParseOne(text); err == nil || err.Error() != want {
			t.Errorf("%q: %v, %v", text, have, err)
		}
	}
}

func FuzzParse(f *testing.F) {
	for _, c := range badLists {
		f.Add(c[0])
	}
	for _, text := range []string{"-4±3i, -6, -8x2", "10@0.7, i, -i", "1e-05±2e+05j x3", "butterworth@3", "plant*2", "floor", "4@1.25"} {
		f.Add(text)
	}
	f.Fuzz(func(t *testing.T, text string) {
		spec, err := poles.Parse(text)
		if err != nil {
			if spec != nil || strings.ContainsAny(err.Error(), "\n\r\x1b") {
				t.Fatalf("%q: %v, %q", text, spec, err)
			}
			return
		}
		if len(spec.Poles) > poles.Max || poles.ConjugateClosed(spec.Poles) != nil {
			t.Fatalf("%q: %v", text, spec.Poles)
		}
		once := spec.String()
		again, err := poles.Parse(once)
		if err != nil {
			t.Fatalf("%q: %q does not read back: %v", text, once, err)
		}
		if twice := again.String(); twice != once {
			t.Fatalf("%q: %q reads back as %q", text, once, twice)
		}
		sameMultiset(t, spec.Poles, again.Poles)
	})
}

type reporter interface {
	Helper()
	Fatalf(format string, args ...any)
}

func sameMultiset(t reporter, a, b []complex128) {
	t.Helper()
	count := map[complex128]int{}
	for _, v := range a {
		count[v]++
	}
	for _, v := range b {
		count[v]--
	}
	for v, n := range count {
		if n != 0 {
			t.Fatalf("%v and %v differ at %v", a, b, v)
		}
	}
}
