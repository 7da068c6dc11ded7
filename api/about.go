package api

import (
	"bytes"
	_ "embed"
	"net/url"
	"time"

	"github.com/labstack/echo/v4"

	"nearmargin/setting"
)

type modelRef struct {
	ID      string `json:"id"`
	Edition string `json:"edition"`
	SHA256  string `json:"sha256"`
}

func refOf(m *setting.Model) modelRef { return modelRef{m.ID(), m.Edition(), m.SHA256()} }

type plateInfo struct {
	Code    string  `json:"code"`
	Name    string  `json:"name"`
	AreaKm2 float64 `json:"area_km2"`
	// MotionModels names the motion models that have an angular velocity for it.
	MotionModels []string `json:"motion_models"`
}

type platesInfo struct {
	Plates []plateInfo `json:"plates"`
	Model  modelRef    `json:"model"`
}

// plates lists the plates of a model.
func (s *Server) plates(c echo.Context) error {
	q := newQuery(c.Request().URL.RawQuery, "model")
	if err := q.err(); err != nil {
		return err
	}
	m, err := s.findModel(c, q.text("model"))
	if err != nil {
		return err
	}
	areas := m.Network().PlateAreasKm2()
	out := platesInfo{Model: refOf(m)}
	for _, p := range m.Plates() {
		info := plateInfo{Code: p.Code, Name: p.Name, AreaKm2: float64(int64(areas[p.Code] + 0.5)), MotionModels: []string{}}
		for _, name := range m.MotionNames() {
			if mm, _ := m.Motion(name); mm.Has(p.Code) {
				info.MotionModels = append(info.MotionModels, name)
			}
		}
		out.Plates = append(out.Plates, info)
	}
	return sendJSON(c, out)
}

type motionModelInfo struct {
	Name       string `json:"name"`
	Title      string `json:"title"`
	Frame      string `json:"frame"`
	TimeSpan   string `json:"time_span"`
	Citation   string `json:"citation"`
	RelativeTo string `json:"relative_to,omitempty"`
	Plates     int    `json:"plates"`
}

type modelInfo struct {
	modelRef
	Title         string            `json:"title"`
	Licence       string            `json:"licence"`
	Citations     []string          `json:"citations"`
	Active        bool              `json:"active"`
	DefaultMotion string            `json:"default_motion"`
	MotionModels  []motionModelInfo `json:"motion_models"`
	Plates        int               `json:"plates"`
	Boundaries    int               `json:"boundaries"`
	Junctions     int               `json:"triple_junctions"`
	Slabs         int               `json:"slabs"`
	Zones         int               `json:"diffuse_zones"`
	Hotspots      int               `json:"hotspots"`
}

type modelsInfo struct {
	Models  []modelInfo `json:"models"`
	Version string      `json:"version"`
	Commit  string      `json:"commit"`
}

func infoOf(m *setting.Model, active bool) modelInfo {
	info := modelInfo{
		modelRef: refOf(m), Title: m.Title(), Licence: m.Licence(), Citations: append([]string{}, m.Citations()...),
		Active: active, DefaultMotion: m.DefaultMotion(),
		Plates: len(m.Plates()), Boundaries: len(m.Network().Boundaries()), Junctions: len(m.Junctions()),
		Slabs: len(m.Slabs()), Zones: len(m.Zones()), Hotspots: len(m.Hotspots()),
	}
	for _, name := range m.MotionNames() {
		mm, _ := m.Motion(name)
		i := mm.Info()
		info.MotionModels = append(info.MotionModels, motionModelInfo{i.Name, i.Title, i.Frame, i.TimeSpan, i.Citation, i.RelativeTo, len(mm.Entries())})
	}
	return info
}

// models lists the models that are loaded.
func (s *Server) models(c echo.Context) error {
	if err := newQuery(c.Request().URL.RawQuery).err(); err != nil {
		return err
	}
	out := modelsInfo{Version: s.cfg.Version, Commit: s.cfg.Commit}
	for i, m := range s.cfg.Models.All() {
		out.Models = append(out.Models, infoOf(m, i == 0))
	}
	return sendJSON(c, out)
}

// model describes one model.
func (s *Server) model(c echo.Context) error {
	if err := newQuery(c.Request().URL.RawQuery).err(); err != nil {
		return err
	}
	id := c.Param("id")
	if c.Request().URL.RawPath != "" { // the router has matched the path as it was sent
		if plain, err := url.PathUnescape(id); err == nil {
			id = plain
		}
	}
	m, err := s.findModel(c, id)
	if err != nil {
		return err
	}
	return sendJSON(c, infoOf(m, m == s.cfg.Models.Active()))
}

// health says that the process runs.
func (s *Server) health(c echo.Context) error {
	return sendState(c, map[string]string{"status": "ok"})
}

type readiness struct {
	Status string   `json:"status"`
	Model  modelRef `json:"model"`
	Since  string   `json:"degraded_since,omitempty"`
	Reason string   `json:"reason,omitempty"`
}

// ready says that requests are answered, and from which model; also where newer
// models cannot be had. A service that shuts down is no longer ready, while it
// still answers.
func (s *Server) ready(c echo.Context) error {
	if s.gate.draining.Load() {
		return overload(kindDraining, "The service is shutting down", "this instance takes no new work")
	}
	out := readiness{Status: "ready", Model: refOf(s.cfg.Models.Active())}
	if s.cfg.Source != nil {
		if since, reason := s.cfg.Source.Degraded(); !since.IsZero() {
			out.Status, out.Since, out.Reason = "degraded", since.UTC().Format(time.RFC3339Nano), reason
		}
	}
	return sendState(c, out)
}

//go:embed openapi.json
var openapiDocument []byte

// OpenAPI returns the OpenAPI 3.1 document of the service.
func OpenAPI() []byte { return openapiDocument }

// documentBelow returns the document of a service whose paths stand below a base path:
// the paths of a document count from its server's address.
func documentBelow(base string) []byte {
	if base == "" {
		return openapiDocument
	}
	return bytes.Replace(openapiDocument, []byte(`"servers": [{"url": "/"`), []byte(`"servers": [{"url": "`+base+`"`), 1)
}

// openapi sends the description of the service.
func (s *Server) openapi(c echo.Context) error {
	return sendBytes(c, echo.MIMEApplicationJSON, s.document)
}
