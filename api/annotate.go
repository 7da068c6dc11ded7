package api

import (
	"context"
	"errors"
	"fmt"
	"mime"
	"net/http"
	"strings"

	"github.com/labstack/echo/v4"

	"nearmargin/api/annotate"
)

// annotateTypes are the media types that a batch may have.
var annotateTypes = map[string]annotate.Format{
	"text/csv":             annotate.CSV,
	"application/x-ndjson": annotate.NDJSON,
	"application/geo+json": annotate.GeoJSON,
	"application/json":     annotate.JSON,
}

// annotate answers for every row of the body.
func (s *Server) annotate(c echo.Context) error {
	format, contentType, err := batchFormat(c.Request())
	if err != nil {
		return err
	}
	q := newQuery(c.Request().URL.RawQuery, "lon_column", "lat_column", "depth_column", "uncertainty_column", "prefix", "motion", "motion_fallback", "model")
	if err := q.err(); err != nil {
		return err
	}
	l, err := s.lookup(q, format == annotate.CSV)
	if err != nil {
		return err
	}
	// answers leave while rows still come in; HTTP/2 can do that without being asked
	if err := http.NewResponseController(c.Response().Writer).EnableFullDuplex(); err != nil && !errors.Is(err, http.ErrNotSupported) {
		return err
	}
	st, err := annotate.Run(c.Request().Context(), c.Request().Body, &batchWriter{c: c, contentType: contentType}, format, annotate.Options{
		Lookup:    l,
		LonColumn: q.text("lon_column"), LatColumn: q.text("lat_column"),
		DepthColumn: q.text("depth_column"), UncertaintyColumn: q.text("uncertainty_column"),
		Prefix: q.text("prefix"),
	})
	s.metrics.batch(string(format), st)
	if err != nil && c.Response().Committed {
		// The status is out. A broken body is the one way left to tell the reader
		// that the answer is not whole.
		if !errors.Is(err, context.Canceled) {
			s.cfg.Log.Warn("batch cut short", "rows", st.Rows, "error", err)
		}
		panic(http.ErrAbortHandler)
	}
	return err
}

// batchFormat returns the format that a request's content type asks for, and the
// type of the answer.
func batchFormat(r *http.Request) (annotate.Format, string, error) {
	given := r.Header.Get(echo.HeaderContentType)
	media, params, err := mime.ParseMediaType(given)
	format, ok := annotateTypes[media]
	if err != nil || !ok {
		return "", "", unsupported("content type %.60q cannot be annotated; send text/csv, application/x-ndjson, application/geo+json or application/json", given)
	}
	if cs := params["charset"]; cs != "" && !strings.EqualFold(cs, "utf-8") && !strings.EqualFold(cs, "us-ascii") {
		return "", "", unsupported("charset %.40q is not read; send UTF-8", cs)
	}
	if enc := r.Header.Get(echo.HeaderContentEncoding); enc != "" && enc != "identity" {
		return "", "", unsupported("content encoding %.40q is not read; send the body as it is", enc)
	}
	return format, media, nil
}

func unsupported(format string, args ...any) *Problem {
	return newProblem(http.StatusUnsupportedMediaType, "unsupported-media-type", "The body cannot be read", fmt.Sprintf(format, args...))
}

// batchWriter sends the header with the first bytes, so that a fault found
// before them still gets a status of its own.
type batchWriter struct {
	c           echo.Context
	contentType string
}

func (w *batchWriter) Write(p []byte) (int, error) {
	if r := w.c.Response(); !r.Committed {
		r.Header().Set(echo.HeaderContentType, w.contentType)
		r.WriteHeader(http.StatusOK)
	}
	return w.c.Response().Write(p)
}
