package poles

import (
	"fmt"
	"strings"
)

// Parse reads a list such as "-4±3i, -6, -8x2", or one pattern.
//
// An entry of a list is a real pole ("-6"), a conjugate pair ("-4±3i" or
// "-4+-3i"; i or j), one pole of a pair whose partner is listed too ("-4+3i,
// -4-3i"), or natural frequency in rad/s @ damping ratio ("10@0.7": a pair, or
// two real poles from damping 1 on). "x3" after an entry repeats it. A minus may
// be the hyphen or the Unicode minus sign.
//
// A pattern is butterworth@W, bessel@W, equal@W (W in rad/s), plant*K,
// controller*K or floor.
//
// It fails, with one line that names the entry, where the text is anything
// else, a value is not finite, a complex pole lacks its partner, or there are
// more than Max poles.
func Parse(list string) (*Spec, error) {
	if strings.TrimSpace(list) == "" {
		return nil, fmt.Errorf("the list is empty; expected poles like -4±3i, -6 or a pattern like butterworth@20")
	}
	if spec, err := parsePattern(list); spec != nil || err != nil {
		return spec, err
	}
	spec := new(Spec)
	for k, rest, more := 1, list, true; more; k++ {
		var text string
		text, rest, more = strings.Cut(rest, ",")
		e, err := parseEntry(text)
		if err != nil {
			return nil, fmt.Errorf("entry %d %s: %w", k, quoted(text), err)
		}
		if len(spec.Poles)+e.repeat*len(e.poles) > Max {
			return nil, fmt.Errorf("entry %d %s: more than %d poles; expected at most %d", k, quoted(text), Max, Max)
		}
		spec.append(e)
	}
	if v, alone := unpaired(spec.Poles); alone {
		return nil, withoutPartner(v)
	}
	return spec, nil
}

func (s *Spec) append(e entry) {
	for range e.repeat {
		s.Poles = append(s.Poles, e.poles...)
	}
	if e.inS && s.InS == nil {
		s.InS = make([]bool, len(s.Poles)-e.repeat*len(e.poles), len(s.Poles))
	}
	if s.InS != nil {
		for len(s.InS) < len(s.Poles) {
			s.InS = append(s.InS, e.inS)
		}
	}
}

// ParseOne reads one entry of a list without a repeat: one value for a real
// pole, two for a conjugate pair or for frequency@damping.
func ParseOne(text string) ([]complex128, error) {
	e, err := parseEntry(text)
	switch {
	case err != nil:
		return nil, fmt.Errorf("%s: %w", quoted(text), err)
	case e.repeated:
		return nil, fmt.Errorf("%s: a repeat has no meaning here; expected one place", quoted(text))
	}
	if v, alone := unpaired(e.poles); alone {
		return nil, withoutPartner(v)
	}
	return e.poles, nil
}

// ConjugateClosed fails where a complex pole has no partner in the list, or a
// pole is not finite.
func ConjugateClosed(list []complex128) error {
	for _, v := range list {
		if !finite(v) {
			return fmt.Errorf("pole %s: not finite; expected finite numbers", Format(v))
		}
	}
	if v, alone := unpaired(list); alone {
		return withoutPartner(v)
	}
	return nil
}

func withoutPartner(v complex128) error {
	return fmt.Errorf("pole %s: its conjugate is missing; expected the pair %s", Format(v), formatPair(v))
}

// unpaired finds a complex pole that occurs more often than its conjugate.
func unpaired(list []complex128) (complex128, bool) {
	for _, v := range list {
		if imag(v) != 0 && count(list, v) > count(list, complex(real(v), -imag(v))) {
			return v, true
		}
	}
	return 0, false
}

func count(list []complex128, v complex128) (n int) {
	for _, w := range list {
		if w == v {
			n++
		}
	}
	return n
}

// quoted is user text made safe for one line.
func quoted(text string) string {
	text = strings.TrimSpace(text)
	const most = 40
	if runes := []rune(text[:min(len(text), 4*most)]); len(runes) > most {
		text = string(runes[:most]) + "…"
	}
	return fmt.Sprintf("%q", text)
}

// parsePattern returns nil and no error where the text is no pattern.
func parsePattern(text string) (*Spec, error) {
	text = strings.TrimSpace(text)
	word := text
	if k := strings.IndexAny(text, "@*, \t"); k >= 0 {
		word = text[:k]
	}
	kind := List
	for k := Butterworth; k <= Floor; k++ {
		if strings.EqualFold(word, kindNames[k]) {
			kind = k
		}
	}
	rest := strings.TrimSpace(text[len(word):])
	var sign, shape string
	switch kind {
	case List:
		return nil, nil
	case Floor:
		if rest != "" {
			return nil, fmt.Errorf("%s: a pattern stands alone; expected floor", quoted(text))
		}
		return &Spec{Kind: Floor}, nil
	case Plant, Controller:
		sign, shape = "*", kind.String()+"*K with a factor K, like "+kind.String()+"*3"
	default:
		sign, shape = "@", kind.String()+"@W with W in rad/s, like "+kind.String()+"@20"
	}
	if !strings.HasPrefix(rest, sign) {
		return nil, fmt.Errorf("%s: the pattern lacks its %s; expected %s", quoted(text), sign, shape)
	}
	s := scanner{text: strings.TrimSpace(rest[1:])}
	v, err := s.signed()
	switch {
	case err != nil:
		return nil, fmt.Errorf("%s: %w", quoted(text), err)
	case strings.HasPrefix(s.skip(), ","):
		return nil, fmt.Errorf("%s: a pattern stands alone; expected %s", quoted(text), shape)
	case s.skip() != "":
		return nil, fmt.Errorf("%s: unexpected %s; expected %s", quoted(text), quoted(s.text), shape)
	case !(v > 0):
		return nil, fmt.Errorf("%s: the value is not above zero; expected %s", quoted(text), shape)
	}
	return &Spec{Kind: kind, Value: v}, nil
}
