package api

import (
	"runtime"
	"sync/atomic"
	"time"

	"github.com/labstack/echo/v4"
)

// turns lets a bounded number of pieces of batches be worked on at once. A piece is
// 128 rows at most; those that wait come in turn.
//
// While places are asked for one at a time as well, one processor is left free, so
// that they find it however many batches run: where all are busy, a request waits
// until Go's scheduler looks at the network, which may be 10 ms, and then for its
// place in the queue. Else batches have all processors.
type turns struct {
	slots chan struct{} // all processors but one
	spare chan struct{} // the last
	began time.Time
	asked atomic.Int64 // when a request other than a batch came last, since began
}

func newTurns() *turns {
	others := max(1, runtime.GOMAXPROCS(0)-1)
	t := &turns{slots: make(chan struct{}, others), spare: make(chan struct{}, runtime.GOMAXPROCS(0)-others), began: time.Now()}
	t.asked.Store(int64(-leaveFree))
	return t
}

// leaveFree is how long a processor is left free after a request.
const leaveFree = time.Second

// take calls work when its turn comes.
func (t *turns) take(work func()) {
	spare := t.spare
	if time.Since(t.began)-time.Duration(t.asked.Load()) < leaveFree {
		spare = nil // a send on it is never chosen
	}
	select {
	case t.slots <- struct{}{}:
		work()
		<-t.slots
	case spare <- struct{}{}:
		work()
		<-t.spare
	}
}

// note keeps a processor free for requests other than batches.
func (t *turns) note(next echo.HandlerFunc) echo.HandlerFunc {
	return func(c echo.Context) error {
		if c.Path() != "/v1/annotate" {
			t.asked.Store(int64(time.Since(t.began)))
		}
		return next(c)
	}
}
