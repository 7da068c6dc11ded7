package api

import (
	"fmt"
	"strings"

	"github.com/labstack/echo/v4"

	"nearmargin/api/wire"
	"nearmargin/setting/boundary"
)

// boundaries sends the boundaries within a box, of a type, or all.
func (s *Server) boundaries(c echo.Context) error {
	q := newQuery(c.Request().URL.RawQuery, "bbox", "type", "model")
	box := boundary.Box{West: -180, South: -90, East: 180, North: 90}
	if q.values.Has("bbox") {
		var err error
		if box, err = parseBox(q.text("bbox")); err != nil {
			q.fault("bbox", "%v", err)
		}
	}
	kind := boundary.Unknown
	if q.values.Has("type") {
		var err error
		if kind, err = boundary.ParseType(q.text("type")); err != nil {
			q.fault("type", "%v", err)
		}
	}
	if err := q.err(); err != nil {
		return err
	}
	m, err := s.findModel(c, q.text("model"))
	if err != nil {
		return err
	}
	list, err := m.Network().Within(box)
	if err != nil {
		return badRequest(FieldFault{Parameter: "bbox", Detail: err.Error()})
	}
	var of []*boundary.Boundary
	for _, b := range list {
		if kind == boundary.Unknown || b.Type() == kind {
			of = append(of, b)
		}
	}
	return sendBytes(c, "application/geo+json", wire.AppendBoundaries(nil, of))
}

// parseBox reads "west,south,east,north".
func parseBox(text string) (boundary.Box, error) {
	parts := strings.Split(text, ",")
	if len(parts) != 4 {
		return boundary.Box{}, fmt.Errorf("%.60q has %d numbers; want four: west,south,east,north", text, len(parts))
	}
	var n [4]float64
	for i, p := range parts {
		var err error
		if n[i], err = parseDecimal(strings.TrimSpace(p)); err != nil {
			return boundary.Box{}, err
		}
	}
	b := boundary.Box{West: n[0], South: n[1], East: n[2], North: n[3]}
	return b, b.Validate()
}
