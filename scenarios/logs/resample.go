package logs

import (
	"io"
	"math"
)

// holdFor is how many of the log's own intervals a row is held on a grid. What
// comes later is lost until the next row.
const holdFor = 10

// gridSlack is how late, in grid periods, a row may be to count for an instant.
const gridSlack = 1e-6

// gridSize is the number of instants of a grid that starts with the log.
func gridSize(begin, end, period float64) float64 {
	return math.Floor((end-begin)/period+gridSlack) + 1
}

// grid holds the last row of a log at even instants.
type grid struct {
	queue  *lagQueue
	period float64
	hold   float64 // s for which a row stands
	k      int64
	begin  float64
	row    Sample // the row that holds
	later  Sample // the row after it
	have   bool
	end    bool
	now    Sample
}

func newGrid(q *lagQueue, period, interval float64) *grid {
	make := func() Sample { return newSample(len(q.rows.now.U), len(q.rows.now.Y), len(q.rows.now.Reference)) }
	return &grid{
		queue: q, period: period, hold: math.Max(holdFor*interval, period),
		row: make(), later: make(), now: make(),
	}
}

// Next gives the instant k·period behind the first row.
func (g *grid) Next() (*Sample, error) {
	if !g.have {
		s, err := g.queue.next()
		if err != nil {
			return nil, err
		}
		g.row.copyFrom(s)
		g.begin, g.have = s.T, true
		if err := g.read(); err != nil {
			return nil, err
		}
	}
	t := g.begin + float64(g.k)*g.period
	for !g.end && g.later.T <= t+gridSlack*g.period {
		g.row, g.later = g.later, g.row
		if err := g.read(); err != nil {
			return nil, err
		}
	}
	if g.end && t > g.row.T+gridSlack*g.period {
		return nil, io.EOF
	}
	g.k++
	g.now.copyFrom(&g.row)
	g.now.T, g.now.Missing = t, 0
	if t-g.row.T > g.hold {
		for i := range g.now.Y {
			g.now.Y[i] = math.NaN()
		}
		for i := range g.now.Reference {
			g.now.Reference[i] = math.NaN()
		}
	}
	return &g.now, nil
}

func (g *grid) read() error {
	s, err := g.queue.next()
	if err == io.EOF {
		g.end = true
		return nil
	}
	if err != nil {
		return err
	}
	g.later.copyFrom(s)
	return nil
}
