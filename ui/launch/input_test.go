package launch

import "testing"

func TestEscapeBeforeAPasteIsDropped(t *testing.T) {
	for in, want := range map[string]string{
		"":                           "",
		"q":                          "q",
		"\x1b":                       "\x1b",
		"\x1b[A":                     "\x1b[A",
		"\x1b\x1b[A":                 "\x1b\x1b[A",
		"\x1b[200~q\x1b[201~":        "\x1b[200~q\x1b[201~",
		"\x1b\x1b[200~q\x1b[201~":    "\x1b[200~q\x1b[201~",
		"x\x1b\x1b\x1b[200~q":        "x\x1b[200~q",
		"\x1b\x1b[200~a\x1b\x1b[200": "\x1b[200~a\x1b[200",
		"\x1b\x1b[2":                 "\x1b[2",
		"\x1b\x1b[":                  "\x1b\x1b[",
	} {
		p := []byte(in)
		if got := string(p[:dropEscape(p)]); got != want {
			t.Errorf("%q became %q, expected %q", in, got, want)
		}
	}
}
