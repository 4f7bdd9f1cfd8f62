package emit

import (
	"fmt"
	"strings"
)

// Identifiers are made of lower-case ASCII letters, digits and single inner
// underscores. Every one of them gets a class prefix ("pw_", "x_", "u_", ...)
// in front, so none can be a keyword of C or structured text, a name that the C
// standard reserves, or start with a digit; all are unique without regard to
// case, which structured text ignores.
const (
	maxID = 24 // bytes of one signal's identifier without its class prefix
	// The files' prefix, "pw_" + plant + "_" + candidate, is at most 36 bytes,
	// so that no identifier exceeds the 63 that C99 tells apart.
	maxPlant     = 20
	maxCandidate = 12
)

// identifier reduces free text to an identifier's characters, possibly none.
func identifier(text string, most int) string {
	var b strings.Builder
	gap := false
	for _, r := range text {
		if r >= 'A' && r <= 'Z' {
			r += 'a' - 'A'
		}
		if (r < 'a' || r > 'z') && (r < '0' || r > '9') {
			gap = b.Len() > 0
			continue
		}
		need := 1
		if gap {
			need = 2
		}
		if b.Len()+need > most {
			break
		}
		if gap {
			b.WriteByte('_')
		}
		b.WriteRune(r)
		gap = false
	}
	return b.String()
}

// giveIDs sets unique identifiers; a name without usable letters becomes its
// kind and number. A clash is resolved by the signal's number.
func giveIDs(signals []named, kind string) {
	count := map[string]int{}
	for i := range signals {
		id := identifier(signals[i].name, maxID)
		if id == "" {
			id = fmt.Sprintf("%s_%d", kind, i+1)
		}
		signals[i].id = id
		count[id]++
	}
	taken := map[string]bool{}
	for i := range signals {
		if count[signals[i].id] == 1 {
			taken[signals[i].id] = true
		}
	}
	for i := range signals {
		if count[signals[i].id] == 1 {
			continue
		}
		for k := i + 1; ; k++ {
			suffix := fmt.Sprintf("_%d", k)
			stem := signals[i].id
			if len(stem)+len(suffix) > maxID {
				stem = strings.TrimRight(stem[:maxID-len(suffix)], "_")
			}
			if id := stem + suffix; !taken[id] {
				signals[i].id = id
				taken[id] = true
				break
			}
		}
	}
}

// prefixOf names files and public identifiers after plant and candidate.
func prefixOf(plant, candidate string) string {
	prefix := "pw"
	for _, id := range []string{identifier(plant, maxPlant), identifier(candidate, maxCandidate)} {
		if id != "" {
			prefix += "_" + id
		}
	}
	if prefix == "pw" {
		return "pw_estimator"
	}
	return prefix
}
