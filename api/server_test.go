package api

import (
	"bytes"
	"encoding/json"
	"io"
	"log/slog"
	"net/http"
	"net/http/httptest"
	"strings"
	"sync"
	"testing"

	"github.com/prometheus/client_golang/prometheus"

	"nearmargin/api/internal/testmodel"
	"nearmargin/setting"
)

// shelf is the Models of the tests: the first is the active one.
type shelf []*setting.Model

func (s shelf) Active() *setting.Model { return s[0] }

func (s shelf) Find(ref string) (*setting.Model, bool) {
	for _, m := range s {
		if ref == m.ID() || ref == m.Ref() {
			return m, true
		}
	}
	return nil, false
}

func (s shelf) All() []*setting.Model { return s }

// rig is a server with what it writes to.
type rig struct {
	*Server
	log *logBuffer
	reg *prometheus.Registry
}

// logBuffer is a log that handlers may write to at once.
type logBuffer struct {
	mu sync.Mutex
	b  bytes.Buffer
}

func (l *logBuffer) Write(p []byte) (int, error) {
	l.mu.Lock()
	defer l.mu.Unlock()
	return l.b.Write(p)
}

// records returns the records logged so far.
func (l *logBuffer) records(t *testing.T) []map[string]any {
	t.Helper()
	l.mu.Lock()
	defer l.mu.Unlock()
	var out []map[string]any
	for line := range strings.Lines(l.b.String()) {
		var r map[string]any
		if err := json.Unmarshal([]byte(line), &r); err != nil {
			t.Fatalf("log line %q: %v", line, err)
		}
		out = append(out, r)
	}
	return out
}

// newRig builds a server on the models; on the made-up one where none is given.
func newRig(tb testing.TB, models ...*setting.Model) *rig {
	tb.Helper()
	if models == nil {
		models = []*setting.Model{testmodel.New(tb)}
	}
	r := &rig{log: &logBuffer{}, reg: prometheus.NewRegistry()}
	r.Server = New(Config{Models: shelf(models), Log: slog.New(slog.NewJSONHandler(r.log, nil)), Registry: r.reg, Version: "1.2.3", Commit: "abc"})
	return r
}

// ask sends one request and returns what came back.
func (r *rig) ask(method, target, contentType, body string) *httptest.ResponseRecorder {
	var in io.Reader
	if body != "" {
		in = strings.NewReader(body)
	}
	req := httptest.NewRequest(method, target, in)
	if contentType != "" {
		req.Header.Set("Content-Type", contentType)
	}
	w := httptest.NewRecorder()
	r.ServeHTTP(w, req)
	return w
}

func (r *rig) get(target string) *httptest.ResponseRecorder {
	return r.ask(http.MethodGet, target, "", "")
}

// problem decodes a problem document strictly.
func problem(t *testing.T, w *httptest.ResponseRecorder) Problem {
	t.Helper()
	if ct := w.Header().Get("Content-Type"); ct != "application/problem+json" {
		t.Errorf("content type %q, want application/problem+json", ct)
	}
	d := json.NewDecoder(w.Body)
	d.DisallowUnknownFields()
	var p Problem
	if err := d.Decode(&p); err != nil {
		t.Fatalf("not a problem document: %v", err)
	}
	return p
}
