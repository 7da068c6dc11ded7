package api

import (
	"net/http"
	"net/http/httptest"
	"strings"
	"testing"
	"time"
)

// TestBatchesComputeInTurn takes all turns of a server. Batches of every form must
// wait for one, while points are answered; when the turns are given back, all end.
func TestBatchesComputeInTurn(t *testing.T) {
	r := newRig(t)
	bodies := map[string]string{"application/json": `[{"lon":1,"lat":2},{"lon":3,"lat":4}]`}
	for _, f := range forms {
		var b strings.Builder
		if err := f.write(&b, 300); err != nil {
			t.Fatal(err)
		}
		bodies[f.contentType] = b.String()
	}
	for range cap(r.slots) {
		r.slots <- struct{}{}
	}
	answers := make(chan *httptest.ResponseRecorder, len(bodies))
	for contentType, body := range bodies {
		go func() { answers <- r.ask(http.MethodPost, "/v1/annotate", contentType, body) }()
	}
	waitFor(t, "the batches run", func() bool { return r.BatchesRunning() == len(bodies) })
	if w := r.get("/v1/point?lon=1&lat=2"); w.Code != http.StatusOK {
		t.Errorf("a point: status %d", w.Code)
	}
	select {
	case w := <-answers:
		t.Errorf("a batch was answered without a turn: %d %.200s", w.Code, w.Body)
	case <-time.After(300 * time.Millisecond):
	}
	for range cap(r.slots) {
		<-r.slots
	}
	for range bodies {
		if w := <-answers; w.Code != http.StatusOK || w.Body.Len() < 1000 {
			t.Errorf("status %d, %d bytes", w.Code, w.Body.Len())
		}
	}
	waitFor(t, "all turns are given back", func() bool { return len(r.slots) == 0 })
}
