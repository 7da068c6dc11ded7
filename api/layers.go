package api

import (
	"net/http"
	"path"
	"strings"

	"github.com/labstack/echo/v4"

	"nearmargin/api/wire"
	"nearmargin/setting"
)

// mimeGeoJSON is the media type of RFC 7946.
const mimeGeoJSON = "application/geo+json"

// layer sends one part of a model as GeoJSON.
func (s *Server) layer(c echo.Context, of func(*setting.Model) []byte) error {
	q := newQuery(c.Request().URL.RawQuery, "model")
	if err := q.err(); err != nil {
		return err
	}
	m, err := s.findModel(c, q.text("model"))
	if err != nil {
		return err
	}
	return sendBytes(c, mimeGeoJSON, of(m))
}

// slabs sends the depth contours of the slabs.
func (s *Server) slabs(c echo.Context) error {
	return s.layer(c, func(m *setting.Model) []byte { return wire.AppendSlabContours(nil, m.Slabs()) })
}

// zones sends the zones of diffuse deformation.
func (s *Server) zones(c echo.Context) error {
	return s.layer(c, func(m *setting.Model) []byte { return wire.AppendZones(nil, m.Zones()) })
}

// hotspots sends the hotspots.
func (s *Server) hotspots(c echo.Context) error {
	return s.layer(c, func(m *setting.Model) []byte { return wire.AppendHotspots(nil, m.Hotspots()) })
}

// page sends a page or a file that one loads. Its query is the page's own affair. At the
// base path itself, without a slash, it leads to that with one, from where the addresses
// within the page are counted.
func (s *Server) page(c echo.Context) error {
	if at, query, asked := strings.Cut(c.Request().RequestURI, "?"); s.cfg.BasePath != "" && at == s.cfg.BasePath {
		to := path.Base(at) + "/"
		if asked {
			to += "?" + query
		}
		return c.Redirect(http.StatusPermanentRedirect, to)
	}
	f, ok := s.site.Find(c.Request().URL.Path)
	if !ok {
		return echo.ErrNotFound
	}
	f.ServeHTTP(c.Response(), c.Request())
	return nil
}
