package api

import (
	"io"
	"net/http"
	"net/http/httptest"
	"slices"
	"testing"
	"time"

	"nearmargin/setting/builtin"
)

// BenchmarkPointBesideBatches asks for points while ten batches run and reports
// the 50th and 99th percentile of the time that an answer takes.
func BenchmarkPointBesideBatches(b *testing.B) {
	bundle, err := builtin.Load()
	if err != nil {
		b.Fatal(err)
	}
	r := newRig(b, bundle.Model)
	srv := httptest.NewServer(r)
	defer srv.Close()
	defer srv.CloseClientConnections()
	for range 10 {
		in, out := io.Pipe()
		go func() { forms[0].write(out, 1<<40) }()
		res, err := http.Post(srv.URL+"/v1/annotate", "text/csv", in)
		if err != nil {
			b.Fatal(err)
		}
		go io.Copy(io.Discard, res.Body)
		defer out.CloseWithError(io.ErrUnexpectedEOF)
	}
	var took []time.Duration
	for b.Loop() {
		start := time.Now()
		res, err := http.Get(srv.URL + "/v1/point?lon=-72.4&lat=-36.1")
		if err != nil {
			b.Fatal(err)
		}
		if _, err := io.Copy(io.Discard, res.Body); err != nil || res.StatusCode != http.StatusOK {
			b.Fatalf("status %d, %v", res.StatusCode, err)
		}
		res.Body.Close()
		took = append(took, time.Since(start))
	}
	if n := r.BatchesRunning(); n != 10 {
		b.Errorf("%d batches run, want 10", n)
	}
	slices.Sort(took)
	b.ReportMetric(float64(took[len(took)/2].Microseconds())/1000, "p50-ms")
	b.ReportMetric(float64(took[len(took)*99/100].Microseconds())/1000, "p99-ms")
}
