package readings

import (
	"math"
	"strconv"

	"polewright/ui/theme"
)

// Decimals returns the decimals that show ref with three figures. They depend on
// a reference that stays while poles are dragged, not on the value, so that the
// decimal point stays where it is.
func Decimals(ref float64) int {
	ref = math.Abs(ref)
	if !(ref > 0) || math.IsInf(ref, 0) {
		return 3
	}
	return min(max(2-int(math.Floor(math.Log10(ref)+1e-12)), 0), 7)
}

// Figure prints v with the decimals for ref. A value that these would not show,
// or that would not fit, gets an exponent; one that is not defined gets the
// glyph for that, an infinite one the word.
func Figure(v, ref float64, g *theme.Glyphs) string {
	switch {
	case math.IsNaN(v):
		return g.Undefined
	case math.IsInf(v, 0):
		return "unlimited"
	}
	d := Decimals(ref)
	if size := math.Abs(v); size != 0 && (size >= 1e6 || size < math.Pow10(-d)) {
		return strconv.FormatFloat(v, 'e', 2, 64)
	}
	return strconv.FormatFloat(v, 'f', d, 64)
}

// Fixed prints v with so many decimals, large values with an exponent.
func Fixed(v float64, decimals int, g *theme.Glyphs) string {
	switch {
	case math.IsNaN(v):
		return g.Undefined
	case math.IsInf(v, 0):
		return "unlimited"
	case math.Abs(v) >= 1e6:
		return strconv.FormatFloat(v, 'e', 2, 64)
	}
	return strconv.FormatFloat(v, 'f', decimals, 64)
}

// Place prints a pole of the plane shown, both parts with the decimals for ref.
func Place(p complex128, pair bool, ref float64, g *theme.Glyphs) string {
	re := Figure(real(p), ref, g)
	if real(p) == 0 {
		re = Figure(0, ref, g)
	}
	switch {
	case pair:
		return re + " " + g.PlusMinus + " " + Figure(math.Abs(imag(p)), ref, g) + "i"
	case imag(p) != 0:
		sign := " + "
		if imag(p) < 0 {
			sign = " - "
		}
		return re + sign + Figure(math.Abs(imag(p)), ref, g) + "i"
	}
	return re
}
