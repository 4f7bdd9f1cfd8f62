// Package newest runs background work of which only the newest request matters:
// asking never waits, a request that waits is replaced, and the work in progress
// is told to stop.
package newest

import (
	"context"
	"sync"
)

// Box holds at most one waiting request and one worker that serves it.
type Box[R any] struct {
	wake chan struct{}
	done chan struct{}
	base context.Context
	stop context.CancelFunc

	mu      sync.Mutex
	waiting bool
	pending R
	cancel  context.CancelFunc // of the work in progress
}

// Start starts the worker. serve is called for one request at a time; its context
// is cancelled by a newer request or by Close. It must not panic.
func Start[R any](serve func(ctx context.Context, r R)) *Box[R] {
	b := &Box[R]{wake: make(chan struct{}, 1), done: make(chan struct{})}
	b.base, b.stop = context.WithCancel(context.Background())
	go b.loop(serve)
	return b
}

// Ask hands over a request and returns at once.
func (b *Box[R]) Ask(r R) {
	b.mu.Lock()
	b.pending, b.waiting = r, true
	if b.cancel != nil {
		b.cancel()
	}
	b.mu.Unlock()
	select {
	case b.wake <- struct{}{}:
	default:
	}
}

// Closed reports whether Close was called: what the worker finds then interests
// nobody.
func (b *Box[R]) Closed() bool { return b.base.Err() != nil }

// Close cancels the work in progress and waits for the worker to end.
func (b *Box[R]) Close() {
	b.stop()
	<-b.done
}

func (b *Box[R]) loop(serve func(context.Context, R)) {
	defer close(b.done)
	for {
		select {
		case <-b.base.Done():
			return
		case <-b.wake:
		}
		for {
			r, ctx, ok := b.take()
			if !ok {
				break
			}
			serve(ctx, r)
		}
	}
}

// take removes the waiting request and gives it a context of its own.
func (b *Box[R]) take() (r R, ctx context.Context, ok bool) {
	b.mu.Lock()
	defer b.mu.Unlock()
	if b.cancel != nil {
		b.cancel()
		b.cancel = nil
	}
	if !b.waiting || b.base.Err() != nil {
		return r, nil, false
	}
	r = b.pending
	var none R
	b.pending, b.waiting = none, false
	ctx, b.cancel = context.WithCancel(b.base)
	return r, ctx, true
}
