package scenarios

import (
	"hash/fnv"
	"math"
	"math/rand/v2"
	"sync"
)

// Noise is the same bit for bit on every machine: products are rounded on their
// own (the float64 conversions forbid a fused multiply-add), and exp and log are
// the portable ones below, not the library's, whose last digit depends on the
// machine.

// stream is one source of noise, independent of all others.
type stream struct{ pcg rand.PCG }

// reset starts a stream at its beginning. The seed and the name of the source
// are spread over the generator's state by FNV-1a and the finaliser of SplitMix64
// (Steele, Lea & Flood 2014).
func (s *stream) reset(seed uint64, source string) {
	h := fnv.New64a()
	h.Write([]byte(source))
	a := spread(seed + 0x9e3779b97f4a7c15)
	s.pcg.Seed(a, spread(a^h.Sum64()))
}

func spread(z uint64) uint64 {
	z = (z ^ z>>30) * 0xbf58476d1ce4e5b9
	z = (z ^ z>>27) * 0x94d049bb133111eb
	return z ^ z>>31
}

// bit is a fair coin.
func (s *stream) bit() bool { return s.pcg.Uint64()>>63 == 1 }

// uniform is above 0 and below 1.
func (s *stream) uniform() float64 { return (float64(s.pcg.Uint64()>>12) + 0.5) * 0x1p-52 }

// The ziggurat of Marsaglia & Tsang 2000 with 256 layers, 53 bits per value and
// no bit used twice (Doornik 2005). tailStart and layerArea are those of the
// paper, from memory; the test checks that the layers close.
const (
	layers    = 256
	tailStart = 3.6541528853610088
	layerArea = 0.00492867323399
)

type ziggurat struct {
	edge   [layers + 1]float64 // right end of layer i; edge[0] is the base's as if it were a box
	height [layers + 1]float64 // exp(−edge²/2)
	inside [layers]uint64      // of 2^53: below, the value lies under the curve for sure
	step   [layers]float64     // edge / 2^53
}

var normalTable = sync.OnceValue(func() *ziggurat {
	z := new(ziggurat)
	f := bell(tailStart)
	z.edge[0], z.edge[1] = layerArea/f, tailStart
	z.height[1] = f
	for i := 2; i < layers; i++ {
		f += layerArea / z.edge[i-1]
		z.edge[i] = math.Sqrt(-2 * logOf(f))
		z.height[i] = f
	}
	z.height[layers] = 1
	for i := range layers {
		z.step[i] = z.edge[i] * 0x1p-53
		z.inside[i] = uint64(z.edge[i+1] / z.edge[i] * 0x1p53)
	}
	return z
})

// normal is one standard normal value. The lowest 8 bits of a word choose the
// layer, the highest 54 a value from −2^53 to 2^53 − 1.
func (s *stream) normal(z *ziggurat) float64 {
	for {
		u := s.pcg.Uint64()
		i := u & (layers - 1)
		value := int64(u) >> 10
		sign := value >> 63
		x := float64(value) * z.step[i]
		if uint64((value^sign)-sign) < z.inside[i] {
			return x
		}
		if edge, ok := s.edgeOfLayer(z, int(i), math.Abs(x)); ok {
			return math.Copysign(edge, x)
		}
	}
}

// edgeOfLayer decides about a value x ≥ 0 that may lie above the curve. In the lowest
// layer it draws from the tail (Marsaglia 1964).
func (s *stream) edgeOfLayer(z *ziggurat, i int, x float64) (float64, bool) {
	if i == 0 {
		for {
			a := -logOf(s.uniform()) / tailStart
			b := -logOf(s.uniform())
			if b+b > a*a {
				return tailStart + a, true
			}
		}
	}
	low, high := z.height[i], z.height[i+1]
	return x, low+float64(s.uniform()*(high-low)) < bell(x)
}

// bell is exp(−x²/2) for |x| ≤ 8.
func bell(x float64) float64 { return expOf(-float64(x*x) / 2) }

// ln2 in two parts, the first of 32 bits (Cody & Waite 1980, values as in fdlibm,
// from memory; the test compares with the library).
const (
	ln2High = 6.93147180369123816490e-01
	ln2Low  = 1.90821492927058770002e-10
)

// expOf is exp(x) for −700 ≤ x ≤ 700 to a few units in the last place.
func expOf(x float64) float64 {
	k := math.Floor(x/math.Ln2 + 0.5)
	r := (x - float64(k*ln2High)) - float64(k*ln2Low)
	// Taylor, |r| ≤ 0.35: the first term left out is below 1e-18.
	sum := 1.0
	for n := 16.0; n >= 1; n-- {
		sum = 1 + float64(r*sum)/n
	}
	return math.Ldexp(sum, int(k))
}

// logOf is log(x) for normal x > 0 to a few units in the last place.
func logOf(x float64) float64 {
	m, e := math.Frexp(x)
	if m < math.Sqrt2/2 {
		m, e = 2*m, e-1
	}
	// log m = 2 artanh(t), t = (m − 1)/(m + 1), |t| ≤ 0.172.
	t := (m - 1) / (m + 1)
	q := float64(t * t)
	sum := 0.0
	for n := 25.0; n >= 1; n -= 2 {
		sum = float64(sum*q) + 1/n
	}
	k := float64(e)
	return float64(k*ln2High) + (float64(k*ln2Low) + float64(2*float64(t*sum)))
}
