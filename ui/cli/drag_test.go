//go:build unix

package cli_test

import (
	"slices"
	"testing"
	"time"
)

// While a pole is dragged over the shaded plane at 120x40, a key costs few bytes:
// over a slow link they are what a person waits for. The time from the key to the
// last byte of its answer is reported; it is no test where others use the machine.
func TestDraggingCostsFewBytes(t *testing.T) {
	program := build(t)
	for _, c := range []struct {
		name        string
		args        []string
		median, p90 int
	}{
		{"colour", []string{"lift", "--colours", "all"}, 900, 1800},
		{"ascii", []string{"lift", "--colours", "none", "--ascii"}, 600, 1200},
	} {
		t.Run(c.name, func(t *testing.T) {
			p := open(t, program, t.TempDir(), c.args...)
			p.resize(40, 120)
			if c.name == "ascii" {
				p.waitFor("limits")
				p.press("M") // the 7-bit look starts without shades
				p.waitFor("is shaded")
				p.press("hl") // a key takes the word about it away
			}
			p.waitFor("limit broken") // the legend of a map that is there
			p.still()
			var bytes []int
			var times []time.Duration
			for i := range 40 {
				key := "h"
				if i/10%2 == 1 {
					key = "l"
				}
				before, at := p.count()
				start := time.Now()
				p.press(key)
				time.Sleep(50 * time.Millisecond)
				after, last := p.count()
				bytes = append(bytes, after-before)
				if last.After(at) {
					times = append(times, last.Sub(start))
				}
			}
			slices.Sort(bytes)
			slices.Sort(times)
			t.Logf("%s: median %d, 90 %% %d bytes a key", c.name, bytes[20], bytes[36])
			if n := len(times); n > 0 {
				t.Logf("key to last byte: median %v, 95 %% %v", times[n/2].Round(time.Millisecond), times[n*95/100].Round(time.Millisecond))
			}
			if bytes[20] > c.median || bytes[36] > c.p90 {
				t.Errorf("%d bytes in the median, %d in the worst tenth; budget %d and %d", bytes[20], bytes[36], c.median, c.p90)
			}
			if bytes[20] == 0 {
				t.Error("the keys did nothing")
			}
			p.press("q")
		})
	}
}

// count is how many bytes were written, and when the last of them.
func (p *terminal) count() (int, time.Time) {
	p.mu.Lock()
	defer p.mu.Unlock()
	return len(p.out), p.last
}

// still waits until nothing was written for a while.
func (p *terminal) still() {
	for n := -1; ; {
		m, _ := p.count()
		if m == n {
			return
		}
		n = m
		time.Sleep(300 * time.Millisecond)
	}
}
