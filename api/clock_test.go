package api

import (
	"io"
	"net/http"
	"strconv"
	"strings"
	"testing"
	"time"

	"pgregory.net/rapid"

	"nearmargin/api/access"
)

const pointSeconds = `nearmargin_http_request_duration_seconds_sum{route="/v1/point"}`

// TestWhenTheClockIsSet: given a clock that is set hours forward and back between and
// during requests, expect every request answered, no time or age below 0, sums that
// never fall, and a client that waits as long as it is told let in.
func TestWhenTheClockIsSet(t *testing.T) {
	r := newRig(t)
	rapid.Check(t, func(t *rapid.T) {
		now := time.Unix(1_700_000_000, 0)
		clock := func() time.Time { return now }
		set := func() {
			now = now.Add(time.Duration(rapid.Int64Range(-72*3600, 72*3600).Draw(t, "clock moves by, s")) * time.Second)
		}
		r.cfg.Access.Rate = access.NewLimiter(1, 2, clock)
		// the clock is read at the beginning and at the end of each request
		r.cfg.Now = func() time.Time { set(); return now }
		last := 0.0
		if text := r.get("/metrics").Body.String(); strings.Contains(text, pointSeconds) {
			last = value(t, r, pointSeconds)
		}
		for range rapid.IntRange(1, 8).Draw(t, "requests") {
			set()
			w := r.get("/v1/point?lon=1&lat=2")
			// a second wait where the clock was set back during the first answer: of
			// that the limiter sees nothing but that no time has passed
			for range 2 {
				if w.Code != http.StatusTooManyRequests {
					break
				}
				wait, err := strconv.Atoi(w.Header().Get("Retry-After"))
				if err != nil || wait < 1 || wait > 2 {
					t.Fatalf("Retry-After %q", w.Header().Get("Retry-After"))
				}
				now = now.Add(time.Duration(wait) * time.Second)
				r.cfg.Now = clock
				w = r.get("/v1/point?lon=1&lat=2")
				r.cfg.Now = func() time.Time { set(); return now }
			}
			if w.Code != http.StatusOK {
				t.Fatalf("status %d: %s", w.Code, w.Body)
			}
			if w := r.get("/readyz"); w.Code != http.StatusOK {
				t.Fatalf("readyz: status %d", w.Code)
			}
			sum := value(t, r, pointSeconds)
			if sum < last {
				t.Fatalf("the sum of times falls from %g to %g", last, sum)
			}
			last = sum
		}
	})
	for _, rec := range r.log.records(t) {
		if ms, ok := rec["ms"].(float64); !ok || ms < 0 {
			t.Fatalf("a time below 0: %v", rec)
		}
	}
}

// value returns the value of one series.
func value(t *rapid.T, r *rig, series string) float64 {
	t.Helper()
	body, err := io.ReadAll(r.get("/metrics").Body)
	if err != nil {
		t.Fatal(err)
	}
	_, rest, ok := strings.Cut(string(body), "\n"+series+" ")
	if !ok {
		t.Fatalf("there is no %s", series)
	}
	text, _, _ := strings.Cut(rest, "\n")
	x, err := strconv.ParseFloat(text, 64)
	if err != nil {
		t.Fatal(err)
	}
	return x
}
