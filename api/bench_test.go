package api

import (
	"bytes"
	"fmt"
	"io"
	"log/slog"
	"net/http"
	"net/http/httptest"
	"regexp"
	"slices"
	"strconv"
	"testing"
	"time"

	"github.com/labstack/echo/v4"
	"github.com/prometheus/client_golang/prometheus"
	"pgregory.net/rapid"

	"nearmargin/setting"
	"nearmargin/setting/builtin"
	"nearmargin/testdata/bench/rounds"
)

// BenchmarkPointRatio compares GET /v1/point on the built-in model with a bare
// handler that sends a body of the same size, over one kept-alive connection each
// within this process, in turn: requests a second by the clock on the wall and by
// processor time, and the 99th percentile of the latency. Client and server share the machine, so that the client's time is in
// both.
func BenchmarkPointRatio(b *testing.B) {
	bundle, err := builtin.Load()
	if err != nil {
		b.Fatal(err)
	}
	ours := New(Config{Models: shelf([]*setting.Model{bundle.Model}), Registry: prometheus.NewRegistry(), Log: slog.New(slog.NewJSONHandler(io.Discard, nil))})
	var bodies [][]byte // one of a size that answers have
	for i := range 1001 {
		rec := httptest.NewRecorder()
		ours.ServeHTTP(rec, httptest.NewRequest(http.MethodGet, benchPoint(i), nil))
		if rec.Code != http.StatusOK {
			b.Fatal(rec.Body)
		}
		bodies = append(bodies, bytes.Clone(rec.Body.Bytes()))
	}
	slices.SortFunc(bodies, func(a, b []byte) int { return len(a) - len(b) })
	body := bodies[len(bodies)/2]
	bare := echo.New()
	bare.GET("/v1/point", func(c echo.Context) error {
		c.Response().Header().Set(echo.HeaderContentLength, strconv.Itoa(len(body)))
		return c.Blob(http.StatusOK, echo.MIMEApplicationJSON, body)
	})

	var latencies [2][]float64
	ask := func(k int, h http.Handler) func(int) {
		server := httptest.NewServer(h)
		b.Cleanup(server.Close)
		client := &http.Client{Transport: &http.Transport{}}
		return func(i int) {
			start := time.Now()
			r, err := client.Get(server.URL + benchPoint(i))
			if err != nil {
				b.Fatal(err)
			}
			if _, err := io.Copy(io.Discard, r.Body); err != nil || r.StatusCode != http.StatusOK || r.ContentLength <= 0 {
				b.Fatal(r.Status, r.ContentLength, err)
			}
			r.Body.Close()
			latencies[k] = append(latencies[k], float64(time.Since(start).Nanoseconds()))
		}
	}
	us, theirs := ask(0, ours), ask(1, bare)
	for b.Loop() {
		ns := rounds.WallMedians(101, 4*rounds.Slice, us, theirs)
		b.ReportMetric(1e9/ns[0], "requests/s")
		b.ReportMetric(1e9/ns[1], "bare-requests/s")
		b.ReportMetric(ns[1]/ns[0], "of-the-bare")
		cpu := rounds.ProcessMedians(101, 4*rounds.Slice, us, theirs)
		b.ReportMetric(cpu[0], "cpu-ns/request")
		b.ReportMetric(cpu[1]/cpu[0], "of-the-bare-by-cpu")
	}
	var p99 [2]float64
	for k, l := range latencies {
		slices.Sort(l)
		p99[k] = l[len(l)*99/100]
	}
	b.ReportMetric(p99[0]/p99[1], "p99-of-the-bare")
	b.ReportMetric(float64(len(body)), "B/body")
}

// benchPoint is a place to ask for.
func benchPoint(i int) string {
	return fmt.Sprintf("/v1/point?lon=%d&lat=%d.5", i%360-179, i%179-89)
}

// TestIsDecimal compares with the form written as a regular expression.
func TestIsDecimal(t *testing.T) {
	form := regexp.MustCompile(`^[+-]?([0-9]+(\.[0-9]*)?|\.[0-9]+)([eE][+-]?[0-9]{1,3})?$`)
	rapid.Check(t, func(t *rapid.T) {
		s := rapid.StringMatching(`[+-]{0,2}[0-9]{0,3}[.]{0,2}[0-9]{0,3}[eE]{0,2}[+-]{0,2}[0-9]{0,5}[x ]?`).Draw(t, "text")
		if got, want := isDecimal(s), form.MatchString(s); got != want {
			t.Fatalf("%q: %t, by the expression %t", s, got, want)
		}
	})
}
