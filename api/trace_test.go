package api

import (
	"io"
	"net/http"
	"net/http/httptest"
	"testing"

	"github.com/labstack/echo/v4"
	"go.opentelemetry.io/otel/codes"
	sdktrace "go.opentelemetry.io/otel/sdk/trace"
	"go.opentelemetry.io/otel/sdk/trace/tracetest"
	"go.opentelemetry.io/otel/trace"
)

// TestSpansOfFaults: the span of a request that the service is at fault for, or
// whose answer is broken off, ends as an error; one that is at fault itself does not.
func TestSpansOfFaults(t *testing.T) {
	rec := tracetest.NewSpanRecorder()
	r := newLimitedRig(t, func(c *Config) {
		c.Tracer = sdktrace.NewTracerProvider(sdktrace.WithSpanProcessor(rec)).Tracer("test")
	})
	var inHandler trace.SpanContext
	r.echo.GET("/panics", func(c echo.Context) error {
		inHandler = trace.SpanContextFromContext(c.Request().Context())
		panic("a defect")
	})
	r.echo.GET("/breaks", func(c echo.Context) error {
		c.Response().WriteHeader(http.StatusOK)
		c.Response().Flush() // a client that got nothing would ask once more
		panic("a defect")
	})
	srv := httptest.NewServer(r)
	defer srv.Close()
	for _, c := range []struct {
		method, target, name string
		status               codes.Code
	}{
		{"GET", "/panics", "GET /panics", codes.Error},
		{"GET", "/breaks", "GET /breaks", codes.Error},
		{"GET", "/v1/point?lon=x", "GET /v1/point", codes.Unset},
		{"GET", "/v1/models/none", "GET /v1/models/:id", codes.Unset},
		{"GREET", "/v1/point", "HTTP /v1/point", codes.Unset},
	} {
		t.Run(c.method+c.target, func(t *testing.T) {
			rec.Reset()
			req, err := http.NewRequest(c.method, srv.URL+c.target, nil)
			if err != nil {
				t.Fatal(err)
			}
			if res, err := http.DefaultClient.Do(req); err == nil {
				_, _ = io.Copy(io.Discard, res.Body) // it may break off
				res.Body.Close()
			}
			waitFor(t, "the span to end", func() bool { return len(rec.Ended()) == 1 })
			if s := rec.Ended()[0]; s.Name() != c.name || s.Status().Code != c.status {
				t.Errorf("%s ends as %v, want %s as %v", s.Name(), s.Status(), c.name, c.status)
			}
			if c.target == "/panics" && !inHandler.Equal(rec.Ended()[0].SpanContext()) {
				t.Error("the handler's context is not the span's")
			}
		})
	}
}
