package main

import (
	"encoding/json"
	"io"
	"net/http"
	"os"
	"strings"
	"sync"
	"testing"
	"time"

	"nearmargin/store/storetest"
)

// outage is how long the database is away: long enough for the service to notice a
// server that is silent (the poll and 15 s), or what NEARMARGIN_OUTAGE says.
func outage(t *testing.T, least time.Duration) time.Duration {
	t.Helper()
	given := os.Getenv("NEARMARGIN_OUTAGE")
	if given == "" {
		return least
	}
	d, err := time.ParseDuration(given)
	if err != nil {
		t.Fatalf("NEARMARGIN_OUTAGE: %v", err)
	}
	return max(d, least)
}

// steadyLoad asks for points, one after the other from each of four clients, and for a
// batch now and then, until it is told to stop. It returns how many answers there were
// and the first that was not as it should be.
func steadyLoad(p *process, want string) (stop func() (answers int, fault string)) {
	done := make(chan struct{})
	var mu sync.Mutex
	var answers int
	var fault string
	var load sync.WaitGroup
	c := &http.Client{Transport: &http.Transport{MaxIdleConnsPerHost: 8}, Timeout: 30 * time.Second}
	note := func(status int, body string, err error, good bool) {
		mu.Lock()
		defer mu.Unlock()
		answers++
		if fault == "" && (err != nil || status != http.StatusOK || !good) {
			fault = strings.Join([]string{http.StatusText(status), body[:min(300, len(body))]}, " ")
			if err != nil {
				fault += err.Error()
			}
		}
	}
	read := func(res *http.Response, err error) (int, string, error) {
		if err != nil {
			return 0, "", err
		}
		defer res.Body.Close()
		raw, err := io.ReadAll(res.Body)
		return res.StatusCode, string(raw), err
	}
	again := func(pause time.Duration, ask func()) {
		load.Go(func() {
			for {
				select {
				case <-done:
					return
				case <-time.After(pause):
					ask()
				}
			}
		})
	}
	for range 4 {
		again(40*time.Millisecond, func() {
			status, body, err := read(c.Get(p.url("/v1/point?lon=-72.4&lat=-36.1")))
			note(status, body, err, body == want)
		})
	}
	input := tables[0].whole(500)
	again(500*time.Millisecond, func() {
		status, body, err := read(c.Post(p.url("/v1/annotate"), "text/csv", strings.NewReader(input)))
		note(status, body, err, strings.Count(body, "\n") == 501)
	})
	return func() (int, string) {
		close(done)
		load.Wait()
		c.CloseIdleConnections()
		return answers, fault
	}
}

// readiness is what /readyz says.
type readiness struct {
	Status        string
	DegradedSince time.Time `json:"degraded_since"`
	Reason        string
	code          int
}

func (p *process) readiness() (r readiness) {
	p.t.Helper()
	code, body := get(p.t, p.address, "/readyz")
	if err := json.Unmarshal([]byte(body), &r); err != nil {
		p.t.Fatalf("readyz: %d %s: %v", code, body, err)
	}
	r.code = code
	return r
}

// TestDatabaseGoneUnderLoad takes the database away in three ways while a service is
// asked: its process ends, it is frozen, and packets to and from it vanish.
func TestDatabaseGoneUnderLoad(t *testing.T) {
	server := storetest.Get(t)
	for _, c := range []struct {
		name  string
		least time.Duration
		begin func(t *testing.T, url string) (end func())
	}{
		{"stopped", 10 * time.Second, func(t *testing.T, _ string) func() {
			server.Stop(t)
			return func() { server.Start(t) }
		}},
		{"frozen", 22 * time.Second, func(t *testing.T, _ string) func() { return server.Pause(t) }},
		{"parted", 22 * time.Second, func(t *testing.T, url string) func() { return server.Part(t, url) }},
	} {
		t.Run(c.name, func(t *testing.T) {
			url, _ := seeded(t)
			must(t, url, "model", "import", exported(t, "other"))
			served := url
			if c.name == "parted" {
				served = server.Direct(t, url)
			}
			p := startProcess(t, "--database", served, "--database-poll", "1s")
			_, want := get(t, p.address, "/v1/point?lon=-72.4&lat=-36.1")
			calm := p.held()
			stop := steadyLoad(p, want)
			away := time.Now()
			end := c.begin(t, served)
			defer end()
			var since time.Time
			var most heldResources
			for until := away.Add(outage(t, c.least)); time.Now().Before(until); time.Sleep(200 * time.Millisecond) {
				r := p.readiness()
				if r.code != http.StatusOK {
					t.Fatalf("readyz: status %d", r.code)
				}
				now := p.held()
				most.goroutines, most.descriptors = max(most.goroutines, now.goroutines), max(most.descriptors, now.descriptors)
				switch {
				case r.Status == "degraded" && since.IsZero():
					since = r.DegradedSince
					t.Logf("degraded %v after the database went away: %s", time.Since(away).Round(100*time.Millisecond), r.Reason)
					if since.Before(away.Truncate(time.Second)) || !strings.Contains(r.Reason, "does not answer") {
						t.Errorf("degraded since %v for %q; the database went away at %v", since, r.Reason, away)
					}
				case !since.IsZero() && !r.DegradedSince.Equal(since):
					t.Fatalf("degraded since %v, and before it was since %v", r.DegradedSince, since)
				}
			}
			if since.IsZero() {
				t.Error("the service never said that it is degraded")
			}
			if _, m := get(t, p.private, "/metrics"); !strings.Contains(m, "nearmargin_degraded_since_timestamp_seconds 1") {
				t.Error("the metric does not say degraded")
			}
			answers, fault := stop()
			if fault != "" || answers < 100 {
				t.Errorf("%d answers; the first that is wrong: %s", answers, fault)
			}
			t.Logf("%d answers during the outage; at most %d goroutines and %d descriptors, before it %d and %d", answers, most.goroutines, most.descriptors, calm.goroutines, calm.descriptors)
			// the load's own connections are six, each with two goroutines, and one batch has a few
			if most.goroutines > calm.goroutines+40 || most.descriptors > calm.descriptors+16 {
				t.Errorf("at most %+v during the outage, %+v before", most, calm)
			}
			end()
			waitFor(t, "recovery", func() bool { r := p.readiness(); return r.Status == "ready" && r.DegradedSince.IsZero() })
			must(t, url, "model", "activate", "builtin@other")
			waitFor(t, "an activation after it", func() bool {
				_, body := get(t, p.address, "/readyz")
				return strings.Contains(body, `"edition":"other"`)
			})
			calm.goroutines += 2 // the driver's, of a connection that it closes in the background
			p.backTo(calm)
		})
	}
}
