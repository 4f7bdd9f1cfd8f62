package logs_test

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"polewright/plants"
	"polewright/scenarios/logs"
)

// hoist is the layout of the tests: one input, two sensors, two states.
func hoist() *logs.Layout {
	return &logs.Layout{
		Period:  0.01,
		Inputs:  []logs.Signal{{Name: "cable force", Operating: 4100}},
		Sensors: []logs.Signal{{Name: "rail encoder", Operating: 1.2}, {Name: "gyro", Wrap: 2 * math.Pi}},
		States:  []logs.Signal{{Name: "gate position", Operating: 1.2}, {Name: "gate speed"}},
	}
}

const header = "t,cable force,rail encoder,gyro\n"

func TestBadLogs(t *testing.T) {
	good := "0,4100,1.2,0\n0.01,4100,1.2,0\n"
	for _, c := range []struct {
		name, text, want string
		opt              logs.Options
	}{
		{name: "empty", want: `the file is empty; expected a header line with "t", "cable force", "rail encoder", "gyro"`},
		{name: "blank lines", text: "\n\n", want: `the file is empty; expected a header line with "t", "cable force", "rail encoder", "gyro"`},
		{name: "no header", text: "0,4100,1.2,0\n0.01,4100,1.2,0\n", want: `line 1: no header, only numbers; expected a header line with "t", "cable force", "rail encoder", "gyro"`},
		{name: "no rows", text: header, want: "0 rows below the header; expected at least 2"},
		{name: "one row", text: header + "0,4100,1.2,0\n", want: "1 row below the header; expected at least 2"},
		{name: "unknown column", text: "t,cable force,rail encoder,gyro,temp\n", want: `header: unknown column "temp"; expected "t", "cable force", "rail encoder", "gyro" or a state's name; --map "temp=NAME" renames a column, "temp=" leaves it out, "*=" all such`},
		{name: "unknown target", text: header, opt: logs.Options{Names: map[string]string{"gyro": "giro"}}, want: `header: column "gyro" is renamed to "giro", which the plant does not have; expected "t", "cable force", "rail encoder", "gyro" or a state's name; --map "gyro=NAME" renames a column, "gyro=" leaves it out, "*=" all such`},
		{name: "nothing to rename", text: header, opt: logs.Options{Names: map[string]string{"giro": "gyro"}}, want: `header: no column "giro" to rename; the log has "t", "cable force", "rail encoder", "gyro"`},
		{name: "all others renamed", text: header, opt: logs.Options{Names: map[string]string{"*": "gyro"}}, want: `header: all other columns renamed to "gyro"; expected "*=", which leaves them out`},
		{name: "twice", text: "t,cable force,rail encoder,gyro,gyro\n", want: `header: two columns for "gyro": "gyro" and "gyro"; expected one`},
		{name: "twice by name", text: "t,cable force,rail encoder,gyro,g2\n", opt: logs.Options{Names: map[string]string{"g2": "gyro"}}, want: `header: two columns for "gyro": "gyro" and "g2"; expected one`},
		{name: "missing", text: "t,cable force,gyro\n", want: `header: no column "rail encoder"; expected "t", "cable force", "rail encoder", "gyro"`},
		{name: "missing time", text: "time,cable force,rail encoder,gyro\n", opt: logs.Options{Names: map[string]string{"time": ""}}, want: `header: no column "t"; expected "t", "cable force", "rail encoder", "gyro"`},
		{name: "semicolons", text: "t;cable force;rail encoder;gyro\n", want: "line 1: the columns are not separated by commas; expected commas between columns and a point in numbers"},
		{name: "text", text: header + good[:13] + "0.01,4100,1.2m,0\n", want: `line 3, column "rail encoder": "1.2m"; expected a number, nothing or NaN`},
		{name: "infinity", text: header + "0,4100,1.2,-inf\n", want: `line 2, column "gyro": "-inf"; expected a number, nothing or NaN`},
		{name: "hexadecimal", text: header + "0,0x10,1.2,0\n", want: `line 2, column "cable force": "0x10"; expected a number, nothing or NaN`},
		{name: "too large", text: header + "0,1e999,1.2,0\n", want: `line 2, column "cable force": "1e999"; expected a number, nothing or NaN`},
		{name: "text in time", text: header + "12:30,4100,1.2,0\n", want: `line 2, column "t": "12:30"; expected seconds as a number`},
		{name: "no time", text: header + ",4100,1.2,0\n", want: `line 2, column "t": no time; expected seconds in every row`},
		{name: "renamed time", text: "clock" + header[1:] + good + "0.005,0,0,0\n", opt: logs.Options{Names: map[string]string{"clock": "t"}}, want: `line 4, column "clock": 0.005 s after 0.01 s; expected a later time in every row`},
		{name: "equal time", text: header + good + "\n0.01,0,0,0\n", want: `line 5, column "t": 0.01 s after 0.01 s; expected a later time in every row`},
		{name: "too few fields", text: header + "0,4100,1.2\n", want: "line 2: 3 fields; expected 4 as in the header"},
		{name: "one field", text: header + "0\n", want: "line 2: 1 field; expected 4 as in the header"},
		{name: "too many fields", text: header + good + "0.02,4100,1.2,0,\n", want: "line 4: 5 fields; expected 4 as in the header"},
		{name: "stray quote", text: header + "0,41\"00,1.2,\"0\n", want: "line 2: a quote that is not closed or stands inside a field; expected quotes around a whole field, doubled inside it"},
		{name: "open quote", text: header + "0,\"4100,1.2,0\n", want: "line 2: a quote that is not closed or stands inside a field; expected quotes around a whole field, doubled inside it"},
		{name: "behind a quote", text: header + "0,\"4100\"x,1.2,0\n", want: "line 2: a quote that is not closed or stands inside a field; expected quotes around a whole field, doubled inside it"},
		{name: "binary", text: "\x7fELF\x02\x01\x00\x00\x00\n\x00\x00", want: "line 1: bytes that are no text; expected a CSV file"},
		{name: "binary without lines", text: strings.Repeat("\x00", 3<<20), want: "line 1: bytes that are no text; expected a CSV file"},
		{name: "binary below", text: header + good + "0.02,\x00,1,1\n", want: "line 4: bytes that are no text; expected a CSV file"},
		{name: "UTF-16", text: "\xff\xfet\x00,\x00\n\x00", want: "line 1: the text is UTF-16; expected UTF-8"},
		{name: "long line", text: header + strings.Repeat("1", 3<<20), want: "line 2: longer than 1 MiB; expected shorter lines"},
		{name: "long header", text: strings.Repeat("a,", 1<<20), want: "line 1: longer than 1 MiB; expected shorter lines"},
		{name: "another rate", text: header + "0,0,0,0\n0.02,0,0,0\n0.04,0,0,0\n", want: `column "t": a row every 0.02 s, but the design's period is 0.01 s; expected the same within 1 %: design for the log's period (period_s, or --period 0.02 for a continuous plant), or hold its last values on the design's (--resample)`},
		{name: "gap", text: header + good + "1e300,0,0,0\n", want: "line 4: a gap of 1e+300 s; expected at most 1000000 sample periods; cut the log there"},
		{name: "gap on a grid", text: header + good + "1e6,0,0,0\n", opt: logs.Options{Resample: true}, want: "line 4: a gap of 1e+06 s; expected at most 1000000 sample periods; cut the log there"},
		{name: "lag", text: header + good, opt: logs.Options{InputLag: 10001}, want: "input lag: 10001 rows; expected at most 10000 either way"},
		{name: "control characters", text: "t,\x1b[2J\n", want: `header: unknown column "\x1b[2J"; expected "t", "cable force", "rail encoder", "gyro" or a state's name; --map "\x1b[2J=NAME" renames a column, "\x1b[2J=" leaves it out, "*=" all such`},
	} {
		t.Run(c.name, func(t *testing.T) {
			c.opt.File = "run.csv"
			_, err := logs.Open(context.Background(), strings.NewReader(c.text), hoist(), c.opt)
			var bad *plants.Error
			if !errors.As(err, &bad) {
				t.Fatalf("error %v", err)
			}
			if want := "run.csv: " + c.want; err.Error() != want {
				t.Errorf("\nhave %s\nwant %s", err, want)
			}
		})
	}
}

