package emit

// Run is a run made for a test: what goes in, what the package expects, and the
// allowed distance per state over the whole run.
type Run struct {
	U, Y, Expected [][]float64
	Missing, Used  [][]bool
	Tolerance      []float64
}

// RunOf makes a run of any length for a design; Tolerance holds for its first
// follow samples.
func RunOf(src Source, steps, follow int) (*Run, error) {
	p, err := newProgram(&src, src.Arithmetic)
	if err != nil {
		return nil, err
	}
	t, err := runSelfTest(p, steps, follow)
	if err != nil {
		return nil, err
	}
	return &Run{U: t.u, Y: t.y, Expected: t.expected, Missing: t.missing, Used: t.used, Tolerance: t.tolerance}, nil
}

// Plain, Identifier and PrefixOf give the tests their inner namesakes.
var (
	Plain    = plain
	PrefixOf = prefixOf
)

// IDs returns the identifiers that names of one kind get.
func IDs(names []string, kind string) []string {
	s := make([]named, len(names))
	for i, n := range names {
		s[i].name = n
	}
	giveIDs(s, kind)
	ids := make([]string, len(s))
	for i := range s {
		ids[i] = s[i].id
	}
	return ids
}
