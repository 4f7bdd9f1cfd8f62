package cli_test

import (
	"encoding/csv"
	"encoding/json"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
)

// Two sensors, one of them lost for a while, an operating point away from zero.
const carts = `
format = 1
name = "Two carts on a rail"
[model]
time = "continuous"
period_s = 0.01
A = [[0, 1, 0, 0], [-40, -1.5, 40, 0], [0, 0, 0, 1], [30, 0, -30, -2]]
B = [[0], [2], [0], [0]]
C = [[1, 0, 0, 0], [0, 0, 1, 0]]
G = [[0, 0], [1, 0], [0, 0], [0, 1]]
[operating_point]
states = [0.5, 0, 1.5, 0]
inputs = [3.0]
sensors = [0.5, 1.5]
[[states]]
name = "near"
[[states]]
name = "near speed"
[[states]]
name = "far"
[[states]]
name = "far speed"
[[inputs]]
name = "pull"
[[sensors]]
name = "near tape"
noise_std = 0.002
[[sensors]]
name = "far tape"
noise_std = 0.004
[process_noise]
density = [0.04, 0.09]
`

const pull = `
format = 1
name = "Pull"
duration_s = 20
loop = "open"
[[drive]]
input = "pull"
shape = "step"
at_s = 1.005
size = 0.5
[[fault]]
sensor = "far tape"
kind = "dropout"
from_s = 7.0
until_s = 7.25
[noise]
seed = 3
`

func write(t *testing.T, dir, name, text string) string {
	t.Helper()
	path := filepath.Join(dir, name)
	if err := os.WriteFile(path, []byte(text), 0o600); err != nil {
		t.Fatal(err)
	}
	return path
}

// table is a CSV file by columns; an empty field is NaN.
func table(t *testing.T, path string) map[string][]float64 {
	t.Helper()
	f, err := os.Open(path)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	rows, err := csv.NewReader(f).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	out := map[string][]float64{}
	for _, row := range rows[1:] {
		for i, field := range row {
			v := math.NaN()
			if field != "" {
				if v, err = strconv.ParseFloat(field, 64); err != nil {
					t.Fatal(err)
				}
			}
			out[rows[0][i]] = append(out[rows[0][i]], v)
		}
	}
	return out
}

func must(t *testing.T, args ...string) string {
	t.Helper()
	status, out, errs := run(t, args...)
	if status != 0 {
		t.Fatalf("%s: status %d: %s", strings.Join(args, " "), status, errs)
	}
	return out
}

