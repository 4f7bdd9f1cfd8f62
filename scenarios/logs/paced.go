package logs

import "io"

// paced gives the rows of a log with the number of rows missing before each. Where
// that is in doubt it reads some rows ahead.
type paced struct {
	queue *lagQueue
	slots slots
	ahead []Sample // rows read ahead, a ring
	first int      // the oldest of them
	held  int      // how many there are
	end   bool
}

func newPaced(q *lagQueue, period float64) *paced {
	return &paced{queue: q, slots: slots{period: period}}
}

// Next gives the next row.
func (p *paced) Next() (*Sample, error) {
	if p.held == 0 {
		s, err := p.queue.next()
		if err != nil {
			return nil, err
		}
		p.slots.add(s.T)
		if k, ok := p.slots.next(false); ok {
			s.Missing = max(k-1, 0)
			return s, nil
		}
		p.keep(s)
	}
	for {
		if k, ok := p.slots.next(p.end); ok {
			s := &p.ahead[p.first]
			p.first = (p.first + 1) % len(p.ahead)
			p.held--
			s.Missing = max(k-1, 0)
			return s, nil
		}
		s, err := p.queue.next()
		if err == io.EOF {
			p.end = true
			continue
		}
		if err != nil {
			return nil, err
		}
		p.slots.add(s.T)
		p.keep(s)
	}
}

// keep copies a row behind those that are read ahead. The ring has one place more
// than there are pending rows, so that the row given out last stays as it is.
func (p *paced) keep(s *Sample) {
	if p.ahead == nil {
		p.ahead = make([]Sample, lookAhead+2)
		for i := range p.ahead {
			p.ahead[i] = newSample(len(s.U), len(s.Y), len(s.Reference))
		}
	}
	p.ahead[(p.first+p.held)%len(p.ahead)].copyFrom(s)
	p.held++
}
