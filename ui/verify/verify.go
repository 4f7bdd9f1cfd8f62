// Package verify recomputes what a session file stores: every candidate from the
// texts inside the session and its stored gain, held against the stored figures
// and against the limits of the scenario. Nothing is designed anew.
//
// How far a figure may be off follows from its own conditioning. Each candidate
// is judged again on a few neighbours: the same design with every entry of A, B,
// C, K and of the gain changed by a few units of its last place. What these
// neighbours do to a figure is what another machine's rounding could do to it
// (small-sample condition estimates: Kenney & Laub 1994, SIAM J. Sci. Comput. 15).
// A well-conditioned figure is so held to nine digits, and the eigenvalues of a
// deadbeat design to what they are worth.
package verify

import (
	"context"
	"errors"
	"fmt"

	"polewright/scenarios"
	"polewright/ui/measures"
	"polewright/ui/session"
)

// Report is what `verify --json` prints.
type Report struct {
	Format     int         `json:"format"`
	SavedBy    string      `json:"saved_by"`
	CheckedBy  string      `json:"checked_by"`
	SHA256     string      `json:"sha256"` // of the session file
	Plant      string      `json:"plant"`
	Scenario   string      `json:"scenario"`
	Texts      []Text      `json:"texts"`
	OK         bool        `json:"ok"`
	Candidates []Candidate `json:"candidates"`
	InHand     InHand      `json:"in_hand"`
	Caution    string      `json:"caution"`
}

// Text is one text inside the session.
type Text struct {
	What    string `json:"what"`
	File    string `json:"file"`
	SHA256  string `json:"sha256"` // of the text as it stands
	Matches bool   `json:"matches"`
}

// Candidate is one candidate and what was found.
type Candidate struct {
	Name        string           `json:"name"`
	Form        string           `json:"form"`
	Method      string           `json:"method"`
	OK          bool             `json:"ok"`
	Compared    int              `json:"compared"` // figures
	Differences []Difference     `json:"differences"`
	Limits      []measures.Limit `json:"limits"`
	LimitsMet   bool             `json:"limits_met"`
	Diverged    bool             `json:"diverged"` // the scenario's run
	Settle      measures.Number  `json:"settle_s"`
	OverFloor   measures.Number  `json:"over_floor_rms"`
	Warnings    []string         `json:"warnings"`
}

// Difference is one stored figure that is not what comes out.
type Difference struct {
	Key        string          `json:"key"`        // as in `design --json`, or of the session
	At         string          `json:"at"`         // which of several; empty for one alone
	Stored     any             `json:"stored"`     // nil for none
	Recomputed any             `json:"recomputed"` // nil for none
	Tolerance  measures.Number `json:"tolerance"`  // null where nothing but the same will do
}

// InHand is the design in hand. A session stores no figures of it, so that only
// its gain is held against its poles, and against the selected candidate's.
type InHand struct {
	Checked     bool         `json:"checked"`
	OK          bool         `json:"ok"`
	Differences []Difference `json:"differences"`
}

// Check recomputes a session. program names the one that checks: figures that
// another version did not store are not missed. It fails where a model cannot be
// analysed, a scenario cannot be run, or ctx ends; whatever is only different is in
// the report.
func Check(ctx context.Context, k *session.Kept, program string) (*Report, error) {
	r := &Report{Format: 1, SavedBy: k.Program, CheckedBy: program, SHA256: fmt.Sprintf("%x", k.Sum[:]),
		Plant: k.Bench.Plant.Name, Scenario: k.Bench.Scenario.Name, OK: true, Texts: []Text{}, Candidates: []Candidate{}, Caution: measures.Caution}
	for _, t := range k.Texts {
		r.Texts = append(r.Texts, Text(t))
		r.OK = r.OK && t.Matches
	}
	runner, err := scenarios.NewRunner(k.Bench.Plant, k.Bench.Model, k.Bench.Scenario, k.Bench.Truth)
	if err != nil {
		return nil, err
	}
	c := &checker{bench: k.Bench, runner: runner, strict: k.Program == program}
	for i := range k.Designs {
		got, err := c.candidate(ctx, &k.Designs[i])
		if err != nil {
			return nil, fmt.Errorf("candidate %s: %w", k.Designs[i].Name, err)
		}
		r.OK = r.OK && got.OK
		r.Candidates = append(r.Candidates, *got)
	}
	if r.InHand, err = c.inHand(ctx, k); err != nil {
		return nil, fmt.Errorf("the design in hand: %w", err)
	}
	r.OK = r.OK && r.InHand.OK
	return r, nil
}

// Verdict says in one error what is wrong; nil where nothing is.
func (r *Report) Verdict() error {
	if r.OK {
		return nil
	}
	for _, t := range r.Texts {
		if !t.Matches {
			return fmt.Errorf("%s.text: does not match its sha256; the text as it was saved", t.What)
		}
	}
	for _, c := range r.Candidates {
		switch n := len(c.Differences); {
		case n == 1:
			return fmt.Errorf("candidate %s: 1 stored figure is not what its gain gives (%s); the session as it was saved", c.Name, c.Differences[0].name())
		case n > 1:
			return fmt.Errorf("candidate %s: %d stored figures are not what its gain gives (first %s); the session as it was saved", c.Name, n, c.Differences[0].name())
		}
	}
	for _, d := range r.InHand.Differences {
		return fmt.Errorf("current: %s is not what its gain gives; the session as it was saved", d.name())
	}
	for _, c := range r.Candidates {
		for _, l := range c.Limits {
			if !l.Met {
				return fmt.Errorf("candidate %s: a limit is not met: %s", c.Name, l.Name)
			}
		}
	}
	return errors.New("not as it was saved")
}

func (d *Difference) name() string {
	if d.At == "" {
		return d.Key
	}
	return d.Key + ", " + d.At
}
