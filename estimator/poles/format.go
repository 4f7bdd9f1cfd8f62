package poles

import (
	"math"
	"strconv"
	"strings"
)

// number is the shortest text that reads back exactly.
func number(v float64) string { return strconv.FormatFloat(v+0, 'g', -1, 64) }

// Format prints one pole so that every finite value reads back exactly, like
// "-4+3i", "-6" or "2i".
func Format(v complex128) string {
	re, im := real(v)+0, imag(v)+0
	switch {
	case im == 0:
		return number(re)
	case re == 0:
		return number(im) + "i"
	case im < 0:
		return number(re) + number(im) + "i"
	}
	return number(re) + "+" + number(im) + "i"
}

func formatPair(v complex128) string {
	re, im := real(v)+0, math.Abs(imag(v))
	if re == 0 {
		return "±" + number(im) + "i"
	}
	return number(re) + "±" + number(im) + "i"
}

// FormatList prints a list in the order of first appearance, conjugate pairs as
// one entry and repeats as "x2". Parse reads the same multiset of finite poles
// back exactly, where complex poles have their partners.
func FormatList(list []complex128) string {
	done := make([]bool, len(list))
	take := func(from int, v complex128) (n int) {
		for k := from; k < len(list); k++ {
			if !done[k] && list[k] == v {
				done[k] = true
				n++
			}
		}
		return n
	}
	var items []string
	add := func(text, gap string, n int) {
		if n > 1 {
			text += gap + "x" + strconv.Itoa(n)
		}
		if n > 0 {
			items = append(items, text)
		}
	}
	for i, v := range list {
		switch {
		case done[i]:
		case !finite(v):
			items = append(items, Format(v))
		case imag(v) == 0:
			add(Format(v), "", take(i, v))
		default:
			conjugate := complex(real(v), -imag(v))
			n, m := take(i, v), take(i, conjugate)
			both := min(n, m)
			add(formatPair(v), " ", both)
			add(Format(v), " ", n-both)
			add(Format(conjugate), " ", m-both)
		}
	}
	return strings.Join(items, ", ")
}
