package logs

import (
	"bytes"
	"encoding/binary"
	"encoding/json"
	"math"
	"math/bits"
	"strconv"
)

// Number is a figure that JSON shows as null where it is not defined. It reads
// back exactly.
type Number float64

// MarshalJSON writes the shortest text that reads back exactly.
func (x Number) MarshalJSON() ([]byte, error) {
	if f := float64(x); math.IsNaN(f) || math.IsInf(f, 0) {
		return []byte("null"), nil
	}
	return json.Marshal(float64(x))
}

func numbers(list []float64) []Number {
	out := make([]Number, len(list))
	for i, v := range list {
		out[i] = Number(v)
	}
	return out
}

// Powers of ten that a float64 holds exactly, and of five that 64 bits hold,
// shifted so that their top bit is set.
var (
	tens = [...]float64{1e0, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9, 1e10, 1e11,
		1e12, 1e13, 1e14, 1e15, 1e16, 1e17, 1e18, 1e19, 1e20, 1e21, 1e22}
	fives = func() (list [28]uint64) {
		five := uint64(1)
		for k := range list {
			list[k] = five << bits.LeadingZeros64(five)
			five *= 5
		}
		return list
	}()
	fiveShift = func() (list [28]int) {
		five := uint64(1)
		for k := range list {
			list[k] = bits.LeadingZeros64(five)
			five *= 5
		}
		return list
	}()
)

// number reads a decimal number: digits with a point, a sign and an exponent, as
// strconv.ParseFloat does, but neither hexadecimal nor underscores nor infinity.
// An empty field and NaN, in any case, give NaN. Space around it is no matter. The
// result is the nearest float64.
func number(b []byte) (float64, bool) {
	b = trimSpace(b)
	if len(b) == 0 {
		return math.NaN(), true
	}
	i, negative := 0, false
	if b[0] == '-' || b[0] == '+' {
		negative = b[0] == '-'
		i = 1
	}
	mantissa, end := digits(0, b, i)
	count, exponent := end-i, 0
	if i = end; i < len(b) && b[i] == '.' {
		mantissa, end = digits(mantissa, b, i+1)
		exponent = i + 1 - end
		count -= exponent
		i = end
	}
	if count == 0 {
		return math.NaN(), bytes.EqualFold(b, []byte("nan"))
	}
	if i < len(b) {
		e, ok := tenth(b[i:])
		if !ok {
			return 0, false
		}
		exponent += e
	}
	if count > 19 {
		return slowly(b) // the mantissa may have run over
	}
	var f float64
	switch {
	case mantissa < 1<<53 && exponent >= 0 && exponent < len(tens):
		f = float64(mantissa) * tens[exponent]
	case mantissa < 1<<53 && exponent < 0 && -exponent < len(tens):
		f = float64(mantissa) / tens[-exponent] // one rounding (Clinger 1990)
	case exponent < 0 && -exponent < len(fives):
		f = divided(mantissa, -exponent)
	default:
		return slowly(b)
	}
	if negative {
		f = -f
	}
	return f, true
}

func slowly(b []byte) (float64, bool) {
	f, err := strconv.ParseFloat(string(b), 64)
	return f, err == nil
}

// digits appends the decimal digits from b[i] on to a mantissa, eight at a time
// where there are as many (Lemire 2021), and returns where they end.
func digits(mantissa uint64, b []byte, i int) (uint64, int) {
	for i+8 <= len(b) {
		v := binary.LittleEndian.Uint64(b[i:])
		// The high half of each byte must be 3, also after 6 is added to it.
		if (v&0xf0f0f0f0f0f0f0f0)|((v+0x0606060606060606)&0xf0f0f0f0f0f0f0f0)>>4 != 0x3333333333333333 {
			break
		}
		v -= 0x3030303030303030
		v = v*10 + v>>8
		v = ((v&0x000000ff000000ff)*0x000f424000000064 + (v>>16&0x000000ff000000ff)*0x0000271000000001) >> 32
		mantissa = mantissa*100000000 + v
		i += 8
	}
	for ; i < len(b); i++ {
		c := b[i] - '0'
		if c > 9 {
			break
		}
		mantissa = mantissa*10 + uint64(c)
	}
	return mantissa, i
}

// divided is mantissa / 10ᵏ, rounded once: the quotient by 5ᵏ to 63 bits or more,
// its last bit set where something is left over.
func divided(mantissa uint64, k int) float64 {
	if mantissa == 0 {
		return 0
	}
	zeros := bits.LeadingZeros64(mantissa)
	mantissa <<= zeros
	q, rest := bits.Div64(mantissa>>1, mantissa<<63, fives[k])
	if rest != 0 {
		q |= 1
	}
	shift := fiveShift[k] - zeros - k - 63
	return float64(q) * math.Float64frombits(uint64(1023+shift)<<52)
}

// tenth reads an exponent: e or E, a sign, digits. Far beyond what a number can
// hold it stays at a bound.
func tenth(b []byte) (int, bool) {
	if b[0] != 'e' && b[0] != 'E' {
		return 0, false
	}
	b = b[1:]
	negative := false
	if len(b) > 0 && (b[0] == '-' || b[0] == '+') {
		negative = b[0] == '-'
		b = b[1:]
	}
	if len(b) == 0 {
		return 0, false
	}
	e := 0
	for _, c := range b {
		if c < '0' || c > '9' {
			return 0, false
		}
		if e < 100000 {
			e = e*10 + int(c-'0')
		}
	}
	if negative {
		e = -e
	}
	return e, true
}

func trimSpace(b []byte) []byte {
	for len(b) > 0 && (b[0] == ' ' || b[0] == '\t') {
		b = b[1:]
	}
	for len(b) > 0 && (b[len(b)-1] == ' ' || b[len(b)-1] == '\t') {
		b = b[:len(b)-1]
	}
	return b
}
