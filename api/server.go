package api

import (
	"bytes"
	"encoding/json"
	"io"
	"log/slog"
	"net/http"
	"time"

	"github.com/labstack/echo/v4"
	"github.com/prometheus/client_golang/prometheus"
	"go.opentelemetry.io/otel/trace"

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

// Config is what a server is built from. Source and what follows Commit may be
// left out.
type Config struct {
	Models   Models
	Source   Source // nil where models come from no place that can fail
	Log      *slog.Logger
	Registry *prometheus.Registry
	Version  string // of the program
	Commit   string
	Limits   Limits
	Access   Access
	BasePath string // below which the paths stand, such as /tectonics; "" for none
	// PrivateMetrics keeps the metrics off this server's paths; Server.Metrics
	// serves them elsewhere.
	PrivateMetrics bool
	// Tracer makes the spans of requests; none are made where it is nil.
	Tracer trace.Tracer
	// Now tells the time by which requests are measured; time.Now where nil.
	// Deadlines are not by it: connections and contexts keep their own.
	Now func() time.Time
}

// Server answers HTTP requests. Its only state is which batches run and whether
// it drains.
type Server struct {
	cfg     Config
	metrics *metrics
	gate    *gate
	slots   chan struct{} // for areas and pieces of batches
	areas   chan struct{} // for areas that are worked on or wait
	echo    *echo.Echo
	site    *page.Site
	// document describes the service at its own base path.
	document []byte
}

// New builds a server with all routes.
func New(cfg Config) *Server {
	document := documentBelow(cfg.BasePath)
	site, err := page.New(document)
	if err != nil {
		panic(err) // a file of the program's own
	}
	cfg.Limits.fill()
	if cfg.Now == nil {
		cfg.Now = time.Now
	}
	s := &Server{cfg: cfg, metrics: newMetrics(cfg), gate: newGate(cfg.Limits.Batches), slots: newSlots(), areas: make(chan struct{}, cfg.Limits.Areas), echo: echo.New(), site: site, document: document}
	s.metrics.watch(cfg.Registry, s.gate, cfg.Models)
	e := s.echo
	e.HideBanner, e.HidePort = true, true
	e.IPExtractor = cfg.Access.ipExtractor()
	e.HTTPErrorHandler = s.handleError
	e.Use(identify, s.observe, s.admit, newReserve(s.slots).note)
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
		if path == "/metrics" && cfg.PrivateMetrics {
			continue
		}
		e.GET(path, h)
		e.HEAD(path, h)
	}
	e.POST("/v1/area", s.area)
	e.POST("/v1/annotate", s.annotate)
	return s
}

// ServeHTTP answers one request.
func (s *Server) ServeHTTP(w http.ResponseWriter, r *http.Request) {
	s.echo.ServeHTTP(w, stripBase(s.cfg.BasePath, r))
}

// encodeJSON writes a value without escaping <, > and &.
func encodeJSON(w io.Writer, v any) error {
	e := json.NewEncoder(w)
	e.SetEscapeHTML(false)
	return e.Encode(v)
}

// sendJSON sends a value as JSON.
func sendJSON(c echo.Context, v any) error {
	var b bytes.Buffer
	if err := encodeJSON(&b, v); err != nil {
		return err
	}
	return sendBytes(c, echo.MIMEApplicationJSON, b.Bytes())
}

// sendState sends the state of the service, which no cache may keep.
func sendState(c echo.Context, v any) error {
	h := c.Response().Header()
	h.Set(echo.HeaderContentType, echo.MIMEApplicationJSON)
	h.Set(echo.HeaderCacheControl, "no-store")
	c.Response().WriteHeader(http.StatusOK)
	return encodeJSON(c.Response(), v)
}
