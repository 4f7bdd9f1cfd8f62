package tolerance

import (
	"fmt"
	"maps"
	"math"
	"math/rand/v2"
	"slices"
	"strings"

	"polewright/plants"
)

const (
	// maxCorners is the number of toleranced parameters up to which every corner is
	// a case.
	maxCorners = 8
	// randomCorners are drawn beyond that.
	randomCorners = 1 << maxCorners
)

// Kind says how a case was chosen.
type Kind uint8

const (
	// Nominal is the plant as its file has it.
	Nominal Kind = iota
	// Corner has every toleranced parameter at one of its ends.
	Corner
	// Single has one parameter at one of its ends and the others nominal.
	Single
	// Inside is drawn evenly from the box.
	Inside
)

func (k Kind) String() string {
	switch k {
	case Nominal:
		return "nominal"
	case Corner:
		return "corner"
	case Single:
		return "one parameter alone"
	}
	return "inside"
}

// Case is one real plant of the study.
type Case struct {
	Kind Kind
	// Names of the toleranced parameters, in the plant's order, and the Factors
	// that multiply their values.
	Names   []string
	Factors []float64
}

// Truth returns the factors that differ from 1, by parameter: what a scenario's
// Factors, its [truth], takes so that this case becomes its real plant. It is
// empty for the nominal plant, and belongs to the caller.
func (c Case) Truth() map[string]float64 {
	out := make(map[string]float64)
	for i, f := range c.Factors {
		if f != 1 {
			out[c.Names[i]] = f
		}
	}
	return out
}

// TruthText is the [truth] table of a scenario file for this case. The factors
// read back exactly. It is empty for the nominal plant.
func (c Case) TruthText() string {
	factors := c.Truth()
	if len(factors) == 0 {
		return ""
	}
	var b strings.Builder
	b.WriteString("[truth]\n")
	for _, name := range slices.Sorted(maps.Keys(factors)) {
		fmt.Fprintf(&b, "%s = %v\n", name, number(factors[name]))
	}
	return b.String()
}

// number writes a float that TOML takes for one: never a bare whole number.
func number(v float64) string {
	s := fmt.Sprintf("%v", v)
	if !strings.ContainsAny(s, ".eE") {
		s += ".0"
	}
	return s
}

// String names the case by what differs: "mass −15 %, stiff +5 %".
func (c Case) String() string {
	var parts []string
	for i, f := range c.Factors {
		if f != 1 {
			parts = append(parts, fmt.Sprintf("%s %s %%", c.Names[i], strings.Replace(fmt.Sprintf("%+.3g", 100*(f-1)), "-", "−", 1)))
		}
	}
	if parts == nil {
		return "nominal"
	}
	return strings.Join(parts, ", ")
}

// toleranced lists the parameters whose tolerance moves something; notes name
// those whose does not.
func toleranced(p *plants.Plant) (list []plants.Parameter, notes []string, err error) {
	for _, q := range p.Parameters {
		switch {
		case q.Tolerance == 0:
		case !(q.Tolerance > 0 && q.Tolerance < 1) || math.IsNaN(q.Value):
			return nil, nil, fmt.Errorf("parameter %s has the tolerance %g, expected from 0 to below 1: %w", q.Name, q.Tolerance, ErrStudy)
		case q.Value == 0:
			notes = append(notes, fmt.Sprintf("%s is 0: a relative tolerance does not move it", q.Name))
		default:
			list = append(list, q)
		}
	}
	return list, notes, nil
}

// cases lists all cases of a study, the nominal one first. The list depends on
// the parameters, samples and seed alone.
func cases(list []plants.Parameter, samples int, seed uint64) (all []Case, exhaustive bool) {
	names := make([]string, len(list))
	for i, q := range list {
		names[i] = q.Name
	}
	add := func(kind Kind, factor func(i int) float64) {
		c := Case{Kind: kind, Names: names, Factors: make([]float64, len(list))}
		for i := range c.Factors {
			c.Factors[i] = factor(i)
		}
		all = append(all, c)
	}
	add(Nominal, func(int) float64 { return 1 })
	if len(list) == 0 {
		return all, true
	}
	end := func(i int, up bool) float64 {
		if up {
			return 1 + list[i].Tolerance
		}
		return 1 - list[i].Tolerance
	}
	draw := rand.New(rand.NewPCG(seed, 0))
	exhaustive = len(list) <= maxCorners
	if exhaustive {
		for bits := range 1 << len(list) {
			add(Corner, func(i int) float64 { return end(i, bits>>i&1 == 1) })
		}
	} else {
		for one := range list {
			for _, up := range []bool{false, true} {
				add(Single, func(i int) float64 {
					if i == one {
						return end(i, up)
					}
					return 1
				})
			}
		}
		for range randomCorners {
			add(Corner, func(i int) float64 { return end(i, draw.Uint64()&1 == 1) })
		}
	}
	for range samples {
		add(Inside, func(i int) float64 { return 1 + list[i].Tolerance*(2*draw.Float64()-1) })
	}
	return all, exhaustive
}
