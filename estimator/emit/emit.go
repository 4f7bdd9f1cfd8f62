// Package emit turns an estimator's design into the text of files for its
// target: C99, IEC 61131-3 structured text, JSON or CSV. It reads and writes no
// file; it returns texts as values, the same bytes for the same Source.
//
// What is emitted is the discrete estimator in absolute values. With
// deviations x, u, y from the operating point it computes, per sample,
//
//	prediction form: e = y − C x − D u,  x ← A x + B u + L e
//	current form:    e = y − C x − D u,  x ← x + Lf e,  then  x ← A x + B u
//
// where e of a sensor that is missing, not a number or out of its range is
// left out (zero), and e of a sensor that wraps is taken modulo its period.
package emit

import (
	"errors"
	"fmt"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
)

// Errors of Emit, besides those of estimator (ErrShape, ErrNotFinite).
var (
	// ErrContinuous reports a design without a sample period.
	ErrContinuous = errors.New("a continuous design cannot be emitted")
	// ErrTarget reports a target or an arithmetic that does not exist.
	ErrTarget = errors.New("no such target")
	// ErrValue reports a number that the target cannot hold or that has no meaning.
	ErrValue = errors.New("not a usable value")
)

// Target is the language of the emitted files.
type Target uint8

// The targets, by the names that the command line uses.
const (
	C99            Target = iota // "c99"
	StructuredText               // "st"
	JSON                         // "json"
	CSV                          // "csv"
)

// ParseTarget returns the target called name ("c99", "st", "json" or "csv").
func ParseTarget(name string) (Target, error) {
	for t := C99; t <= CSV; t++ {
		if t.String() == name {
			return t, nil
		}
	}
	return 0, fmt.Errorf("%w %q; one of c99, st, json, csv", ErrTarget, name)
}

// String returns the target's name on the command line.
func (t Target) String() string {
	switch t {
	case C99:
		return "c99"
	case StructuredText:
		return "st"
	case JSON:
		return "json"
	case CSV:
		return "csv"
	}
	return "unknown"
}

// Arithmetic is the number type of the emitted code.
type Arithmetic uint8

// The arithmetics. JSON and CSV carry full precision in any case.
const (
	Double Arithmetic = iota // IEEE 754 binary64: double, LREAL
	Float                    // IEEE 754 binary32: float, REAL
	// Fixed is 32-bit fixed point Qm.n, m = 31 − n, for C99 only: signals are
	// int32_t counts of 2⁻ⁿ of their unit. They saturate. Tables have as many
	// fraction bits of their own as keep the 64-bit accumulators from overflow.
	Fixed
)

// ParseArithmetic returns the arithmetic called name: "double", "float" or
// fixed point "qM.N" with M + N = 31 and N from 1 to 30, such as "q15.16"; then
// fractionBits is N, else 0.
func ParseArithmetic(name string) (a Arithmetic, fractionBits int, err error) {
	switch name {
	case "double":
		return Double, 0, nil
	case "float":
		return Float, 0, nil
	}
	for n := 1; n <= 30; n++ {
		if name == fmt.Sprintf("q%d.%d", 31-n, n) {
			return Fixed, n, nil
		}
	}
	return 0, 0, fmt.Errorf("%w: arithmetic %q; double, float or q15.16 (any qM.N with M + N = 31)", ErrTarget, name)
}

// Signal describes one state, input or sensor of the design model.
type Signal struct {
	Name string // empty: the model's name, or x1.., u1.., y1..
	Unit string
	// Offset is the operating point: absolute value = Offset + deviation.
	Offset float64
	// Range is the sensor's lowest and highest valid sample; nil for none.
	// A sample outside is rejected, one at an end is used. Ignored for states
	// and inputs.
	Range []float64
	// Wrap is the period of a sensor that wraps, 0 for none. Ignored for
	// states and inputs.
	Wrap float64
}

// Source is the design to be emitted. Texts may hold anything: they are
// neutralised before they reach code.
type Source struct {
	Model *estimator.Model // discrete
	Form  estimator.Form
	L     *mat.Dense // n×p, used in prediction form
	Lf    *mat.Dense // n×p, used in current form

	// One entry per state, input and sensor of the design model; nil for none,
	// which means the model's names, no unit, no offset, no range.
	States, Inputs, Sensors []Signal

	Arithmetic   Arithmetic
	FractionBits int // n of Qm.n, 1 to 30, Fixed only

	// Provenance, written into every file.
	Plant, Candidate           string
	PlantSHA256, SessionSHA256 string
	Version                    string // of the program
	// Cautions are sentences written behind the package's own, such as the
	// warnings of the design.
	Cautions []string
}

// File is one emitted file. Its name holds lower-case letters, digits,
// underscores and one dot only.
type File struct {
	Name string
	Text []byte
}

// Emit returns the files of a design for a target, in a fixed order. It fails
// with ErrContinuous for a design without a period, with estimator.ErrShape or
// estimator.ErrNotFinite where matrices are unusable, with ErrValue where a
// number has no meaning or does not fit the arithmetic, and with ErrTarget.
func Emit(src Source, target Target) ([]File, error) {
	if target > CSV {
		return nil, fmt.Errorf("%w: number %d", ErrTarget, target)
	}
	arithmetic := src.Arithmetic
	if target == JSON || target == CSV {
		arithmetic = Double
	}
	if target == StructuredText && arithmetic == Fixed {
		return nil, fmt.Errorf("%w: fixed point in structured text; use c99, or double or float", ErrTarget)
	}
	p, err := newProgram(&src, arithmetic)
	if err != nil {
		return nil, fmt.Errorf("emitting %s: %w", target, err)
	}
	switch target {
	case JSON:
		text, err := jsonText(p)
		if err != nil {
			return nil, err
		}
		return []File{{p.prefix + ".json", text}}, nil
	case CSV:
		return []File{{p.prefix + ".csv", csvText(p)}}, nil
	}
	test, err := newSelfTest(p)
	if err != nil {
		return nil, fmt.Errorf("self-test: %w", err)
	}
	if target == C99 {
		return []File{
			{p.prefix + ".h", cHeader(p)},
			{p.prefix + "_selftest.c", cSelfTest(p, test)},
		}, nil
	}
	return []File{
		{p.prefix + ".st", stBlock(p)},
		{p.prefix + "_selftest.st", stSelfTest(p, test)},
	}, nil
}
