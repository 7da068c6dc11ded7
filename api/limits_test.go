package api

import (
	"bufio"
	"context"
	"fmt"
	"io"
	"log/slog"
	"net"
	"net/http"
	"net/http/httptest"
	"strings"
	"testing"
	"time"

	"github.com/prometheus/client_golang/prometheus"
	"github.com/prometheus/client_golang/prometheus/testutil"

	"nearmargin/api/internal/testmodel"
	"nearmargin/setting"
)

// newLimitedRig is a rig whose configuration a test changes.
func newLimitedRig(tb testing.TB, change func(*Config)) *rig {
	tb.Helper()
	r := &rig{log: &logBuffer{}, reg: prometheus.NewRegistry()}
	cfg := Config{Models: shelf([]*setting.Model{testmodel.New(tb)}), Log: slog.New(slog.NewJSONHandler(r.log, nil)), Registry: r.reg, Version: "1.2.3", Commit: "abc"}
	change(&cfg)
	r.Server = New(cfg)
	return r
}

// serveRig serves a rig as the program does, with a base context of its own.
func serveRig(t *testing.T, r *rig) (srv *httptest.Server, giveUp context.CancelCauseFunc) {
	t.Helper()
	base, giveUp := context.WithCancelCause(context.Background())
	srv = httptest.NewUnstartedServer(r)
	srv.Listener = Listener(srv.Listener, r.cfg.Limits.HeaderBytes)
	srv.Config.BaseContext = func(net.Listener) context.Context { return base }
	srv.Config.WriteTimeout, srv.Config.ReadTimeout = time.Minute, r.cfg.Limits.ReadTime
	srv.Config.MaxHeaderBytes = r.cfg.Limits.HeaderBytes
	srv.Start()
	t.Cleanup(func() {
		giveUp(nil)
		srv.CloseClientConnections()
		srv.Close()
	})
	return srv, giveUp
}

// openBatch starts a batch whose body stays open until close is called, and
// returns once its first answers are there.
func openBatch(t *testing.T, url string) (res *http.Response, end func(error)) {
	t.Helper()
	in, out := io.Pipe()
	go func() { forms[1].write(out, 3000) }()
	// a client whose request is refused waits for the end of its body
	late := time.AfterFunc(time.Minute, func() { out.CloseWithError(io.ErrUnexpectedEOF) })
	defer late.Stop()
	res = post(t.Context(), t, url, forms[1].contentType, in)
	t.Cleanup(func() { out.CloseWithError(io.ErrUnexpectedEOF) })
	return res, func(err error) { out.CloseWithError(err) }
}

// waitFor waits until a condition holds.
func waitFor(t *testing.T, what string, holds func() bool) {
	t.Helper()
	for end := time.Now().Add(time.Minute); !holds(); time.Sleep(5 * time.Millisecond) {
		if time.Now().After(end) {
			t.Fatalf("after a minute still not: %s", what)
		}
	}
}

// TestBatchesAtOnce: given room for two batches, when a third comes, expect 503
// with Retry-After while points are answered; when one ends, expect room again.
func TestBatchesAtOnce(t *testing.T) {
	r := newLimitedRig(t, func(c *Config) { c.Limits.Batches = 2 })
	srv, _ := serveRig(t, r)
	first, end := openBatch(t, srv.URL)
	openBatch(t, srv.URL)
	if got := testutil.ToFloat64(r.metrics.refused.WithLabelValues(refusedBatch)); got != 0 || r.BatchesRunning() != 2 {
		t.Fatalf("%v refused, %d run; want 0 and 2", got, r.BatchesRunning())
	}
	w := r.ask(http.MethodPost, "/v1/annotate", "text/csv", "lon,lat\n1,2\n")
	p := problem(t, w)
	if w.Code != http.StatusServiceUnavailable || w.Header().Get("Retry-After") != "5" || p.Type != problemType+"too-many-batches" || len(p.Errors) != 1 {
		t.Errorf("status %d, Retry-After %q, %+v", w.Code, w.Header().Get("Retry-After"), p)
	}
	if w := r.get("/v1/point?lon=1&lat=2"); w.Code != http.StatusOK {
		t.Errorf("a point: status %d", w.Code)
	}
	end(nil)
	if _, err := io.Copy(io.Discard, first.Body); err != nil {
		t.Error(err)
	}
	waitFor(t, "a batch has ended", func() bool { return r.BatchesRunning() == 1 })
	if w := r.ask(http.MethodPost, "/v1/annotate", "text/csv", "lon,lat\n1,2\n"); w.Code != http.StatusOK {
		t.Errorf("after one ended: status %d", w.Code)
	}
	for _, rec := range r.log.records(t) {
		if rec["level"] == "ERROR" {
			t.Errorf("logged %v", rec)
		}
	}
}

