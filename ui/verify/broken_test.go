package verify_test

import (
	"context"
	"encoding/json"
	"math/rand/v2"
	"slices"
	"testing"

	"polewright/ui/internal/sample"
	"polewright/ui/report"
	"polewright/ui/session"
	"polewright/ui/verify"
)

// spoil puts something else in the place of one node of a tree, at random.
func spoil(r *rand.Rand, v any) any {
	others := []any{nil, "word", 1e300, -1.0, 0.0, true, []any{}, []any{[]any{1.0, 2.0}}, map[string]any{}}
	switch v := v.(type) {
	case map[string]any:
		if len(v) > 0 && r.IntN(12) > 0 {
			var names []string
			for name := range v {
				names = append(names, name)
			}
			slices.Sort(names)
			name := names[r.IntN(len(names))]
			v[name] = spoil(r, v[name])
			return v
		}
	case []any:
		if len(v) > 0 && r.IntN(12) > 0 {
			i := r.IntN(len(v))
			v[i] = spoil(r, v[i])
			return v
		}
	}
	return others[r.IntN(len(others))]
}

// Whatever a session holds, checking and printing it ends with an answer or an
// error.
func TestBrokenSessions(t *testing.T) {
	s := store(t, "twin-drum", sample.Entry{}, sample.Entry{Poles: "-1,-2"})
	r := rand.New(rand.NewPCG(3, 14))
	judged := 0
	for range 50 {
		broken := s.again(t)
		key := []string{"candidates", "candidates", "candidates", "current", "selected", "period_s"}[r.IntN(6)]
		broken.tree[key] = spoil(r, broken.tree[key])
		data, err := json.Marshal(broken.tree)
		if err != nil {
			t.Fatal(err)
		}
		k, err := session.DecodeKept("broken", data)
		if err != nil {
			continue
		}
		if _, err := verify.Check(context.Background(), k, sample.Program); err == nil {
			judged++
		}
		if _, err := report.Make(context.Background(), k, report.Options{}); err != nil && err.Error() == "" {
			t.Error("an error without words")
		}
	}
	if judged < 3 {
		t.Errorf("only %d of the broken sessions could be judged", judged)
	}
}
