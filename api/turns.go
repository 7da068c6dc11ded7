package api

import (
	"context"
	"runtime"
)

// turns lets a bounded number of batches compute at once, one processor fewer
// than there are, so that requests for a single place find one free however many
// batches run. A batch gives its turn up whenever it waits for its client, which
// it does after at most one buffer of rows; those that wait come in turn.
type turns chan struct{}

func newTurns() turns { return make(turns, max(1, runtime.GOMAXPROCS(0)-1)) }

// turn is one batch's share in the turns. It is not safe for concurrent use.
type turn struct {
	all  turns
	held bool
}

// take waits for a turn, or for the end of the context.
func (t *turn) take(ctx context.Context) error {
	if t.held {
		return nil
	}
	select {
	case t.all <- struct{}{}:
		t.held = true
		return nil
	case <-ctx.Done():
		return ctx.Err()
	}
}

// give gives the turn up, where it is held.
func (t *turn) give() {
	if t.held {
		t.held = false
		<-t.all
	}
}