// TestTrailers: a batch that is whole tells rows and row errors in its trailers.
func TestTrailers(t *testing.T) {
	srv, _ := serveRig(t, newRig(t))
	for _, c := range []struct {
		name, contentType, body string
		rows, faults            string
	}{
		{"csv", "text/csv", "lon,lat\n1,2\n1,95\nx,2\n", "3", "2"},
		{"csv of a header alone", "text/csv", "lon,lat\n", "0", "0"},
		{"ndjson", "application/x-ndjson", "{\"lon\":1,\"lat\":2}\n{}\n", "2", "1"},
		{"array", "application/json", `[{"lon":1,"lat":2}]`, "1", "0"},
		{"geojson", "application/geo+json", `{"type":"FeatureCollection","features":[]}`, "0", "0"},
	} {
		t.Run(c.name, func(t *testing.T) {
			res := post(t.Context(), t, srv.URL, c.contentType, strings.NewReader(c.body))
			if _, declared := res.Trailer[trailerRows]; !declared {
				t.Errorf("trailers declared: %v", res.Trailer)
			}
			if _, err := io.Copy(io.Discard, res.Body); err != nil {
				t.Fatal(err)
			}
			if rows, faults := res.Trailer.Get(trailerRows), res.Trailer.Get(trailerErrors); rows != c.rows || faults != c.faults {
				t.Errorf("rows %q, errors %q; want %s and %s", rows, faults, c.rows, c.faults)
			}
		})
	}
}

// TestSlowClients: a client that takes nothing, and one that sends almost
// nothing, are cut off, each for its own reason, and leave nothing behind.
func TestSlowClients(t *testing.T) {
	const stall = 300 * time.Millisecond
	t.Run("reader", func(t *testing.T) {
		r := newLimitedRig(t, func(c *Config) { c.Limits.StallTime = stall })
		srv, _ := serveRig(t, r)
		conn := dial(t, srv)
		fmt.Fprintf(conn, "POST /v1/annotate HTTP/1.1\r\nHost: x\r\nContent-Type: text/csv\r\nTransfer-Encoding: chunked\r\n\r\n")
		go forms[0].write(chunks{conn}, 1<<40)
		waitFor(t, "the batch is cut", func() bool { return testutil.ToFloat64(r.metrics.cut.WithLabelValues(cutSlowReader)) == 1 })
		waitFor(t, "it is over", func() bool { return r.BatchesRunning() == 0 })
	})
	t.Run("sender before any answer", func(t *testing.T) {
		r := newLimitedRig(t, func(c *Config) { c.Limits.StallTime = stall })
		srv, _ := serveRig(t, r)
		conn := dial(t, srv)
		fmt.Fprintf(conn, "POST /v1/annotate HTTP/1.1\r\nHost: x\r\nContent-Type: text/csv\r\nTransfer-Encoding: chunked\r\n\r\n")
		go func() { // a byte now and then is no progress
			for {
				if _, err := fmt.Fprintf(conn, "1\r\nx\r\n"); err != nil {
					return
				}
				time.Sleep(stall / 10)
			}
		}()
		res, err := http.ReadResponse(bufio.NewReader(conn), nil)
		if err != nil {
			t.Fatal(err)
		}
		body, _ := io.ReadAll(res.Body)
		if res.StatusCode != http.StatusRequestTimeout || !strings.Contains(string(body), "1024 bytes have 300ms to arrive") {
			t.Errorf("status %d: %s", res.StatusCode, body)
		}
	})
	t.Run("sender of an area", func(t *testing.T) {
		r := newLimitedRig(t, func(c *Config) { c.Limits.ReadTime = stall })
		srv, _ := serveRig(t, r)
		conn := dial(t, srv)
		fmt.Fprintf(conn, "POST /v1/area HTTP/1.1\r\nHost: x\r\nContent-Type: application/geo+json\r\nContent-Length: 99\r\n\r\n{")
		res, err := http.ReadResponse(bufio.NewReader(conn), nil)
		if err != nil {
			t.Fatal(err)
		}
		body, _ := io.ReadAll(res.Body)
		if res.StatusCode != http.StatusRequestTimeout || !strings.Contains(string(body), "has 300ms to arrive") {
			t.Errorf("status %d: %s", res.StatusCode, body)
		}
	})
	t.Run("sender half way", func(t *testing.T) {
		r := newLimitedRig(t, func(c *Config) { c.Limits.StallTime = 10 * stall }) // the header must be out before
		srv, _ := serveRig(t, r)
		res, _ := openBatch(t, srv.URL)
		if _, err := io.Copy(io.Discard, res.Body); err == nil {
			t.Error("the answer ends as if it were whole")
		}
		if got := testutil.ToFloat64(r.metrics.cut.WithLabelValues(cutSlowSender)); got != 1 {
			t.Errorf("%v batches cut for a slow sender, want 1", got)
		}
	})
	t.Run("batch that lasts", func(t *testing.T) {
		// long enough for the header to be out on a busy machine
		r := newLimitedRig(t, func(c *Config) { c.Limits.BatchTime = 10 * stall })
		srv, _ := serveRig(t, r)
		res, _ := openBatch(t, srv.URL)
		if _, err := io.Copy(io.Discard, res.Body); err == nil {
			t.Error("the answer ends as if it were whole")
		}
		if got := testutil.ToFloat64(r.metrics.cut.WithLabelValues(cutTime)); got != 1 {
			t.Errorf("%v batches cut for their time, want 1", got)
		}
	})
}

