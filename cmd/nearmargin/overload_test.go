package main

import (
	"context"
	"io"
	"net/http"
	"strings"
	"testing"
	"time"
)

// TestPointsBesideTenBatches holds ten batches open, five whose clients read nothing
// and five that compute all the time, and asks for points beside them. It says that
// points are admitted and answered, not how fast; BenchmarkPointBesideBatches and the
// soak measure that.
func TestPointsBesideTenBatches(t *testing.T) {
	p := startProcess(t, "--stall-timeout", "10m")
	calm := p.held()
	f := tables[0]
	ctx, leave := context.WithCancel(t.Context())
	defer leave()
	open := func(read bool) *http.Response {
		in, out := io.Pipe()
		go func() {
			_, err := io.WriteString(out, f.before)
			for rows := f.rows(0, 1000); err == nil; {
				_, err = io.WriteString(out, rows)
			}
		}()
		// a client whose request is refused waits for the end of its body
		late := time.AfterFunc(time.Minute, func() { out.CloseWithError(io.ErrUnexpectedEOF) })
		defer late.Stop()
		req, err := http.NewRequestWithContext(ctx, http.MethodPost, p.url("/v1/annotate"), in)
		if err != nil {
			t.Fatal(err)
		}
		req.Header.Set("Content-Type", f.contentType)
		res, err := http.DefaultClient.Do(req)
		if err != nil {
			t.Fatal(err)
		}
		if read {
			go io.Copy(io.Discard, res.Body)
		}
		return res
	}
	for i := range 10 {
		defer open(i%2 == 0).Body.Close()
	}
	var took []time.Duration
	for range 100 {
		start := time.Now()
		if code, body := get(t, p.address, "/v1/point?lon=-72.4&lat=-36.1"); code != http.StatusOK || !strings.Contains(body, `"forearc"`) {
			t.Fatalf("status %d %.300s", code, body)
		}
		took = append(took, time.Since(start))
	}
	t.Logf("a point beside ten batches, whose clients share the processors: half within %.1f ms, 99 %% within %.1f ms", ms(quantile(took, .5)), ms(quantile(took, .99)))
	if code, body := get(t, p.address, "/v1/area?bbox=-75,-40,-65,-30"); code != http.StatusOK {
		t.Errorf("an area: status %d %.300s", code, body)
	}
	if n := p.gauges()["nearmargin_batches_running"]; n != 10 {
		t.Errorf("%v batches run after the points were answered, want 10", n)
	}
	leave()
	waitFor(t, "the batches to end", func() bool { return p.gauges()["nearmargin_batches_running"] == 0 })
	p.backTo(calm)
}
