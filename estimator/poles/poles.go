// Package poles reads, prints, describes and compares sets of poles. It knows
// the list syntax that people type, the usual patterns (Butterworth, Bessel, all
// equal, a factor faster than a given set), and the way between the s-plane and
// the z-plane.
//
// Poles are in rad/s in the s-plane and without unit in the z-plane; periods are
// in seconds. Every function is pure.
package poles

// Kind says how a Spec gives its poles.
type Kind uint8

const (
	// List gives every pole.
	List Kind = iota
	// Butterworth spreads them evenly on a half circle, see ButterworthAt.
	Butterworth
	// Bessel takes the poles of the flattest delay, see BesselAt.
	Bessel
	// Equal puts all at one place on the negative real axis.
	Equal
	// Plant makes the plant's own poles faster, see Faster.
	Plant
	// Controller makes the poles of A − B K faster, see Faster.
	Controller
	// Floor takes the poles of the best linear estimator.
	Floor
)

// String is the word that starts the pattern, "list" for a list.
func (k Kind) String() string {
	if int(k) < len(kindNames) {
		return kindNames[k]
	}
	return "unknown"
}

var kindNames = [...]string{"list", "butterworth", "bessel", "equal", "plant", "controller", "floor"}

// Max is the largest number of poles in one list.
const Max = 200

// Spec is a parsed list or pattern. Poles is set for List, Value for a pattern:
// W in rad/s for Butterworth, Bessel and Equal, the factor K for Plant and
// Controller, zero for Floor.
type Spec struct {
	Kind  Kind
	Poles []complex128
	Value float64
	// InS marks the poles of a List that were given as frequency@damping: they
	// are places in the s-plane even where the rest of the list is in the
	// z-plane. Nil where there are none, else as long as Poles.
	InS []bool
}

// String writes the Spec in the syntax of Parse. A pole given as
// frequency@damping comes out as a place in the s-plane.
func (s *Spec) String() string {
	switch s.Kind {
	case List:
		return FormatList(s.Poles)
	case Butterworth, Bessel, Equal:
		return s.Kind.String() + "@" + number(s.Value)
	case Plant, Controller:
		return s.Kind.String() + "*" + number(s.Value)
	}
	return s.Kind.String()
}
