package emit

import (
	"math"
	"strconv"
	"strings"
)

// cNumber prints a finite number so that C reads it back exactly: 17
// significant digits for double, 9 and the suffix F for float (Goldberg 1991,
// theorem 15). The decimal point does not depend on any locale.
func (p *program) cNumber(v float64) string {
	if p.arithmetic == Fixed {
		return counts(v, p.bits)
	}
	if p.arithmetic == Float {
		return withPoint(strconv.FormatFloat(float64(float32(v)), 'g', 9, 32)) + "F"
	}
	return withPoint(strconv.FormatFloat(v, 'g', 17, 64))
}

// cEntry prints an entry of a table.
func (p *program) cEntry(v float64) string {
	if p.arithmetic == Fixed {
		return counts(v, p.tableBits)
	}
	return p.cNumber(v)
}

// counts prints a fixed-point number; C has no constant for the least one.
func counts(v float64, bits int) string {
	c := int64(math.Round(math.Ldexp(v, bits)))
	if c == math.MinInt32 {
		return "(-2147483647 - 1)"
	}
	return strconv.FormatInt(c, 10)
}

// stNumber is the same for structured text, whose reals need a point before
// the exponent.
func (p *program) stNumber(v float64) string {
	if p.arithmetic == Float {
		return strings.ToUpper(withPoint(strconv.FormatFloat(float64(float32(v)), 'g', 9, 32)))
	}
	return strings.ToUpper(withPoint(strconv.FormatFloat(v, 'g', 17, 64)))
}

// withPoint adds ".0" where digits have no point.
func withPoint(s string) string {
	if strings.Contains(s, ".") {
		return s
	}
	if mantissa, exponent, ok := strings.Cut(s, "e"); ok {
		return mantissa + ".0e" + exponent
	}
	return s + ".0"
}

// full prints a number for JSON, CSV and comments: the shortest text that
// reads back exactly.
func full(v float64) string { return strconv.FormatFloat(v, 'g', -1, 64) }