// take collects the samples of a log.
func take(t testing.TB, log logs.Recording) []logs.Sample {
	t.Helper()
	source, err := log.Samples()
	if err != nil {
		t.Fatal(err)
	}
	var list []logs.Sample
	for {
		s, err := source.Next()
		if err == io.EOF {
			return list
		}
		if err != nil {
			t.Fatal(err)
		}
		c := *s
		c.U, c.Y, c.Reference = append([]float64(nil), s.U...), append([]float64(nil), s.Y...), append([]float64(nil), s.Reference...)
		list = append(list, c)
	}
}

func same(a, b float64) bool { return math.Abs(a-b) < 1e-14 || a != a && b != b }

func expectSamples(t *testing.T, have, want []logs.Sample) {
	t.Helper()
	if len(have) != len(want) {
		t.Fatalf("%d samples, want %d", len(have), len(want))
	}
	for k := range want {
		h, w := have[k], want[k]
		ok := math.Abs(h.T-w.T) < 1e-12 && h.Missing == w.Missing && h.Held == w.Held && len(h.Reference) == len(w.Reference)
		for i := range w.U {
			ok = ok && same(h.U[i], w.U[i])
		}
		for i := range w.Y {
			ok = ok && same(h.Y[i], w.Y[i])
		}
		for i := range w.Reference {
			ok = ok && same(h.Reference[i], w.Reference[i])
		}
		if !ok {
			t.Errorf("sample %d: %+v, want %+v", k, h, w)
		}
	}
}

