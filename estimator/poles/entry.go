package poles

import (
	"errors"
	"fmt"
	"math"
	"strconv"
	"strings"
	"unicode/utf8"
)

// entry is one item of a list.
type entry struct {
	poles    []complex128
	repeat   int
	repeated bool // a repeat was written
	inS      bool // frequency@damping
}

var errShape = errors.New("not a pole; expected a number, a pair like -4±3i, or frequency@damping like 10@0.7")

// parseEntry reads one entry, with its repeat.
func parseEntry(text string) (entry, error) {
	s := scanner{text: text}
	if s.skip() == "" {
		return entry{}, errors.New("empty; expected a pole like -6 or a pair like -4±3i")
	}
	e, err := s.place()
	if err != nil {
		return entry{}, err
	}
	for i, v := range e.poles {
		if !finite(v) {
			return entry{}, errors.New("the pole is not finite; expected a smaller number")
		}
		e.poles[i] = complex(real(v)+0, imag(v)+0) // no negative zeros
	}
	e.repeat = 1
	if s.accept("x", "X", "×") {
		e.repeated = true
		if e.repeat, err = s.repeat(); err != nil {
			return entry{}, err
		}
	}
	if rest := s.skip(); rest != "" {
		return entry{}, fmt.Errorf("unexpected %s; expected a comma or the end of the list", quoted(rest))
	}
	return e, nil
}

// place reads the entry up to its repeat.
func (s *scanner) place() (entry, error) {
	if s.accept("±", "+-", "+−") {
		im, err := s.imaginary()
		return entry{poles: pair(0, im)}, err
	}
	first, err := s.part()
	switch {
	case err != nil:
		return entry{}, err
	case first.imaginary:
		return entry{poles: []complex128{complex(0, first.value)}}, nil
	case s.accept("@"):
		if first.value <= 0 {
			return entry{}, errors.New("the natural frequency is not above zero; expected frequency@damping like 10@0.7")
		}
		damping, err := s.signed()
		return entry{poles: Second(first.value, damping), inS: true}, err
	case s.accept("±", "+-", "+−"):
		im, err := s.imaginary()
		return entry{poles: pair(first.value, im)}, err
	case s.at("+", "-", "−"):
		second, err := s.part()
		if err == nil && !second.imaginary {
			err = errors.New("the second part has no i; expected a pair like -4±3i")
		}
		return entry{poles: []complex128{complex(first.value, second.value)}}, err
	}
	return entry{poles: []complex128{complex(first.value, 0)}}, nil
}

func pair(re, im float64) []complex128 {
	im = math.Abs(im)
	return []complex128{complex(re, im), complex(re, -im)}
}

// Second returns the two poles of natural frequency w and damping ratio zeta: a
// conjugate pair for |zeta| < 1, else two real poles.
func Second(w, zeta float64) []complex128 {
	if math.Abs(zeta) < 1 {
		return pair(-w*zeta, w*math.Sqrt((1-zeta)*(1+zeta)))
	}
	z := math.Abs(zeta)
	sum := z + math.Sqrt(z-1)*math.Sqrt(z+1) // no overflow in z²
	side := math.Copysign(1, zeta)
	return []complex128{complex(-side*w*sum, 0), complex(-side*w/sum, 0)}
}

// scanner walks over the text of one entry; blanks between parts are free.
type scanner struct{ text string }

// skip drops blanks and returns what is left.
func (s *scanner) skip() string {
	s.text = strings.TrimSpace(s.text)
	return s.text
}

func (s *scanner) at(any ...string) bool {
	for _, a := range any {
		if strings.HasPrefix(s.skip(), a) {
			return true
		}
	}
	return false
}

func (s *scanner) accept(any ...string) bool {
	for _, a := range any {
		if strings.HasPrefix(s.skip(), a) {
			s.text = s.text[len(a):]
			return true
		}
	}
	return false
}

type part struct {
	value     float64
	imaginary bool
}

// part reads [sign] number [i], or [sign] i.
func (s *scanner) part() (part, error) {
	negative := s.accept("-", "−")
	if !negative {
		s.accept("+")
	}
	var p part
	if s.at("i", "j") && !s.at("in") {
		p.value = 1
	} else {
		v, err := s.number()
		if err != nil {
			return part{}, err
		}
		p.value = v
	}
	p.imaginary = s.accept("i", "j")
	if negative {
		p.value = -p.value
	}
	return p, nil
}

// imaginary reads what follows ±.
func (s *scanner) imaginary() (float64, error) {
	if s.at("+", "-", "−", "±") {
		return 0, errors.New("two signs; expected a pair like -4±3i")
	}
	p, err := s.part()
	if err == nil && !p.imaginary {
		err = errors.New("the part after ± has no i; expected a pair like -4±3i")
	}
	return p.value, err
}

// signed reads [sign] number.
func (s *scanner) signed() (float64, error) {
	negative := s.accept("-", "−")
	if !negative {
		s.accept("+")
	}
	v, err := s.number()
	if negative {
		v = -v
	}
	return v, err
}

// number reads an unsigned decimal number.
func (s *scanner) number() (float64, error) {
	t := s.skip()
	k := digits(t)
	mantissa := k
	if k < len(t) && t[k] == '.' {
		more := digits(t[k+1:])
		mantissa += more
		k += 1 + more
	}
	if mantissa == 0 {
		if t == "" {
			return 0, errors.New("it ends too early; expected a number")
		}
		if r, _ := utf8.DecodeRuneInString(t); r == ',' {
			return 0, errors.New("it ends too early; expected a number")
		}
		return 0, errShape
	}
	if k < len(t) && (t[k] == 'e' || t[k] == 'E') {
		e := k + 1
		minus := ""
		switch {
		case strings.HasPrefix(t[e:], "+"), strings.HasPrefix(t[e:], "-"):
			minus = t[e : e+1]
			e++
		case strings.HasPrefix(t[e:], "−"):
			minus = "-"
			e += len("−")
		}
		n := digits(t[e:])
		if n == 0 {
			return 0, errors.New("the exponent has no digits; expected a number like 1e-05")
		}
		s.text = t[e+n:]
		return finiteNumber(t[:k] + "e" + minus + t[e:e+n])
	}
	s.text = t[k:]
	return finiteNumber(t[:k])
}

func finiteNumber(text string) (float64, error) {
	v, err := strconv.ParseFloat(text, 64)
	if err != nil || math.IsInf(v, 0) || math.IsNaN(v) {
		return 0, errors.New("the number is too large; expected a finite number")
	}
	return v, nil
}

func digits(t string) (n int) {
	for n < len(t) && t[n] >= '0' && t[n] <= '9' {
		n++
	}
	return n
}

func (s *scanner) repeat() (int, error) {
	t := s.skip()
	k := digits(t)
	n, err := strconv.Atoi(t[:k])
	s.text = t[k:]
	if k == 0 || n < 1 && err == nil {
		return 0, fmt.Errorf("the repeat is no count; expected x1 to x%d", Max)
	}
	if err != nil || n > Max {
		return 0, fmt.Errorf("the repeat is too large; expected x1 to x%d", Max)
	}
	return n, nil
}

func finite(v complex128) bool {
	return !math.IsNaN(real(v)) && !math.IsInf(real(v), 0) && !math.IsNaN(imag(v)) && !math.IsInf(imag(v), 0)
}
