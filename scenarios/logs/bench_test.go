package logs_test

import (
	"bytes"
	"context"
	"fmt"
	"math/rand/v2"
	"testing"

	"polewright/scenarios/logs"
)

var sink *logs.Result

// BenchmarkReplay is one pass over samples in memory: the tuned gain, the floor
// gain and all statistics, n = 4, p = 2.
func BenchmarkReplay(b *testing.B) {
	m := tracker()
	u, y, _ := simulate(m, 200000, rand.New(rand.NewPCG(1, 2)))
	log := memoryOf(layoutOf(m), u, y)
	floor := logs.Gain{L: kalman(m, 1)}
	for _, c := range []struct {
		name  string
		floor *logs.Gain
	}{{"gain", nil}, {"gain and floor", &floor}} {
		b.Run(c.name, func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				sink = replay(b, log, logs.Request{Model: m, Gain: logs.Gain{L: floor.L}, Floor: c.floor})
			}
			b.ReportMetric(float64(len(y))*float64(b.N)/b.Elapsed().Seconds()/1e6, "Msamples/s")
		})
	}
}

// csvOf writes a log with times and values as a logger does.
func csvOf(u, y [][]float64, digits int) []byte {
	var text bytes.Buffer
	text.WriteString("t,u1,y1,y2\n")
	for k := range y {
		fmt.Fprintf(&text, "%.3f,%.*g,%.*g,%.*g\n", float64(k)*0.01, digits, u[k][0], digits, y[k][0], digits, y[k][1])
	}
	return text.Bytes()
}

// BenchmarkCSV is a log end to end: both passes over the text, the tuned gain, the
// floor gain and all statistics.
func BenchmarkCSV(b *testing.B) {
	m := tracker()
	u, y, _ := simulate(m, 100000, rand.New(rand.NewPCG(1, 2)))
	l := layoutOf(m)
	floor := logs.Gain{L: kalman(m, 1)}
	for _, digits := range []int{7, 17} {
		text := csvOf(u, y, digits)
		b.Run(fmt.Sprintf("%d digits", digits), func(b *testing.B) {
			b.SetBytes(int64(len(text)))
			b.ReportAllocs()
			for b.Loop() {
				log, err := logs.Open(context.Background(), bytes.NewReader(text), l, logs.Options{})
				if err != nil {
					b.Fatal(err)
				}
				sink = replay(b, log, logs.Request{Model: m, Gain: floor, Floor: &floor})
			}
			b.ReportMetric(float64(len(y))*float64(b.N)/b.Elapsed().Seconds()/1e6, "Msamples/s")
		})
		b.Run(fmt.Sprintf("%d digits, survey only", digits), func(b *testing.B) {
			b.SetBytes(int64(len(text)))
			for b.Loop() {
				if _, err := logs.Open(context.Background(), bytes.NewReader(text), l, logs.Options{}); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
