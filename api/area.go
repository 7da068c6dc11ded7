package api

import (
	"context"
	"errors"
	"fmt"
	"io"
	"mime"
	"net/http"
	"strings"

	"github.com/labstack/echo/v4"

	"nearmargin/api/geojson"
	"nearmargin/api/wire"
	"nearmargin/setting"
)

// areaOfBox answers for a box of meridians and parallels.
func (s *Server) areaOfBox(c echo.Context) error {
	q := newQuery(c.Request().URL.RawQuery, "bbox", "motion", "motion_fallback", "model")
	var area *setting.Area
	if !q.values.Has("bbox") {
		q.fault("bbox", "is missing; give west,south,east,north, such as bbox=-76,-40,-68,-30, or POST a GeoJSON polygon")
	} else if box, err := parseBox(q.text("bbox")); err != nil {
		q.fault("bbox", "%v", err)
	} else if area, err = setting.NewBoxArea(box); err != nil {
		var e *setting.AreaError
		if len(q.faults) == 0 && errors.As(err, &e) && e.Fault == setting.AreaGeometry {
			return impossible(FieldFault{Parameter: "bbox", Detail: e.Detail})
		}
		q.fault("bbox", "%v", err)
	}
	if err := q.err(); err != nil {
		return err
	}
	return s.sendArea(c, q, func() (*setting.Area, error) { return area, nil })
}

// area answers for a GeoJSON polygon.
func (s *Server) area(c echo.Context) error {
	q := newQuery(c.Request().URL.RawQuery, "motion", "motion_fallback", "model")
	if err := q.err(); err != nil {
		return err
	}
	if err := checkAreaType(c.Request()); err != nil {
		return err
	}
	most := s.cfg.Limits.BodyBytes
	body, err := io.ReadAll(io.LimitReader(c.Request().Body, most+1))
	if err == nil && int64(len(body)) > most {
		err = errBodyTooLong
	}
	if err != nil {
		c.Response().Header().Set(echo.HeaderConnection, "close")
		return bodyProblem(err, most, fmt.Sprintf("a request has %v to arrive", s.cfg.Limits.ReadTime))
	}
	return s.sendArea(c, q, func() (*setting.Area, error) { return geojson.DecodeArea(body) })
}

// sendArea makes an area and answers for it, when its turn comes.
func (s *Server) sendArea(c echo.Context, q *query, read func() (*setting.Area, error)) error {
	l, err := s.lookup(c, q, true)
	if err != nil {
		return err
	}
	ctx := c.Request().Context()
	body, err := s.answerArea(ctx, l, read)
	switch {
	case err != nil && ctx.Err() != nil:
		panic(http.ErrAbortHandler) // nobody is left to be told
	case err != nil:
		return err
	}
	return sendBytes(c, echo.MIMEApplicationJSON, body)
}

// answerArea stops with the context's error where that ends.
func (s *Server) answerArea(ctx context.Context, l *setting.Lookup, read func() (*setting.Area, error)) ([]byte, error) {
	leave, err := s.enterArea(ctx)
	if err != nil {
		return nil, err
	}
	defer leave()
	area, err := read()
	if err != nil {
		return nil, areaProblem(err)
	}
	var out setting.AreaAnswer
	if err := l.Area(ctx, area, &out); err != nil {
		return nil, err
	}
	return append(wire.AppendArea(make([]byte, 0, 4096), &out), '\n'), nil
}

// areaProblem turns a fault of a polygon into a problem.
func areaProblem(err error) error {
	var f *geojson.Fault
	if !errors.As(err, &f) {
		return err
	}
	at := FieldFault{Line: f.Line, Column: f.Column, Detail: f.Detail}
	if f.Line == 0 {
		at.Pointer = &f.Pointer
	}
	switch f.Kind {
	case setting.AreaGeometry:
		return impossible(at)
	case setting.AreaTooLarge:
		return tooLarge(at)
	}
	return badRequest(at)
}

func impossible(f FieldFault) *Problem {
	return newProblem(http.StatusUnprocessableEntity, kindImpossible, "The geometry is well formed and cannot be", f.Detail, f)
}

func tooLarge(f FieldFault) *Problem {
	return newProblem(http.StatusRequestEntityTooLarge, kindLarge, "The body is too large", f.Detail, f)
}

// checkAreaType refuses bodies that are not said to be JSON.
func checkAreaType(r *http.Request) error {
	given := r.Header.Get(echo.HeaderContentType)
	media, params, err := mime.ParseMediaType(given)
	if err != nil || media != "application/geo+json" && media != "application/json" {
		return unsupported(echo.HeaderContentType, "content type %.60q holds no polygon; send application/geo+json or application/json", given)
	}
	if cs := params["charset"]; cs != "" && !strings.EqualFold(cs, "utf-8") && !strings.EqualFold(cs, "us-ascii") {
		return unsupported(echo.HeaderContentType, "charset %.40q is not read; send UTF-8", cs)
	}
	if enc := r.Header.Get(echo.HeaderContentEncoding); enc != "" && enc != "identity" {
		return unsupported(echo.HeaderContentEncoding, "content encoding %.40q is not read; send the body as it is", enc)
	}
	return nil
}