// What a simulated run measured, written as a log, gives the same innovations and
// estimates again.
func TestReplayOfASimulatedLog(t *testing.T) {
	states, sensors := []string{"near", "near speed", "far", "far speed"}, []string{"near tape", "far tape"}
	operating, seen := []float64{0.5, 0, 1.5, 0}, []int{0, 2}
	for _, form := range []string{"prediction", "current"} {
		t.Run(form, func(t *testing.T) {
			dir := t.TempDir()
			plant, scenario := write(t, dir, "carts.toml", carts), write(t, dir, "pull.toml", pull)
			runFile, logFile, outFile := filepath.Join(dir, "run.csv"), filepath.Join(dir, "log.csv"), filepath.Join(dir, "out.csv")
			design := []string{plant, "--poles", "-8±4i, -6±3i", "--form", form}
			must(t, append([]string{"simulate", "--scenario", scenario, "--out", runFile}, design...)...)
			var doc struct {
				Current [][]float64 `json:"gain_current"`
			}
			if err := json.Unmarshal([]byte(must(t, append([]string{"design", "--json"}, design...)...)), &doc); err != nil {
				t.Fatal(err)
			}
			made := table(t, runFile)
			for k, e := range made["far tape innovation"] {
				if e == 0 { // how a run shows a lost sample
					made["far tape innovation"][k] = math.NaN()
				}
			}
			innovation := func(j, k int) float64 { return made[sensors[j]+" innovation"][k] }
			var text strings.Builder
			fmt.Fprintln(&text, "t,pull,near tape,far tape,far speed")
			for k, at := range made["t"] {
				u := 3.0
				if at >= 1.005 {
					u = 3.5
				}
				fmt.Fprintf(&text, "%v,%v", at, u)
				for j, i := range seen {
					// y = e + C x̂[k|k−1], where current form gives x̂[k|k] = x̂[k|k−1] + Lf e.
					x := made[states[i]][k] - operating[i]
					if form == "current" {
						for s := range sensors {
							if e := innovation(s, k); e == e {
								x -= doc.Current[i][s] * e
							}
						}
					}
					fmt.Fprintf(&text, ",%v", innovation(j, k)+x+operating[i])
				}
				fmt.Fprintf(&text, ",%v\n", made["true far speed"][k])
			}
			write(t, dir, "log.csv", text.String())
			out := must(t, append([]string{"replay", "--log", logFile, "--out", outFile, "--skip", "12", "--json"}, design...)...)
			again := table(t, outFile)
			for _, name := range append([]string{"near tape innovation", "far tape innovation"}, states...) {
				worst := 0.0
				for k, v := range made[name] {
					if (v != v) != (again[name][k] != again[name][k]) {
						t.Fatalf("%s, row %d: %g, simulated %g", name, k, again[name][k], v)
					}
					if d := math.Abs(v - again[name][k]); d > worst {
						worst = d
					}
				}
				// Rounding of the numbers in the log, passed on by a stable estimator.
				if worst > 1e-13 || len(made[name]) != 2001 || len(again[name]) != 2001 {
					t.Errorf("%s: off by up to %g over %d and %d rows", name, worst, len(made[name]), len(again[name]))
				}
			}
			compareReplay(t, out, made)
		})
	}
}

// compareReplay holds the printed figures against plain sums over the simulated run.
func compareReplay(t *testing.T, out string, made map[string][]float64) {
	t.Helper()
	var doc struct {
		Samples, Counted int
		Lost             []int
		Innovations      []struct{ Mean, Std float64 }
		Reference        []struct {
			Name      string
			Rms, Bias float64
		}
		Whiteness []struct{ Lags int }
	}
	if err := json.Unmarshal([]byte(out), &doc); err != nil {
		t.Fatal(err)
	}
	if doc.Samples != 2001 || doc.Counted != 801 || len(doc.Lost) != 2 || doc.Lost[0] != 0 || doc.Lost[1] != 25 || len(doc.Whiteness) != 2 || doc.Whiteness[0].Lags != 20 {
		t.Errorf("%d samples, %d counted, %v lost, %v", doc.Samples, doc.Counted, doc.Lost, doc.Whiteness)
	}
	if len(doc.Reference) != 1 || doc.Reference[0].Name != "far speed" || len(doc.Innovations) != 2 {
		t.Fatalf("references %v, innovations %v", doc.Reference, doc.Innovations)
	}
	moments := func(f func(k int) float64) (mean, square float64) {
		for k := 1200; k < 2001; k++ {
			mean += f(k) / 801
			square += f(k) * f(k) / 801
		}
		return mean, square
	}
	same := func(what string, have, want float64) {
		t.Helper()
		if !(math.Abs(have-want) <= 1e-9*math.Abs(want)) {
			t.Errorf("%s: %.12g, want %.12g", what, have, want)
		}
	}
	bias, square := moments(func(k int) float64 { return made["far speed"][k] - made["true far speed"][k] })
	same("bias", doc.Reference[0].Bias, bias)
	same("rms", doc.Reference[0].Rms, math.Sqrt(square))
	mean, square := moments(func(k int) float64 { return made["near tape innovation"][k] })
	same("mean", doc.Innovations[0].Mean, mean)
	same("std", doc.Innovations[0].Std, math.Sqrt(square-mean*mean))
}

