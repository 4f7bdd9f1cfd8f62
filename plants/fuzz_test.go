package plants_test

import (
	"errors"
	"strings"
	"testing"

	"polewright/plants"
	"polewright/plants/library"
)

// FuzzParse wants a plant or an *Error of one line that names the file, and from a
// plant a model or an error. Whole-file sizes are bounded to keep it quick.
func FuzzParse(f *testing.F) {
	f.Add(base, false)
	f.Add(strings.Replace(base, "noise_std = 0.01", "noise_std = 0.01\ndelay_samples = 2\nlag_s = 0.1", 1), false)
	f.Add(tank(stepped, "lag_s = 0.25\ndelay_samples = 1", "wrap = 6.28", "[sensor_noise]\ncovariance = [[1]]"), false)
	f.Add(`{"format": 1, "model": {"time": "continuous", "A": [["-1^2"]], "C": [[1]]}}`, true)
	f.Add(`{"format": 1, "model": {"time": "discrete", "period_s": 1e-9, "A": [[1e300]], "B": [[]], "C": [[1]]}}`, true)
	f.Add(strings.Replace(base, "\"-damp/mass\"", "\"-9^9^9^9\"", 1), false)
	f.Add(strings.Repeat("a={", 500), false)
	f.Add(strings.Repeat("[", 2000), true)
	for _, name := range library.Names() {
		text, _, _ := library.Plant(name)
		f.Add(string(text), false)
	}
	f.Fuzz(func(t *testing.T, text string, isJSON bool) {
		if len(text) > 4096 {
			return
		}
		file := "f.toml"
		if isJSON {
			file = "f.json"
		}
		p, err := plants.Parse(file, []byte(text))
		if err != nil {
			var e *plants.Error
			if !errors.As(err, &e) || e.File != file || strings.ContainsAny(err.Error(), "\n\r\x1b\x00") {
				t.Fatalf("%q", err)
			}
			return
		}
		if len(p.States) > 8 {
			return
		}
		m, err := p.Model(plants.Options{})
		if err == nil {
			err = m.Check()
		} else if m != nil {
			t.Error("a model beside an error")
		}
		if strings.Contains(errorText(err), "\n") {
			t.Errorf("%q", err)
		}
	})
}

func errorText(err error) string {
	if err == nil {
		return ""
	}
	return err.Error()
}
