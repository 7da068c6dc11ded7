package api

import (
	"errors"
	"net/http"
	"strconv"
	"strings"

	"github.com/labstack/echo/v4"

	"nearmargin/api/figure"
	"nearmargin/api/wire"
	"nearmargin/setting"
)

const mimeSVG = "image/svg+xml"

// section sends a slab's cross-section through a site: as JSON, or as SVG where
// the request's Accept prefers that.
func (s *Server) section(c echo.Context) error {
	x, err := s.findSection(c)
	if err != nil {
		return err
	}
	c.Response().Header().Add(echo.HeaderVary, echo.HeaderAccept)
	if prefersSVG(c.Request().Header.Values(echo.HeaderAccept)) {
		return sendBytes(c, mimeSVG, figure.Section(x))
	}
	return sendBytes(c, echo.MIMEApplicationJSON, append(wire.AppendSection(nil, x), '\n'))
}

// sectionSVG sends the cross-section as SVG, whatever the request accepts.
func (s *Server) sectionSVG(c echo.Context) error {
	x, err := s.findSection(c)
	if err != nil {
		return err
	}
	return sendBytes(c, mimeSVG, figure.Section(x))
}

func (s *Server) findSection(c echo.Context) (*setting.Section, error) {
	q := newQuery(c.Request().URL.RawQuery, "lon", "lat", "depth_km", "motion", "motion_fallback", "model")
	site := setting.SiteAt(q.number("lon", true), q.number("lat", true))
	site.DepthKm = q.number("depth_km", false)
	if err := q.err(); err != nil {
		return nil, err
	}
	l, err := s.lookup(c, q, false)
	if err != nil {
		return nil, err
	}
	x, err := l.Section(site)
	var none *setting.NoSlabError
	if errors.As(err, &none) {
		detail := none.Error()
		return nil, newProblem(http.StatusUnprocessableEntity, kindNoSlab, "There is no slab to cut", detail, FieldFault{Parameter: "lon, lat", Detail: detail})
	}
	return x, err
}

// prefersSVG reports whether a request's Accept header gives SVG a higher weight
// than JSON (RFC 9110, section 12.5.1). Ranges that cannot be read do not count.
func prefersSVG(accept []string) bool {
	svg, json := weight{}, weight{}
	for part := range strings.SplitSeq(strings.Join(accept, ","), ",") {
		fields := strings.Split(part, ";")
		media := strings.ToLower(strings.TrimSpace(fields[0]))
		q := 1.0
		for _, p := range fields[1:] {
			name, value, _ := strings.Cut(p, "=")
			if !strings.EqualFold(strings.TrimSpace(name), "q") {
				continue
			}
			var err error
			if q, err = strconv.ParseFloat(strings.TrimSpace(value), 64); err != nil || !(q >= 0 && q <= 1) {
				q = 0
			}
		}
		svg.see(media, q, mimeSVG)
		json.see(media, q, echo.MIMEApplicationJSON)
	}
	return svg.q > json.q
}

// weight is the weight that the most specific range so far gives to a media type.
type weight struct {
	specific int
	q        float64
}

func (w *weight) see(media string, q float64, want string) {
	kind, _, _ := strings.Cut(want, "/")
	specific := 0
	switch media {
	case want:
		specific = 3
	case kind + "/*":
		specific = 2
	case "*/*":
		specific = 1
	}
	if specific > 0 && specific >= w.specific {
		*w = weight{specific, q}
	}
}
