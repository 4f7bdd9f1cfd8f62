package scenarios

import (
	"math"
	"testing"
)

// The first values of a stream, bit for bit: they must never change, or the same
// seed no longer gives the same noise. Source: this program.
var firstNormals = []uint64{
	0xbfe0c14f960c9b6b, // -0.5235975199364992
	0xbfec4f3e20006669, // -0.884673178198864
	0xbff491d607e1ddf8, // -1.2856045062925414
	0x3fe71e5834604cd8, // 0.7224541686031456
	0x3feaa758896eff16, // 0.8329279598474126
	0x3fe2e4a469ba1035, // 0.5904104294754747
	0x3fd276304d9816a6, // 0.28846366479442975
	0x3fe1a1aa1552f590, // 0.5509844223485505
}

func TestNormalsAreTheSameEverywhere(t *testing.T) {
	var s stream
	s.reset(7, "sensor rail encoder")
	z := normalTable()
	for i, want := range firstNormals {
		if have := math.Float64bits(s.normal(z)); have != want {
			t.Errorf("value %d: %#x, want %#x", i, have, want)
		}
	}
	// A digest of many values reaches the rare branches.
	var sum uint64
	for range 1_000_000 {
		sum = sum*0x9e3779b97f4a7c15 + math.Float64bits(s.normal(z))
	}
	if sum != normalDigest {
		t.Errorf("digest %#x, want %#x", sum, uint64(normalDigest))
	}
}

const normalDigest = 0xfb69cabea94fb93

func TestZigguratCloses(t *testing.T) {
	z := normalTable()
	// The topmost layer must end at the top of the curve: its area is the same
	// as the others'.
	if area := z.edge[layers-1] * (1 - z.height[layers-1]); math.Abs(area-layerArea) > 1e-9 {
		t.Errorf("area of the topmost layer %g, want %g", area, layerArea)
	}
	for i := 1; i < layers; i++ {
		if !(z.edge[i+1] < z.edge[i]) {
			t.Fatalf("edge %d: %g after %g", i+1, z.edge[i+1], z.edge[i])
		}
	}
}

func TestPortableExpAndLog(t *testing.T) {
	for x := -50.0; x <= 50; x += 0.0137 {
		if e := math.Abs(expOf(x)/math.Exp(x) - 1); e > 4e-15 {
			t.Errorf("exp(%g) off by %g", x, e)
		}
		v := math.Exp(x)
		if e := math.Abs(logOf(v) - math.Log(v)); e > 4e-16*math.Max(1, math.Abs(x)) {
			t.Errorf("log(%g) off by %g", v, e)
		}
	}
}

func TestNormalsAreNormal(t *testing.T) {
	var s stream
	s.reset(1, "test")
	z := normalTable()
	const n = 1_000_000
	var m1, m2, m3, m4 float64
	beyond := map[float64]int{1: 0, 2: 0, 3: 0, tailStart: 0, 4: 0}
	var lag float64
	last := 0.0
	for range n {
		v := s.normal(z)
		m1, m2, m3, m4 = m1+v, m2+v*v, m3+v*v*v, m4+v*v*v*v
		lag += v * last
		last = v
		for b := range beyond {
			if math.Abs(v) > b {
				beyond[b]++
			}
		}
	}
	// Five standard errors of each moment.
	for _, c := range []struct {
		name             string
		have, want, sdev float64
	}{{"mean", m1, 0, 1}, {"square", m2, 1, math.Sqrt2}, {"cube", m3, 0, math.Sqrt(15)}, {"fourth", m4, 3, math.Sqrt(96)}, {"neighbours", lag, 0, 1}} {
		if off := math.Abs(c.have/n-c.want) / (c.sdev / math.Sqrt(n)); off > 5 {
			t.Errorf("%s %g, want %g: %.1f standard errors", c.name, c.have/n, c.want, off)
		}
	}
	for b, have := range beyond {
		p := math.Erfc(b / math.Sqrt2)
		if off := math.Abs(float64(have)-n*p) / math.Sqrt(n*p*(1-p)); off > 5 {
			t.Errorf("beyond %g: %d of %d, expected %.1f", b, have, n, n*p)
		}
	}
}

func TestStreamsAreIndependent(t *testing.T) {
	z := normalTable()
	const n = 200_000
	var a, b stream
	for _, other := range []struct {
		seed uint64
		name string
	}{{8, "x"}, {7, "y"}, {7 + 1<<63, "x"}} {
		a.reset(7, "x")
		b.reset(other.seed, other.name)
		var sum float64
		for range n {
			sum += a.normal(z) * b.normal(z)
		}
		if off := math.Abs(sum) / math.Sqrt(n); off > 5 {
			t.Errorf("seed 7 %q against seed %d %q: correlation %.1f standard errors", "x", other.seed, other.name, off)
		}
	}
}
