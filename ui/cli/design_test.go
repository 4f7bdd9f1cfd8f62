package cli_test

import (
	"bytes"
	"encoding/json"
	"math"
	"strings"
	"testing"

	"polewright/plants/library"
	"polewright/ui/cli"
)

func run(t *testing.T, args ...string) (status int, stdout, stderr string) {
	t.Helper()
	var out, errs bytes.Buffer
	status = cli.Run(args, strings.NewReader(""), &out, &errs)
	return status, out.String(), errs.String()
}

func document(t *testing.T, args ...string) map[string]any {
	t.Helper()
	status, out, errs := run(t, append(args, "--json")...)
	if status == 2 || errs != "" && status == 0 {
		t.Fatalf("status %d: %s", status, errs)
	}
	var doc map[string]any
	if err := json.Unmarshal([]byte(out), &doc); err != nil {
		t.Fatal(err)
	}
	return doc
}

// at follows a path like "noise.std.0" and reports whether the key exists.
func at(doc any, path string) (any, bool) {
	for _, key := range strings.Split(path, ".") {
		switch v := doc.(type) {
		case map[string]any:
			next, ok := v[key]
			if !ok {
				return nil, false
			}
			doc = next
		case []any:
			if len(v) == 0 {
				return nil, false
			}
			doc = v[0]
		default:
			return nil, false
		}
	}
	return doc, true
}

func TestDesignPrintsEveryKey(t *testing.T) {
	doc := document(t, "design", "balancer", "--poles", "floor", "--scenario", "push")
	for _, key := range strings.Fields(`format plant.name plant.states plant.sensors plant.inputs plant.time plant.period_s
		model.A model.B model.C model.D model.G model.Q model.R model.state_names
		poles.plane poles.wanted poles.reached poles.eigenvalues poles.worst_relative_error
		gain gain_current gain_norm eigenvector_condition
		observability.rank observability.tolerance observability.modes.0.eigenvalue observability.modes.0.sigma observability.modes.0.observable observability.fixed observability.gramian_eigenvalues
		noise.covariance noise.std noise.floor_covariance noise.floor_std noise.floor_gain noise.floor_poles noise.over_floor noise.over_floor_rms noise.outputs
		noise.sensor_to_state noise.peak_gain.0.value noise.peak_gain.0.rad_per_s transient.settle_s transient.peak
		loop.gain_margin_db loop.phase_margin_deg loop.delay_margin_s loop.delay_margin_samples loop.sensitivity_peak loop.poles loop.input_std
		rounding.float32_pole_shift sensor_sets limits.0.name limits.0.value limits.0.limit limits.0.met warnings`) {
		if _, ok := at(doc, key); !ok {
			t.Errorf("no key %s", key)
		}
	}
	for _, key := range strings.Fields(`gain_norm eigenvector_condition noise.over_floor_rms transient.settle_s transient.peak loop.phase_margin_deg rounding.float32_pole_shift`) {
		if v, _ := at(doc, key); v == nil {
			t.Errorf("%s is null", key)
		}
	}
}

func TestEveryBuiltInPlantCanBeDesignedFor(t *testing.T) {
	for _, name := range library.Names() {
		for _, form := range []string{"prediction", "current"} {
			t.Run(name+" "+form, func(t *testing.T) {
				if name == "twin-drum" && form == "current" {
					t.Skip("a plant in continuous time")
				}
				doc := document(t, "design", name, "--poles", "floor", "--form", form)
				rms, _ := at(doc, "noise.over_floor_rms")
				v, ok := rms.(float64)
				if !ok || v < 1-1e-6 || math.IsInf(v, 0) {
					t.Errorf("noise over the floor is %v", rms)
				}
				if e, _ := at(doc, "poles.worst_relative_error"); e.(float64) > 1e-3 {
					t.Errorf("poles are off by %v", e)
				}
			})
		}
	}
}

func TestRecordedLimitsDecideTheStatus(t *testing.T) {
	if status, out, _ := run(t, "design", "lift", "--poles", "equal@1", "--scenario", "start"); status != 1 || !strings.Contains(out, "NOT MET") {
		t.Errorf("a far too slow estimator: status %d\n%s", status, out)
	}
}