var nan = math.NaN()

func TestReading(t *testing.T) {
	// A byte order mark, quotes, CRLF, empty lines, another order of the columns,
	// a column left out, a reference, space, lost fields and no line end at the end.
	text := "\xef\xbb\xbf\"t\",\"gyro\",\"co\"\"mment\",rail encoder,gate position,\"force, N\"\r\n" +
		"0,.5,\"a\nb\",1.7,1.25,4200\r\n\r\n" +
		"1e-2, +1.5e0 ,,NaN,,\r\n" +
		"0.02,,,1.200,nan,\"4099\"\r\n" +
		"0.05,-7,x,2.2,1.2,4100"
	log := openText(t, hoist(), text, logs.Options{Names: map[string]string{`co"mment`: "", "force, N": "cable force"}})
	expectSamples(t, take(t, log), []logs.Sample{
		{T: 0, U: []float64{100}, Y: []float64{0.5, 0.5}, Reference: []float64{1.25 - 1.2}},
		{T: 0.01, U: []float64{100}, Y: []float64{nan, 1.5}, Reference: []float64{nan}, Held: true},
		{T: 0.02, U: []float64{-1}, Y: []float64{0, nan}, Reference: []float64{nan}},
		{T: 0.05, U: []float64{0}, Y: []float64{2.2 - 1.2, -7}, Reference: []float64{0}, Missing: 2},
	})
	v := log.Survey()
	if v.Rows != 4 || v.Samples != 4 || v.Missing != 2 || v.Held != 1 || v.Lost[0] != 1 || v.Lost[1] != 1 {
		t.Errorf("survey %+v", v)
	}
	if math.Abs(v.Period-0.01) > 1e-15 || v.Jitter > 1e-12 || v.Start != 0 || v.End != 0.05 {
		t.Errorf("survey %+v", v)
	}
	if len(v.References) != 1 || v.References[0].Name != "gate position" {
		t.Errorf("references %+v", v.References)
	}
	if again := take(t, log); len(again) != 4 {
		t.Errorf("%d samples when read again", len(again))
	}
}

func TestOtherColumns(t *testing.T) {
	text := "note,t,cable force,temp,rail encoder,gyro\nx,0,4100,y,1.2,0\n,0.01,4100,,1.2,1\n"
	log := openText(t, hoist(), text, logs.Options{Names: map[string]string{"*": ""}})
	if have := log.Survey().PassedOver; !slices.Equal(have, []string{"note", "temp"}) {
		t.Errorf("passed over %q", have)
	}
	expectSamples(t, take(t, log), []logs.Sample{{U: []float64{0}, Y: []float64{0, 0}}, {T: 0.01, U: []float64{0}, Y: []float64{0, 1}}})
}

func TestInputLag(t *testing.T) {
	text := header + "0,4101,0,0\n0.01,4102,0,0\n0.02,4103,0,0\n0.03,4104,0,0\n"
	for lag, want := range map[int][]float64{0: {1, 2, 3, 4}, 1: {1, 1, 2, 3}, 2: {1, 1, 1, 2}, 9: {1, 1, 1, 1}, -1: {2, 3, 4, 4}, -3: {4, 4, 4, 4}, -9: {4, 4, 4, 4}} {
		have := take(t, openText(t, hoist(), text, logs.Options{InputLag: lag}))
		if len(have) != 4 {
			t.Fatalf("lag %d: %d samples", lag, len(have))
		}
		for k, s := range have {
			if s.U[0] != want[k] || math.Abs(s.T-float64(k)/100) > 1e-15 {
				t.Errorf("lag %d, row %d: input %g at %g s, want %g", lag, k, s.U[0], s.T, want[k])
			}
		}
	}
}

