package api

import (
	"context"
	"fmt"
	"runtime"
)

// newSlots lets a bounded number of areas and pieces of batches be worked on at
// once, one fewer than there are processors, so that requests for a single place
// find one free however many run. A piece is 128 rows at most, or a feature; those
// that wait come in turn.
func newSlots() chan struct{} { return make(chan struct{}, max(1, runtime.GOMAXPROCS(0)-1)) }

// enterArea waits for an area's turn, which the caller must leave. It refuses where
// as many areas wait as may, and ends with the context.
func (s *Server) enterArea(ctx context.Context) (leave func(), err error) {
	select {
	case s.areas <- struct{}{}:
	default:
		s.metrics.refused.WithLabelValues(refusedArea).Inc()
		return nil, overload("too-many-areas", "Too many areas are asked about", fmt.Sprintf("%d areas are being worked on or wait, which is the limit of this instance; send it again later", cap(s.areas)))
	}
	select {
	case s.slots <- struct{}{}:
		return func() { <-s.slots; <-s.areas }, nil
	case <-ctx.Done():
		<-s.areas
		return nil, ctx.Err()
	}
}
