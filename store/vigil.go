package store

import (
	"context"
	"fmt"
	"time"
)

// vigil ends a context when nothing was heard for a time. A transfer may take as long
// as it needs while something comes; a server that is frozen, unreachable, or holds
// the rows locked is noticed all the same.
type vigil struct {
	limit  time.Duration
	timer  *time.Timer
	cancel context.CancelCauseFunc
	ctx    context.Context
}

func keepVigil(ctx context.Context, limit time.Duration) (context.Context, *vigil) {
	v := &vigil{limit: limit}
	v.ctx, v.cancel = context.WithCancelCause(ctx)
	v.timer = time.AfterFunc(limit, func() {
		v.cancel(&Error{Op: "load", Kind: ErrUnavailable, Err: fmt.Errorf("nothing came for %v; it is frozen, out of reach, or holds the rows locked", limit)})
	})
	return v.ctx, v
}

// heard begins the time anew.
func (v *vigil) heard() { v.timer.Reset(v.limit) }

// end ends the vigil and returns the error with which what it watched ended, or, where
// it was the silence that ended it, that.
func (v *vigil) end(err error) error {
	v.timer.Stop()
	cause := context.Cause(v.ctx)
	v.cancel(nil)
	if silence, ok := cause.(*Error); ok && err != nil {
		return silence
	}
	return err
}