func TestResample(t *testing.T) {
	// A row every 4 ms on a grid of 10 ms; then half a second without rows.
	var text strings.Builder
	text.WriteString(header)
	for _, row := range []string{"0,1", "0.004,2", "0.008,3", "0.012,4", "0.016,5", "0.020,6", "0.024,7", "0.524,8"} {
		at, v, _ := strings.Cut(row, ",")
		text.WriteString(at + ",4100," + v + "," + v + "\n")
	}
	log := openText(t, hoist(), text.String(), logs.Options{Resample: true})
	have := take(t, log)
	if v := log.Survey(); v.Samples != int64(len(have)) || len(have) != 53 || !v.Resampled {
		t.Fatalf("%d samples, survey %+v", len(have), v)
	}
	for k, want := range map[int]float64{0: 1, 1: 3, 2: 6, 3: 7, 4: 7, 6: 7, 7: nan, 20: nan, 52: nan} {
		if s := have[k]; !same(s.Y[1], want) || math.Abs(s.T-float64(k)/100) > 1e-12 {
			t.Errorf("instant %d: %g at %g s, want %g", k, s.Y[1], s.T, want)
		}
	}
}

func TestJitter(t *testing.T) {
	log := openText(t, hoist(), header+"0,,,\n0.011,,,\n0.02,,,\n0.03,,,\n0.04,,,\n", logs.Options{})
	if v := log.Survey(); math.Abs(v.Jitter-0.1) > 1e-9 || math.Abs(v.Period-0.01) > 1e-15 || v.Missing != 0 {
		t.Errorf("survey %+v", v)
	}
}

// Late time stamps are no missing rows, missing rows are no late time stamps, and
// the survey counts what the samples say.
func TestMissingRows(t *testing.T) {
	late := func(k int, by float64) func(i int) float64 {
		return func(i int) float64 {
			if i == k {
				return by
			}
			return 0
		}
	}
	burst := func(i int) float64 { // five rows stamped when the fifth came
		if i >= 30 && i < 35 {
			return float64(35-i)*0.99 - 0.5
		}
		return 0
	}
	rng := rand.New(rand.NewPCG(71, 72))
	shaking := func(int) float64 { return 0.6 * (rng.Float64() - 0.5) }
	for _, c := range []struct {
		name    string
		jitter  func(i int) float64
		missing []int // rows left out
		gaps    map[int]int
		drift   float64
	}{
		{name: "even"},
		{name: "one late", jitter: late(20, 0.6)},
		{name: "one early", jitter: late(20, -0.6)},
		{name: "first late", jitter: late(0, 0.7)},
		{name: "last late", jitter: late(98, 0.4)},
		{name: "burst", jitter: burst},
		{name: "shaking", jitter: shaking},
		{name: "slow clock", drift: 0.004},
		{name: "fast clock", drift: -0.004},
		{name: "one missing", missing: []int{40}, gaps: map[int]int{40: 1}},
		{name: "missing in a row and at the end", missing: []int{40, 41, 42, 97}, gaps: map[int]int{40: 3, 94: 1}},
		{name: "two gaps close together", missing: []int{40, 42}, gaps: map[int]int{40: 1, 41: 1}},
		{name: "shaking and missing", jitter: shaking, missing: []int{50, 51}, gaps: map[int]int{50: 2}},
		{name: "burst behind a gap", jitter: burst, missing: []int{10, 11}, gaps: map[int]int{10: 2}},
	} {
		t.Run(c.name, func(t *testing.T) {
			var text strings.Builder
			text.WriteString(header)
			rows := 0
			for i := range 99 {
				if slices.Contains(c.missing, i) {
					continue
				}
				at := float64(i) * (1 + c.drift)
				if c.jitter != nil {
					at += c.jitter(i)
				}
				fmt.Fprintf(&text, "%.6f,4100,1.2,%d\n", at*0.01, i)
				rows++
			}
			log := openText(t, hoist(), text.String(), logs.Options{})
			list := take(t, log)
			if len(list) != rows {
				t.Fatalf("%d samples of %d rows", len(list), rows)
			}
			for k, s := range list {
				if s.Missing != c.gaps[k] {
					t.Errorf("row %d at %g s: %d missing, want %d", k, s.T, s.Missing, c.gaps[k])
				}
			}
			if v := log.Survey(); v.Missing != int64(len(c.missing)) || math.Abs(v.Period/0.01-1-c.drift) > 0.01 {
				t.Errorf("survey %+v", v)
			}
		})
	}
}