// Every key of the replay document is there.
func TestReplayPrintsEveryKey(t *testing.T) {
	dir := t.TempDir()
	plant := write(t, dir, "carts.toml", carts)
	var text strings.Builder
	fmt.Fprintln(&text, "t,pull,near tape,far tape,near")
	for k := range 200 {
		fmt.Fprintf(&text, "%g,3,%g,%g,0.5\n", float64(k)*0.01, 0.5+0.001*float64(k*k%7), 1.5+0.002*float64(k*k%5))
	}
	doc := document(t, "replay", plant, "--poles", "floor", "--log", write(t, dir, "log.csv", text.String()))
	for _, key := range strings.Fields(`format plant form log.file log.rows log.start_s log.end_s log.ignored_columns samples counted missing_rows held_inputs lost
		period_s period_jitter resampled innovations.name innovations.unit innovations.mean innovations.std innovations.std_expected
		innovations.autocorrelation innovations.autocorrelation_expected whiteness.lags whiteness.q whiteness.p whiteness.effect_size
		nis_mean nis_low nis_high reference.name reference.rms reference.bias noise_figures.process_factor noise_figures.sensor_variance.value
		noise_figures.sensor_variance_model warnings caution`) {
		if _, ok := at(doc, key); !ok {
			t.Errorf("no %s", key)
		}
	}
}

// The level of the Nile with the variances of Durbin & Koopman, "Time Series
// Analysis by State Space Methods": 15099 of the observations, 1469.1 of the level.
const nile = `
format = 1
name = "Level of the Nile at Aswan"
[model]
time = "discrete"
period_s = 1.0 # one row per year, time counted in years
A = [[1]]
C = [[1]]
[operating_point]
states = [1120]
sensors = [1120]
[[states]]
name = "level"
[[sensors]]
name = "flow"
noise_std = 122.87798826478244 # sqrt(15099)
[process_noise]
std = [38.328840317953]        # sqrt(1469.1)
`

// A hundred years of a real river do not contradict the published variances.
func TestReplayOfTheNile(t *testing.T) {
	plant := write(t, t.TempDir(), "nile.toml", nile)
	log := filepath.Join("..", "..", "scenarios", "logs", "testdata", "nile.csv")
	args := []string{"replay", plant, "--poles", "floor", "--log", log, "--map", "year=t", "--map", "volume=flow", "--start", "first-sample", "--skip", "0"}
	out := must(t, args...)
	for _, want := range []string{"nothing speaks against white", "can explain this log"} {
		if !strings.Contains(out, want) {
			t.Errorf("no %q in\n%s", want, out)
		}
	}
	var doc struct {
		Innovations []struct {
			StdExpected float64 `json:"std_expected"`
		}
		Whiteness []struct{ P float64 }
		Noise     struct {
			Process struct{ Low, High float64 }   `json:"process_factor"`
			Sensor  []struct{ Low, High float64 } `json:"sensor_variance"`
		} `json:"noise_figures"`
	}
	if err := json.Unmarshal([]byte(must(t, append(args, "--json")...)), &doc); err != nil {
		t.Fatal(err)
	}
	// The steady variance of the innovations is 20600 in their figure 2.1 (from
	// memory), p + 15099 with p = (1469.1 + √(1469.1² + 4·1469.1·15099))/2.
	p := (1469.1 + math.Sqrt(1469.1*1469.1+4*1469.1*15099)) / 2
	if v := doc.Innovations[0].StdExpected; math.Abs(v*v/(p+15099)-1) > 1e-9 || math.Abs(v*v-20600) > 50 {
		t.Errorf("expected variance of the innovations %g", v*v)
	}
	if doc.Whiteness[0].P < 0.05 {
		t.Errorf("whiteness rejected with p = %g", doc.Whiteness[0].P)
	}
	n := doc.Noise
	if !(n.Process.Low < 1 && 1 < n.Process.High) || !(n.Sensor[0].Low < 15099 && 15099 < n.Sensor[0].High) {
		t.Errorf("the log contradicts the published variances: %+v", n)
	}
}
