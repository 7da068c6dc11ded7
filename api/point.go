package api

import (
	"github.com/labstack/echo/v4"

	"nearmargin/api/wire"
	"nearmargin/setting"
)

// point answers for one site.
func (s *Server) point(c echo.Context) error {
	q := newQuery(c.Request().URL.RawQuery, "lon", "lat", "depth_km", "uncertainty_km", "age_ma", "motion", "motion_fallback", "model")
	site := setting.Site{
		Lon:           q.number("lon", true),
		Lat:           q.number("lat", true),
		DepthKm:       q.number("depth_km", false),
		UncertaintyKm: q.number("uncertainty_km", false),
		AgeMa:         q.number("age_ma", false),
	}
	if err := q.err(); err != nil {
		return err
	}
	l, err := s.lookup(q, false)
	if err != nil {
		return err
	}
	var a setting.Answer
	if err := l.At(site, &a); err != nil {
		return err
	}
	return sendBytes(c, echo.MIMEApplicationJSON, append(wire.AppendAnswer(make([]byte, 0, 4096), &a), '\n'))
}