func TestRecord(t *testing.T) {
	text := header + "0,4101,0,0\n0.01,,1.2,\n0.04,4103,0,0\n0.05,4104,0,0\n"
	log := openText(t, hoist(), text, logs.Options{})
	all, err := logs.Load(context.Background(), log, math.Inf(-1), math.MaxInt)
	if err != nil {
		t.Fatal(err)
	}
	expectSamples(t, take(t, all), take(t, log))
	part, err := logs.Load(context.Background(), log, 0.035, 1)
	if err != nil {
		t.Fatal(err)
	}
	want := take(t, log)[2:3]
	want[0].Missing = 0
	expectSamples(t, take(t, part), want)
	if v := part.Survey(); v.Samples != 1 || v.Start != 0.04 || v.End != 0.04 || v.Lost[1] != 0 {
		t.Errorf("survey %+v", v)
	}
}

func TestCancel(t *testing.T) {
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if _, err := logs.Open(ctx, strings.NewReader(header+"0,,,\n1,,,\n"), hoist(), logs.Options{}); !errors.Is(err, context.Canceled) {
		t.Errorf("error %v", err)
	}
}

// FuzzReader holds for any bytes: an error that names the file, or samples as many
// as the survey says, all of them finite or lost.
func FuzzReader(f *testing.F) {
	f.Add([]byte(header+"0,4100,1.2,0\n0.01,4100,1.2,0\n"), 0, false)
	f.Add([]byte(header+"0,4100,1.2,0\n0.011,,NaN,\"0\"\n0.05,1,2,3"), 1, true)
	f.Add([]byte("t,gyro,\"gate speed\",rail encoder,cable force\r\n0,1,2,3,4\r\n1e-2,1,2,3,4\r\n"), -2, false)
	f.Add([]byte("\xef\xbb\xbft,\"a\"\"\n"), 0, false)
	f.Add([]byte(header+"0,1,1,1\n1e-300,1,1,1\n1,1,1,1\n"), 0, true)
	f.Add([]byte(header+"0,1e308,-1e308,Inf\n1e308,1,1,1\n"), 10000, false)
	f.Add([]byte(header+"0,\x1b[2J,1,1\n0.01,\xe2\x80\xae,1,1\n"), 0, false)
	f.Fuzz(func(t *testing.T, data []byte, lag int, resample bool) {
		opt := logs.Options{File: "fuzz.csv", InputLag: lag, Resample: resample}
		log, err := logs.Open(context.Background(), bytes.NewReader(data), hoist(), opt)
		if err != nil {
			if !strings.HasPrefix(err.Error(), "fuzz.csv: ") || strings.ContainsAny(err.Error(), "\n\x1b\x00") {
				t.Fatalf("error %q", err)
			}
			return
		}
		v := log.Survey()
		if !(v.Period > 0) || v.Rows < 2 || !(v.Jitter >= 0) {
			t.Fatalf("survey %+v", v)
		}
		if v.Samples > 100000 {
			return
		}
		source, err := log.Samples()
		if err != nil {
			t.Fatal(err)
		}
		missing := int64(0)
		for k := int64(0); ; k++ {
			s, err := source.Next()
			if err == io.EOF {
				if !resample && missing != v.Missing {
					t.Fatalf("%d rows missing, the survey has %d", missing, v.Missing)
				}
				if k != v.Samples {
					t.Fatalf("%d samples, the survey has %d", k, v.Samples)
				}
				return
			}
			if err != nil {
				t.Fatal(err)
			}
			missing += int64(s.Missing)
			for _, u := range append(append(s.U, s.Y...), s.T) {
				if math.IsInf(u, 0) || s.Missing < 0 {
					t.Fatalf("sample %+v", s)
				}
			}
			for _, u := range s.U {
				if u != u {
					t.Fatalf("sample %+v", s)
				}
			}
		}
	})
}
