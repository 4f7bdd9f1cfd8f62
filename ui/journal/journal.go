package journal

import (
	"crypto/rand"
	"encoding/hex"
	"errors"
	"fmt"
	"path/filepath"
	"sync"
	"time"

	"polewright/ui/desk"
	"polewright/ui/session"
)

// Journal is the one of a running program. Its methods may be called from several
// goroutines; one goroutine writes, the newest work replaces what waits.
type Journal struct {
	program string
	held    *held

	mu      sync.Mutex
	change  *sync.Cond
	waits   *entry // what is to be written next
	drop    bool   // ... or the file removed
	busy    bool
	closed  bool
	done    chan struct{}
	failure error // of the last write
	written bool  // the file exists
}

type entry struct {
	work desk.Work
	mark session.Mark
}

// Open makes the journal of this program in a folder. Nothing is written before
// the first Keep. program is the name and version that writes.
func Open(folder, program string) (*Journal, error) {
	if err := prepare(folder); err != nil {
		return nil, err
	}
	var random [8]byte
	_, _ = rand.Read(random[:]) // cannot fail
	h, ok := claim(filepath.Join(folder, hex.EncodeToString(random[:])))
	if !ok {
		return nil, errors.New("no file can be made in " + folder)
	}
	return start(h, program, false), nil
}

// Continue makes the journal that was found that of this program: it stays until
// the work is saved or given up.
func (f *Found) Continue(program string) *Journal {
	h := *f.held
	f.held.lock = nil
	return start(&h, program, true)
}

func start(h *held, program string, written bool) *Journal {
	j := &Journal{program: program, held: h, done: make(chan struct{}), written: written}
	j.change = sync.NewCond(&j.mu)
	go j.run()
	return j
}

// Keep notes work that is not saved. It does not wait for the disk.
func (j *Journal) Keep(w desk.Work, mark session.Mark) {
	j.mu.Lock()
	defer j.mu.Unlock()
	mark.Plant, mark.Written = w.Bench.Plant.Name, time.Now()
	j.waits, j.drop = &entry{work: w, mark: mark}, false
	j.change.Broadcast()
}

// Saved says that nothing is unsaved any more: the file goes. It does not wait for
// the disk.
func (j *Journal) Saved() {
	j.mu.Lock()
	defer j.mu.Unlock()
	j.waits, j.drop = nil, true
	j.change.Broadcast()
}

// Flush waits until everything before it is on the disk and returns why it is
// not.
func (j *Journal) Flush() error {
	j.mu.Lock()
	defer j.mu.Unlock()
	for (j.busy || j.waits != nil || j.drop) && !j.closed {
		j.change.Wait()
	}
	return j.failure
}

// Close ends the journal after what waits was written. With keep the file is left
// for the next start, else it goes.
func (j *Journal) Close(keep bool) error {
	err := j.Flush()
	j.mu.Lock()
	first := !j.closed
	j.closed = true
	j.change.Broadcast()
	j.mu.Unlock()
	<-j.done
	if first && keep {
		j.held.release()
	} else if first {
		j.held.remove()
	}
	return err
}

// run writes, one after the other.
func (j *Journal) run() {
	defer close(j.done)
	j.mu.Lock()
	defer j.mu.Unlock()
	for {
		for j.waits == nil && !j.drop && !j.closed {
			j.change.Wait()
		}
		if j.closed {
			return
		}
		e := j.waits
		j.waits, j.drop, j.busy = nil, false, true
		written := j.written
		j.mu.Unlock()
		var err error
		if e != nil {
			err = j.write(e)
			written = written || err == nil
		} else if written {
			err = removeWork(j.held.path)
			written = err != nil
		}
		j.mu.Lock()
		j.busy, j.failure, j.written = false, err, written
		j.change.Broadcast()
	}
}

func (j *Journal) write(e *entry) (err error) {
	defer func() { // nothing here may take the terminal down
		if r := recover(); r != nil {
			err = fmt.Errorf("the journal failed: %v", r)
		}
	}()
	data, err := session.EncodeDraft(j.program, &e.work, &e.mark)
	if err != nil {
		return err
	}
	return session.WritePrivate(j.held.path+ending, data)
}
