package logs

import (
	"bytes"
	"encoding/json"
	"math"
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

// Powers of ten that a float64 holds exactly.
var tens = [...]float64{1e0, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9, 1e10, 1e11,
	1e12, 1e13, 1e14, 1e15, 1e16, 1e17, 1e18, 1e19, 1e20, 1e21, 1e22}

// number reads a decimal number: digits with a point, a sign and an exponent, as
// strconv.ParseFloat does, but neither hexadecimal nor underscores nor infinity.
// An empty field and NaN, in any case, give NaN. Space around it is no matter. With
// rough true, only whether it is a number counts, not which.
//
// Up to 15 digits and a power of ten that is exact need one rounding only
// (Clinger 1990); the rest is strconv's.
func number(b []byte, rough bool) (float64, bool) {
	b = trimSpace(b)
	if len(b) == 0 {
		return math.NaN(), true
	}
	i, negative := 0, false
	if b[0] == '-' || b[0] == '+' {
		negative = b[0] == '-'
		i = 1
	}
	var mantissa uint64
	digits, seen, exponent := 0, false, 0
	for ; i < len(b); i++ {
		c := b[i] - '0'
		if c > 9 {
			break
		}
		seen = true
		if mantissa > 0 || c > 0 {
			digits++
		}
		if digits <= 19 {
			mantissa = mantissa*10 + uint64(c)
		}
	}
	if i < len(b) && b[i] == '.' {
		for i++; i < len(b); i++ {
			c := b[i] - '0'
			if c > 9 {
				break
			}
			seen = true
			if mantissa > 0 || c > 0 {
				digits++
			}
			if digits <= 19 {
				mantissa = mantissa*10 + uint64(c)
				exponent--
			}
		}
	}
	if !seen {
		return math.NaN(), bytes.EqualFold(b, []byte("nan"))
	}
	if i < len(b) {
		e, ok := tenth(b[i:])
		if !ok {
			return 0, false
		}
		exponent += e
	}
	if rough && exponent > -200 && exponent < 200 && len(b) < 60 {
		return float64(mantissa), true
	}
	if digits > 19 || mantissa >= 1<<53 || exponent < -22 || exponent > 22 {
		f, err := strconv.ParseFloat(string(b), 64)
		return f, err == nil
	}
	f := float64(mantissa)
	if exponent < 0 {
		f /= tens[-exponent]
	} else {
		f *= tens[exponent]
	}
	if negative {
		f = -f
	}
	return f, true
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