// chunks writes each piece as a chunk of a transfer.
type chunks struct{ w io.Writer }

func (c chunks) Write(p []byte) (int, error) {
	if _, err := fmt.Fprintf(c.w, "%x\r\n%s\r\n", len(p), p); err != nil {
		return 0, err
	}
	return len(p), nil
}

func dial(t *testing.T, srv *httptest.Server) net.Conn {
	t.Helper()
	conn, err := net.Dial("tcp", srv.Listener.Addr().String())
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { conn.Close() })
	return conn
}

// TestHeaderTooLong: a header beyond the limit gets a problem document that names it.
func TestHeaderTooLong(t *testing.T) {
	srv, _ := serveRig(t, newLimitedRig(t, func(c *Config) { c.Limits.HeaderBytes = 5000 }))
	for n, want := range map[int]int{4000: http.StatusOK, 40_000: http.StatusRequestHeaderFieldsTooLarge} {
		req, err := http.NewRequest(http.MethodGet, srv.URL+"/healthz", nil)
		if err != nil {
			t.Fatal(err)
		}
		req.Header.Set("X-Long", strings.Repeat("x", n))
		res, err := http.DefaultClient.Do(req)
		if err != nil {
			t.Fatal(err)
		}
		body, err := io.ReadAll(res.Body)
		res.Body.Close()
		if err != nil || res.StatusCode != want || want != http.StatusOK && !strings.Contains(string(body), "longer together than 5000 bytes") {
			t.Errorf("%d bytes: status %d, %v: %s", n, res.StatusCode, err, body)
		}
	}
}

// TestPatientBatch: a batch that gets on, slowly but steadily, outlives the
// server's own timeouts and the stall time, and the connection serves the next.
func TestPatientBatch(t *testing.T) {
	const short = 300 * time.Millisecond
	r := newLimitedRig(t, func(c *Config) { c.Limits.StallTime = short })
	srv := httptest.NewUnstartedServer(r)
	srv.Config.ReadTimeout, srv.Config.WriteTimeout = short, short
	srv.Start()
	defer srv.Close()
	in, out := io.Pipe()
	go func() {
		line := "1,2," + strings.Repeat("x", 2000) + "\n"
		fmt.Fprint(out, "lon,lat,a\n")
		for range 12 {
			fmt.Fprint(out, line)
			time.Sleep(short / 4)
		}
		out.Close()
	}()
	res := post(t.Context(), t, srv.URL, "text/csv", in)
	n, err := io.Copy(io.Discard, res.Body)
	if err != nil || n < 24_000 || res.Trailer.Get(trailerRows) != "12" {
		t.Fatalf("%d bytes, %v, trailers %v", n, err, res.Trailer)
	}
	time.Sleep(2 * short) // deadlines of the batch must not end the connection's rest
	next, err := http.Get(srv.URL + "/healthz")
	if err != nil {
		t.Fatal(err)
	}
	next.Body.Close()
}

