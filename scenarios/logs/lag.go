package logs

import "io"

// lagQueue shifts the inputs of rows against the rest. A positive lag gives a row
// the inputs of an earlier one, a negative lag those of a later one.
type lagQueue struct {
	rows *rows
	lag  int
	ring []Sample // the last |lag|+1 rows read
	read int      // rows read into the ring so far
	out  int      // rows given out so far
	end  bool
	now  Sample
}

func (q *lagQueue) reset(r *rows, lag int) {
	*q = lagQueue{rows: r, lag: lag}
	if lag == 0 {
		return
	}
	q.ring = make([]Sample, max(lag, -lag)+1)
	for i := range q.ring {
		q.ring[i] = newSample(len(r.now.U), len(r.now.Y), len(r.now.Reference))
	}
	q.now = newSample(len(r.now.U), len(r.now.Y), len(r.now.Reference))
}

func (q *lagQueue) row(k int) *Sample { return &q.ring[k%len(q.ring)] }

// next gives the next row with its inputs. The sample is overwritten by the call
// after.
func (q *lagQueue) next() (*Sample, error) {
	if q.lag == 0 {
		if err := q.rows.next(); err != nil {
			return nil, err
		}
		return &q.rows.now, nil
	}
	ahead := max(-q.lag, 0)
	for !q.end && q.read <= q.out+ahead {
		err := q.rows.next()
		if err == io.EOF {
			q.end = true
			break
		}
		if err != nil {
			return nil, err
		}
		q.row(q.read).copyFrom(&q.rows.now)
		q.read++
	}
	if q.out == q.read {
		return nil, io.EOF
	}
	from := q.row(min(max(q.out-q.lag, 0), q.read-1))
	q.now.copyFrom(q.row(q.out))
	copy(q.now.U, from.U)
	q.now.Held = from.Held
	q.out++
	return &q.now, nil
}
