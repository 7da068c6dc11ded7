package api

import (
	"encoding/json"
	"io"
	"log/slog"
	"net/http"
	"net/http/httptest"
	"strings"
	"testing"
	"time"

	"github.com/prometheus/client_golang/prometheus"

	"nearmargin/api/internal/testmodel"
)

// ailing is a Source that a test makes fail.
type ailing struct {
	since  time.Time
	reason string
}

func (a *ailing) Degraded() (time.Time, string) { return a.since, a.reason }

func TestReadinessTellsOfADegradedSource(t *testing.T) {
	src := &ailing{}
	s := New(Config{
		Models: shelf{testmodel.New(t)}, Source: src, Log: slog.New(slog.NewTextHandler(io.Discard, nil)),
		Registry: prometheus.NewRegistry(), Version: "1", Commit: "c",
	})
	get := func(path string) string {
		t.Helper()
		w := httptest.NewRecorder()
		s.ServeHTTP(w, httptest.NewRequest(http.MethodGet, path, nil))
		if w.Code != http.StatusOK {
			t.Fatalf("%s: status %d", path, w.Code)
		}
		return w.Body.String()
	}
	if body := get("/readyz"); !strings.Contains(body, `"status":"ready"`) || strings.Contains(body, "degraded") {
		t.Errorf("healthy: %s", body)
	}
	if m := get("/metrics"); !strings.Contains(m, "nearmargin_degraded_since_timestamp_seconds 0\n") {
		t.Error("healthy: the metric is not 0")
	}
	src.since, src.reason = time.Date(2026, 1, 2, 3, 4, 5, 0, time.UTC), "the database does not answer"
	var got readiness
	if err := json.Unmarshal([]byte(get("/readyz")), &got); err != nil {
		t.Fatal(err)
	}
	if got.Status != "degraded" || got.Since != "2026-01-02T03:04:05Z" || got.Reason != src.reason || got.Model.ID != testmodel.ID {
		t.Errorf("degraded: %+v", got)
	}
	m := get("/metrics")
	if !strings.Contains(m, "nearmargin_degraded_since_timestamp_seconds 1.767323045e+09\n") {
		t.Errorf("degraded: the metric is not the time: %s", m)
	}
}