// TestShutdown: given a running batch, when the server drains, expect readiness
// off, liveness on, points answered and new batches refused; when batches are
// given up, expect the answer to break off, with its reason counted.
func TestShutdown(t *testing.T) {
	r := newRig(t)
	srv, giveUp := serveRig(t, r)
	res, _ := openBatch(t, srv.URL)
	r.Drain()
	for target, want := range map[string]int{"/readyz": 503, "/healthz": 200, "/v1/point?lon=1&lat=2": 200} {
		if w := r.get(target); w.Code != want {
			t.Errorf("%s: status %d, want %d", target, w.Code, want)
		} else if w.Header().Get("Connection") != "close" {
			t.Errorf("%s leaves its connection open", target)
		}
	}
	w := r.ask(http.MethodPost, "/v1/annotate", "text/csv", "lon,lat\n")
	if p := problem(t, w); w.Code != 503 || p.Type != problemType+"draining" || w.Header().Get("Retry-After") == "" {
		t.Errorf("a new batch: status %d, %+v", w.Code, p)
	}
	giveUp(ErrShutdown)
	srv.CloseClientConnections() // its client would send for ever
	if _, err := io.Copy(io.Discard, res.Body); err == nil {
		t.Error("the answer ends as if it were whole")
	}
	waitFor(t, "the batch is counted", func() bool { return testutil.ToFloat64(r.metrics.cut.WithLabelValues(cutShutdown)) == 1 })
	if len(res.Trailer.Get(trailerRows)) > 0 {
		t.Error("a batch cut short has trailers")
	}
}

func TestLimitsValidate(t *testing.T) {
	if err := DefaultLimits.Validate(); err != nil {
		t.Errorf("the defaults: %v", err)
	}
	err := Limits{BodyBytes: 1, RowBytes: 1 << 30, Batches: -1, Areas: 1001, BatchTime: time.Millisecond, StallTime: 2 * time.Hour}.Validate()
	if err == nil {
		t.Fatal("limits out of range pass")
	}
	for _, want := range []string{"max-body-bytes is 1 bytes", "max-row-bytes", "max-batches is -1; want 1 to 1000", "max-areas is 1001; want 1 to 1000", "batch-timeout", "stall-timeout is 7200 s; want 1 to 3600"} {
		if !strings.Contains(err.Error(), want) {
			t.Errorf("%q is not in: %v", want, err)
		}
	}
}

// TestLimitsApply: a row, an array and an area one byte above their limits are
// refused with the limit in the words, and one at the limit is not.
func TestLimitsApply(t *testing.T) {
	const limit = 4096
	r := newLimitedRig(t, func(c *Config) { c.Limits.RowBytes, c.Limits.BodyBytes = limit, limit })
	for _, c := range []struct {
		name, target, contentType, body string
		status                          int
	}{
		{"array at the limit", "/v1/annotate", "application/json", `[{"lon":1,"lat":2}]` + strings.Repeat(" ", limit-19), 200},
		{"array above", "/v1/annotate", "application/json", `[{"lon":1,"lat":2}]` + strings.Repeat(" ", limit-18), 413},
		{"area above", "/v1/area", "application/json", strings.Repeat(" ", limit+1), 413},
		{"line above", "/v1/annotate", "application/x-ndjson", `{"lon":1,"lat":2,"x":"` + strings.Repeat("x", limit) + `"}`, 400},
		{"feature above", "/v1/annotate", "application/geo+json", `{"type":"FeatureCollection","features":[{"x":"` + strings.Repeat("x", 4*limit) + `"}]}`, 400},
		{"row above", "/v1/annotate", "text/csv", "lon,lat\n1,\"" + strings.Repeat("x", 70_000) + "\"\n", 400},
		{"columns above", "/v1/annotate", "text/csv", "lon,lat" + strings.Repeat(",", 4095) + "\n1,2\n", 400},
		{"columns at the limit", "/v1/annotate", "text/csv", "lon,lat" + strings.Repeat(",", 4094) + "\n1,2\n", 400},
	} {
		t.Run(c.name, func(t *testing.T) {
			if c.name == "columns at the limit" { // 4096 commas fit no row of 4096 bytes
				r, c.status = newRig(t), 200
			}
			w := r.ask(http.MethodPost, c.target, c.contentType, c.body)
			if w.Code != c.status {
				t.Fatalf("status %d, want %d: %.300s", w.Code, c.status, w.Body)
			}
			if c.status != 200 && !strings.Contains(w.Body.String(), "4096") {
				t.Errorf("the limit is not told: %s", w.Body)
			}
		})
	}
}
