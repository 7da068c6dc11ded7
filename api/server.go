package api

import (
	"encoding/json"
	"io"
	"log/slog"
	"net/http"
	"strconv"
	"time"

	"github.com/labstack/echo/v4"
	"github.com/prometheus/client_golang/prometheus"

	"nearmargin/api/page"
	"nearmargin/setting"
)

// Models is where a handler finds the model to answer from.
type Models interface {
	// Active returns the model used where a request names none.
	Active() *setting.Model
	// Find returns the model named by "id" (its active edition) or "id@edition".
	Find(ref string) (*setting.Model, bool)
	// All returns every edition that is loaded, the active one first.
	All() []*setting.Model
}

// Source says how the place fares that models come from.
type Source interface {
	// Degraded says since when, and why, newer models cannot be had; the time is zero
	// where they can. The reason is told to anybody who asks.
	Degraded() (since time.Time, reason string)
}

// Config is what a server is built from; every field but Source is needed.
type Config struct {
	Models   Models
	Source   Source // nil where models come from no place that can fail
	Log      *slog.Logger
	Registry *prometheus.Registry
	Version  string // of the program
	Commit   string
}

// Server answers HTTP requests. It holds no state of its own.
type Server struct {
	cfg     Config
	metrics *metrics
	echo    *echo.Echo
	site    *page.Site
}

// New builds a server with all routes.
func New(cfg Config) *Server {
	site, err := page.New(OpenAPI())
	if err != nil {
		panic(err) // a file of the program's own
	}
	s := &Server{cfg: cfg, metrics: newMetrics(cfg), echo: echo.New(), site: site}
	e := s.echo
	e.HideBanner, e.HidePort = true, true
	e.IPExtractor = echo.ExtractIPDirect()
	e.HTTPErrorHandler = s.handleError
	e.Use(s.observe)
	for path, h := range map[string]echo.HandlerFunc{
		"/v1/point":       s.point,
		"/v1/area":        s.areaOfBox,
		"/v1/boundaries":  s.boundaries,
		"/v1/slabs":       s.slabs,
		"/v1/zones":       s.zones,
		"/v1/hotspots":    s.hotspots,
		"/v1/section":     s.section,
		"/v1/section.svg": s.sectionSVG,
		"/v1/plates":      s.plates,
		"/v1/models":      s.models,
		"/v1/models/:id":  s.model,
		"/healthz":        s.health,
		"/readyz":         s.ready,
		"/metrics":        s.metrics.handler(cfg.Registry),
		"/openapi.json":   s.openapi,
		"/":               s.page,
		"/reference":      s.page,
		"/assets/*":       s.page,
	} {
		e.GET(path, h)
		e.HEAD(path, h)
	}
	e.POST("/v1/area", s.area)
	e.POST("/v1/annotate", s.annotate)
	return s
}

// ServeHTTP answers one request.
func (s *Server) ServeHTTP(w http.ResponseWriter, r *http.Request) { s.echo.ServeHTTP(w, r) }

// handleError sends the problem document for an error, once.
func (s *Server) handleError(err error, c echo.Context) {
	p := problemOf(err)
	if p.Status >= http.StatusInternalServerError {
		s.cfg.Log.Error("request failed", "path", c.Path(), "error", err)
	}
	if c.Response().Committed {
		return
	}
	if err := writeProblem(c, p); err != nil {
		s.cfg.Log.Warn("problem document not sent", "error", err)
	}
}

// observe counts and logs a request.
func (s *Server) observe(next echo.HandlerFunc) echo.HandlerFunc {
	return func(c echo.Context) error {
		start, whole := time.Now(), false
		defer func() { // also where a handler breaks the answer off
			took := time.Since(start)
			route, status := c.Path(), strconv.Itoa(c.Response().Status)
			if route == "" || c.Response().Status == http.StatusNotFound && route != "/v1/models/:id" {
				route = "none"
			}
			if !whole {
				status = "aborted"
			}
			s.metrics.request(route, c.Request().Method, status, took)
			s.cfg.Log.Info("request", "method", c.Request().Method, "route", route, "status", status,
				"bytes", c.Response().Size, "ms", float64(took.Microseconds())/1000)
		}()
		if err := next(c); err != nil {
			c.Error(err)
		}
		whole = true
		return nil
	}
}

// encodeJSON writes a value without escaping <, > and &.
func encodeJSON(w io.Writer, v any) error {
	e := json.NewEncoder(w)
	e.SetEscapeHTML(false)
	return e.Encode(v)
}

// sendJSON sends a value as JSON.
func sendJSON(c echo.Context, v any) error {
	c.Response().Header().Set(echo.HeaderContentType, echo.MIMEApplicationJSON)
	c.Response().WriteHeader(http.StatusOK)
	return encodeJSON(c.Response(), v)
}
