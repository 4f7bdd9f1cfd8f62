package solver

import (
	"context"
	"sync"
	"sync/atomic"
	"testing"
	"time"

	"polewright/ui/desk"
)

// collect gathers answers and lets a test wait for one.
type collect struct {
	mu   sync.Mutex
	got  []desk.Answer
	seen chan desk.Answer
}

func newCollect() *collect { return &collect{seen: make(chan desk.Answer, 20000)} }

func (c *collect) notify(a desk.Answer) {
	c.mu.Lock()
	c.got = append(c.got, a)
	c.mu.Unlock()
	c.seen <- a
}

func (c *collect) waitFor(t *testing.T, gen uint64, stage desk.Stage) desk.Answer {
	t.Helper()
	limit := time.After(20 * time.Second)
	for {
		select {
		case a := <-c.seen:
			if a.Gen == gen && a.Stage == stage {
				return a
			}
		case <-limit:
			t.Fatalf("no answer to request %d", gen)
		}
	}
}

func TestBurstAnswersTheLastInFewRuns(t *testing.T) {
	var runs atomic.Int64
	c := newCollect()
	s := start(func(ctx context.Context, r desk.Request, send func(desk.Answer)) {
		runs.Add(1)
		send(desk.Answer{Stage: desk.Judged})
		select { // a slow second stage that gives way
		case <-ctx.Done():
			return
		case <-time.After(5 * time.Millisecond):
		}
		send(desk.Answer{Stage: desk.Traced})
	}, c.notify)
	defer s.Close()
	const last = 10000
	for gen := uint64(1); gen <= last; gen++ {
		s.Ask(desk.Request{Gen: gen})
	}
	c.waitFor(t, last, desk.Traced)
	if n := runs.Load(); n > last/2 {
		t.Errorf("%d runs for %d requests: the newest should replace those that wait", n, last)
	}
	c.mu.Lock()
	defer c.mu.Unlock()
	for i := 1; i < len(c.got); i++ {
		if c.got[i].Gen < c.got[i-1].Gen {
			t.Fatalf("answer %d came after %d", c.got[i].Gen, c.got[i-1].Gen)
		}
	}
}

func TestFirstStageIsNotStarvedByAHeldKey(t *testing.T) {
	c := newCollect()
	s := start(func(ctx context.Context, r desk.Request, send func(desk.Answer)) {
		send(desk.Answer{Stage: desk.Judged})
		<-ctx.Done() // the second stage never ends by itself
	}, c.notify)
	defer s.Close()
	for gen := uint64(1); gen <= 50; gen++ {
		s.Ask(desk.Request{Gen: gen})
		c.waitFor(t, gen, desk.Judged)
	}
}

func TestPanicIsAnAnswerAndTheWorkerLives(t *testing.T) {
	c := newCollect()
	s := start(func(_ context.Context, r desk.Request, send func(desk.Answer)) {
		if r.Gen == 1 {
			panic("blas: bad length")
		}
		send(desk.Answer{Stage: desk.Judged})
	}, c.notify)
	defer s.Close()
	s.Ask(desk.Request{Gen: 1})
	if a := c.waitFor(t, 1, desk.Judged); a.Err == nil {
		t.Error("a broken design gave no error")
	}
	s.Ask(desk.Request{Gen: 2})
	if a := c.waitFor(t, 2, desk.Judged); a.Err != nil {
		t.Errorf("the next request failed too: %v", a.Err)
	}
}

func TestCloseCancelsAndWaits(t *testing.T) {
	ended := make(chan struct{})
	began := make(chan struct{})
	s := start(func(ctx context.Context, _ desk.Request, send func(desk.Answer)) {
		close(began)
		<-ctx.Done()
		send(desk.Answer{})
		close(ended)
	}, func(desk.Answer) { t.Error("an answer after closing") })
	s.Ask(desk.Request{Gen: 1})
	<-began
	s.Close()
	select {
	case <-ended:
	default:
		t.Error("Close did not wait for the work in progress")
	}
	s.Ask(desk.Request{Gen: 2}) // must neither wait nor be served
}
