package launch

import (
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"fmt"
	"io/fs"
	"path/filepath"
	"sync"

	"polewright/ui/desk"
	"polewright/ui/session"
)

// store saves sessions for the screen. It knows what each file held when it was
// read, written or asked about, and replaces nothing else.
type store struct {
	program string

	mu    sync.Mutex
	own   content // the file that this session was read from or saved to
	asked content // the file that the person was last asked about
	last  string  // as named, where the work was last saved; empty before
}

// content is a file, by its absolute path, and what it held.
type content struct {
	path string
	sum  session.Sum
}

// Saver returns what saves the work of a dialogue: a file that is not its own, and
// one that someone else changed since it was read or saved, is refused with an error
// that is fs.ErrExist, unless replace says so. known stands for the content of the
// session file that the work was read from.
func Saver(program string, w desk.Work, known session.Sum) (func(file string, w desk.Work, replace bool) error, error) {
	s, err := newStore(&Options{Program: program, Work: w, Known: known})
	if err != nil {
		return nil, err
	}
	return s.save, nil
}

// save writes a session file. A file that is not this session's own, and one that
// someone else changed meanwhile, is refused with an error that is fs.ErrExist.
// With replace, the very content that was refused before is replaced; the session's
// own file never without having been refused.
func (s *store) save(file string, w desk.Work, replace bool) error {
	data, err := session.Encode(s.program, &w)
	if err != nil {
		return err
	}
	path, err := filepath.Abs(file)
	if err != nil {
		return fmt.Errorf("%s: the working folder is gone", file)
	}
	s.mu.Lock()
	defer s.mu.Unlock()
	if err := s.write(path, data, replace); err != nil {
		var e *fs.PathError
		if errors.As(err, &e) {
			err = e.Err
		}
		return fmt.Errorf("%s: %w", file, err)
	}
	s.own, s.asked, s.last = content{path, sha256.Sum256(data)}, content{}, file
	return nil
}

func (s *store) write(path string, data []byte, replace bool) error {
	var err error
	if path == s.own.path {
		err = session.Replace(path, data, s.own.sum)
	} else {
		err = session.WriteNew(path, data, false)
	}
	switch {
	case !replace || !errors.Is(err, fs.ErrExist):
	case path == s.asked.path:
		err = session.Replace(path, data, s.asked.sum)
	case path != s.own.path: // named outright, without having been refused
		err = session.WriteNew(path, data, true)
	}
	if errors.Is(err, fs.ErrExist) {
		s.asked = content{path: path}
		s.asked.sum, _ = session.SumOf(path) // what cannot be read cannot be replaced either
	}
	return err
}

// mark tells the journal which file the work belongs to.
func (s *store) mark() session.Mark {
	s.mu.Lock()
	defer s.mu.Unlock()
	if s.own.path == "" {
		return session.Mark{}
	}
	return session.Mark{File: s.own.path, Content: hex.EncodeToString(s.own.sum[:])}
}

func (s *store) where() string {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.last
}
