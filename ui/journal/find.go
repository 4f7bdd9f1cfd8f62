package journal

import (
	"encoding/hex"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"sort"
	"strings"

	"polewright/ui/desk"
	"polewright/ui/session"
)

// maxFile bounds what is read of a journal, in bytes.
const maxFile = 64 << 20

// Found is work that a program left unsaved. It is held, so that no other start
// offers it, until it is taken up by Continue, dropped or released.
type Found struct {
	Mark session.Mark
	held *held
	data []byte
}

// Find returns what was left, the newest first. Journals of programs that run,
// and those that wanted refuses, are left alone. wanted may be nil.
func Find(folder string, wanted func(m session.Mark) bool) []*Found {
	names, _ := os.ReadDir(folder)
	var found []*Found
	for _, e := range names {
		stem, ok := strings.CutSuffix(e.Name(), ending)
		if !ok || !e.Type().IsRegular() {
			continue
		}
		h, ok := claim(filepath.Join(folder, stem))
		if !ok {
			continue
		}
		data, err := readAll(h.path + ending)
		mark := session.DraftMark(data)
		if err != nil || mark == nil || wanted != nil && !wanted(*mark) {
			h.release()
			continue
		}
		found = append(found, &Found{Mark: *mark, held: h, data: data})
	}
	sort.SliceStable(found, func(i, j int) bool { return found[i].Mark.Written.After(found[j].Mark.Written) })
	return found
}

func readAll(path string) ([]byte, error) {
	f, err := os.Open(path)
	if err != nil {
		return nil, err
	}
	defer f.Close()
	data, err := io.ReadAll(io.LimitReader(f, maxFile+1))
	if err == nil && len(data) > maxFile {
		err = fmt.Errorf("larger than %d bytes", maxFile)
	}
	return data, err
}

// Work returns the work, with the session file that it belonged to, and what
// stands for that file's content as the work knew it.
func (f *Found) Work() (*desk.Work, session.Sum, error) {
	w, err := session.Decode("journal "+filepath.Base(f.held.path), f.data)
	if err != nil {
		return nil, session.Sum{}, err
	}
	var sum session.Sum
	if f.Mark.File != "" {
		if !filepath.IsAbs(f.Mark.File) {
			return nil, session.Sum{}, errors.New("the journal names no session file that can be found again")
		}
		w.File = f.Mark.File
		if b, err := hex.DecodeString(f.Mark.Content); err == nil {
			copy(sum[:], b)
		}
	}
	return w, sum, nil
}

// Drop removes the journal for ever.
func (f *Found) Drop() { f.held.remove() }

// Release leaves the journal for a later start.
func (f *Found) Release() { f.held.release() }
