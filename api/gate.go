package api

import (
	"fmt"
	"net/http"
	"strconv"
	"sync/atomic"
	"time"

	"nearmargin/api/access"
)

// gate lets a bounded number of batches in, and none once the service drains.
type gate struct {
	slots    chan struct{}
	draining atomic.Bool
}

func newGate(batches int) *gate { return &gate{slots: make(chan struct{}, batches)} }

// enter takes a place, which the caller must leave, or says why there is none.
func (g *gate) enter() (leave func(), err *Problem) {
	if g.draining.Load() {
		return nil, overload(kindDraining, "The service is shutting down", "this instance takes no more batches; send it again, to another one")
	}
	select {
	case g.slots <- struct{}{}:
		return func() { <-g.slots }, nil
	default:
		return nil, overload(kindManyBatches, "Too many batches run", fmt.Sprintf("%d batches run, which is the limit of this instance; send it again later", cap(g.slots)))
	}
}

// running is the number of batches that run.
func (g *gate) running() int { return len(g.slots) }

// retryAfter is what a client is told to wait when batches are refused.
const retryAfter = 5 * time.Second

func overload(kind problemKind, title, detail string) *Problem {
	p := newProblem(http.StatusServiceUnavailable, kind, title, detail, FieldFault{Parameter: "path", Detail: detail})
	p.retryAfter = retryAfter
	return p
}

// Drain makes the server say that it is not ready and refuse new batches. Running
// batches and other requests go on.
func (s *Server) Drain() { s.gate.draining.Store(true) }

// BatchesRunning is the number of batches that run at this moment.
func (s *Server) BatchesRunning() int { return s.gate.running() }

// scopes are the routes that need a token, where there are tokens, and its scope.
var scopes = map[string]access.Scope{
	"/v1/point": access.Query, "/v1/area": access.Query, "/v1/boundaries": access.Query,
	"/v1/slabs": access.Query, "/v1/zones": access.Query, "/v1/hotspots": access.Query,
	"/v1/section": access.Query, "/v1/section.svg": access.Query, "/v1/plates": access.Query,
	"/v1/models": access.Query, "/v1/models/:id": access.Query, "/v1/annotate": access.Batch,
}

func formatSeconds(d time.Duration) string { return strconv.FormatInt(int64(d/time.Second), 10) }
