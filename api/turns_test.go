package api

import (
	"context"
	"errors"
	"net/http"
	"net/http/httptest"
	"strings"
	"testing"
	"time"

	"nearmargin/setting"
	"nearmargin/setting/boundary"
)

// occupy takes every turn there is, until free is called.
func (r *rig) occupy() (free func()) {
	for range cap(r.slots) {
		r.slots <- struct{}{}
	}
	return func() {
		for range cap(r.slots) {
			<-r.slots
		}
	}
}

// TestBatchesTakeTurns: given that others work in every turn, expect a batch of any
// form to wait for one, while a point is answered; then to be answered too.
func TestBatchesTakeTurns(t *testing.T) {
	for contentType, body := range map[string]string{
		"text/csv":             "lon,lat\n1,2\n",
		"application/x-ndjson": `{"lon":1,"lat":2}` + "\n",
		"application/json":     `[{"lon":1,"lat":2}]`,
		"application/geo+json": `{"type":"FeatureCollection","features":[{"type":"Feature","properties":null,"geometry":{"type":"Point","coordinates":[1,2]}}]}`,
	} {
		t.Run(contentType, func(t *testing.T) {
			r := newRig(t)
			free := r.occupy()
			done := make(chan *httptest.ResponseRecorder, 1)
			go func() { done <- r.ask(http.MethodPost, "/v1/annotate", contentType, body) }()
			waitFor(t, "the batch runs", func() bool { return r.BatchesRunning() == 1 })
			if w := r.get("/v1/point?lon=1&lat=2"); w.Code != http.StatusOK {
				t.Errorf("a point: status %d", w.Code)
			}
			select {
			case w := <-done:
				t.Fatalf("it took no turn: status %d", w.Code)
			case <-time.After(100 * time.Millisecond):
			}
			free()
			if w := <-done; w.Code != http.StatusOK || !strings.Contains(w.Body.String(), "made-up") {
				t.Errorf("status %d: %s", w.Code, w.Body)
			}
			waitFor(t, "all turns are given back", func() bool { return len(r.slots) == 0 })
		})
	}
}

// TestAreasAtOnce: given room for two areas, expect a third to get 503 with
// Retry-After; a client that leaves to make room at once; and the other its answer.
func TestAreasAtOnce(t *testing.T) {
	r := newLimitedRig(t, func(c *Config) { c.Limits.Areas = 2 })
	free := r.occupy()
	const box = "/v1/area?bbox=-10,-10,10,10"
	ctx, leave := context.WithCancel(context.Background())
	gone, done := make(chan any, 1), make(chan *httptest.ResponseRecorder, 1)
	go func() {
		defer func() { gone <- recover() }()
		r.ServeHTTP(httptest.NewRecorder(), httptest.NewRequest(http.MethodGet, box, nil).WithContext(ctx))
	}()
	go func() {
		done <- r.ask(http.MethodPost, "/v1/area", "application/geo+json", `{"type":"Polygon","coordinates":[[[0,0],[5,0],[5,5],[0,0]]]}`)
	}()
	waitFor(t, "both wait", func() bool { return len(r.areas) == 2 })
	w := r.get(box)
	p := problem(t, w)
	if w.Code != http.StatusServiceUnavailable || w.Header().Get("Retry-After") == "" || p.Type != problemType+"too-many-areas" || !strings.Contains(p.Detail, "2 areas") {
		t.Errorf("status %d, Retry-After %q, %+v", w.Code, w.Header().Get("Retry-After"), p)
	}
	if w := r.get("/v1/point?lon=1&lat=2"); w.Code != http.StatusOK {
		t.Errorf("a point: status %d", w.Code)
	}
	leave()
	if p := <-gone; p != http.ErrAbortHandler {
		t.Errorf("the client that left: %v, want the answer broken off", p)
	}
	waitFor(t, "its room is free", func() bool { return len(r.areas) == 1 })
	free()
	if w := <-done; w.Code != http.StatusOK || !strings.Contains(w.Body.String(), "area_km2") {
		t.Errorf("status %d: %s", w.Code, w.Body)
	}
	waitFor(t, "all turns and places are given back", func() bool { return len(r.areas) == 0 && len(r.slots) == 0 })
	for _, rec := range r.log.records(t) {
		if rec["level"] == "ERROR" {
			t.Errorf("logged %v", rec)
		}
	}
}

// TestOneTurnIsKept: given a request for a place, expect one turn to be taken from
// batches, and given back when none has followed for a while; given a probe, none.
func TestOneTurnIsKept(t *testing.T) {
	r := newRig(t)
	if cap(r.slots) < 2 {
		t.Skip("one processor: nothing is kept")
	}
	if w := r.ask(http.MethodPost, "/v1/annotate", "text/csv", "lon,lat\n1,2\n"); w.Code != http.StatusOK || len(r.slots) != 0 {
		t.Errorf("a batch alone: status %d, %d turns kept", w.Code, len(r.slots))
	}
	r.get("/healthz")
	r.get("/metrics")
	time.Sleep(50 * time.Millisecond)
	if len(r.slots) != 0 {
		t.Error("a probe keeps a turn")
	}
	for range 3 {
		r.get("/v1/point?lon=1&lat=2")
	}
	waitFor(t, "one turn is kept", func() bool { return len(r.slots) == 1 })
	if w := r.ask(http.MethodPost, "/v1/annotate", "text/csv", "lon,lat\n1,2\n"); w.Code != http.StatusOK {
		t.Errorf("a batch beside: status %d", w.Code)
	}
	waitFor(t, "it is given back", func() bool { return len(r.slots) == 0 })
}

// TestAreaOfAClientThatLeaves: given a client that leaves while its area is worked on,
// expect the work to end with it, and its turn and place to be given back.
func TestAreaOfAClientThatLeaves(t *testing.T) {
	r := newRig(t)
	ctx, leave := context.WithCancel(t.Context())
	l, err := r.cfg.Models.Active().Lookup(setting.Options{})
	if err != nil {
		t.Fatal(err)
	}
	body, err := r.answerArea(ctx, l, func() (*setting.Area, error) {
		leave()
		return setting.NewBoxArea(boundary.Box{West: -10, South: -10, East: 10, North: 10})
	})
	if !errors.Is(err, context.Canceled) || body != nil {
		t.Errorf("%v, %d bytes; want the context's error and nothing", err, len(body))
	}
	if len(r.areas) != 0 || len(r.slots) != 0 {
		t.Errorf("%d places and %d turns are not given back", len(r.areas), len(r.slots))
	}
}
