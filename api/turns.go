package api

import (
	"context"
	"fmt"
	"runtime"
	"sync/atomic"
	"time"

	"github.com/labstack/echo/v4"

	"nearmargin/api/access"
)

// newSlots lets as many goroutines of batches and areas compute at once as there are
// processors; a place is held for 128 rows at most, or an area, and those that wait
// come in turn.
func newSlots() chan struct{} { return make(chan struct{}, runtime.GOMAXPROCS(0)) }

// reserve keeps one place from batches and areas while places are asked for one at a
// time, so that those requests find a processor free however many batches run. Where
// all are busy, Go's scheduler looks for what came in from the network only now and
// then. With a single processor nothing is kept.
type reserve struct {
	slots chan struct{}
	began time.Time
	asked atomic.Int64 // when the last such request came, since began
	kept  atomic.Bool
}

func newReserve(slots chan struct{}) *reserve { return &reserve{slots: slots, began: time.Now()} }

// keepFree is how long the place is kept after a request.
const keepFree = time.Second

// note keeps a place free for a while after each look-up that takes no turn itself. Pages,
// probes and scrapes do not count: they come all the time, and can wait.
func (r *reserve) note(next echo.HandlerFunc) echo.HandlerFunc {
	return func(c echo.Context) error {
		if cap(r.slots) > 1 && scopes[c.Path()] == access.Query && c.Path() != "/v1/area" {
			r.asked.Store(int64(time.Since(r.began)))
			if r.kept.CompareAndSwap(false, true) {
				go r.keep()
			}
		}
		return next(c)
	}
}

func (r *reserve) keep() {
	r.slots <- struct{}{}
	for {
		left := keepFree - (time.Since(r.began) - time.Duration(r.asked.Load()))
		if left <= 0 {
			break
		}
		time.Sleep(left)
	}
	<-r.slots
	r.kept.Store(false)
}

// enterArea waits for an area's turn, which the caller must leave. It refuses where
// as many areas wait as may, and ends with the context.
func (s *Server) enterArea(ctx context.Context) (leave func(), err error) {
	select {
	case s.areas <- struct{}{}:
	default:
		s.metrics.refused.WithLabelValues(refusedArea).Inc()
		return nil, overload(kindManyAreas, "Too many areas are asked about", fmt.Sprintf("%d areas are being worked on or wait, which is the limit of this instance; send it again later", cap(s.areas)))
	}
	select {
	case s.slots <- struct{}{}:
		return func() { <-s.slots; <-s.areas }, nil
	case <-ctx.Done():
		<-s.areas
		return nil, ctx.Err()
	}
}
