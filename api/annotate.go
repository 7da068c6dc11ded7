package api

import (
	"context"
	"errors"
	"fmt"
	"mime"
	"net/http"
	"os"
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
	q := newQuery(c.Request().URL.RawQuery, "lon_column", "lat_column", "depth_column", "uncertainty_column", "depth_unit", "depth_datum", "elevation_column", "prefix", "motion", "motion_fallback", "model")
	if err := q.err(); err != nil {
		return err
	}
	l, err := s.lookup(c, q, format == annotate.CSV)
	if err != nil {
		return err
	}
	leave, busy := s.gate.enter()
	if busy != nil {
		s.metrics.refused.WithLabelValues(refusedBatch).Inc()
		return busy
	}
	defer leave()
	rc := http.NewResponseController(c.Response().Writer)
	// answers leave while rows still come in; HTTP/2 can do that without being asked
	if err := rc.EnableFullDuplex(); err != nil && !errors.Is(err, http.ErrNotSupported) {
		return err
	}
	limits := &s.cfg.Limits
	ctx, cancel := context.WithTimeoutCause(c.Request().Context(), limits.BatchTime, errBatchTime)
	defer cancel()
	in := &batchReader{r: c.Request().Body, ctx: ctx, rc: rc, stall: limits.StallTime}
	out := &batchWriter{c: c, ctx: ctx, rc: rc, stall: limits.StallTime, contentType: contentType}
	st, err := annotate.Run(ctx, in, out, format, annotate.Options{
		Lookup: l, Slots: s.slots,
		RowBytes: limits.RowBytes, ArrayBytes: limits.BodyBytes,
		LonColumn: q.text("lon_column"), LatColumn: q.text("lat_column"),
		DepthColumn: q.text("depth_column"), UncertaintyColumn: q.text("uncertainty_column"),
		DepthUnit: q.text("depth_unit"), DepthDatum: q.text("depth_datum"), ElevationColumn: q.text("elevation_column"),
		Prefix: q.text("prefix"),
	})
	patience := fmt.Sprintf("%d bytes have %v to arrive", progressBytes, limits.StallTime)
	s.metrics.batch(string(format), st)
	c.Set(keyRows, st)
	switch {
	case err == nil:
		out.finish(st)
		return nil
	case !c.Response().Committed && errors.Is(in.err, os.ErrDeadlineExceeded) && !overTime(ctx):
		// net/http takes the deadline for the client's leaving; the client is there
		s.metrics.cut.WithLabelValues(cutSlowSender).Inc()
		c.Response().Header().Set(echo.HeaderConnection, "close")
		return bodyProblem(in.err, limits.BodyBytes, patience)
	case c.Response().Committed || ctx.Err() != nil:
		// The status is out, or nobody is left to read it. A broken body is the one
		// way left to tell the reader that the answer is not whole.
		reason := cutReason(ctx, in, out, err)
		s.metrics.cut.WithLabelValues(reason).Inc()
		if reason != cutClientLeft {
			s.cfg.Log.Warn("batch cut short", "request_id", c.Get(keyRequestID), "reason", reason, "rows", st.Rows, "error", err)
		}
		panic(http.ErrAbortHandler)
	case in.err != nil:
		c.Response().Header().Set(echo.HeaderConnection, "close")
		return bodyProblem(in.err, limits.BodyBytes, patience)
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
		return "", "", unsupported(echo.HeaderContentType, "content type %.60q cannot be annotated; send text/csv, application/x-ndjson, application/geo+json or application/json", given)
	}
	if cs := params["charset"]; cs != "" && !strings.EqualFold(cs, "utf-8") && !strings.EqualFold(cs, "us-ascii") {
		return "", "", unsupported(echo.HeaderContentType, "charset %.40q is not read; send UTF-8", cs)
	}
	if enc := r.Header.Get(echo.HeaderContentEncoding); enc != "" && enc != "identity" {
		return "", "", unsupported(echo.HeaderContentEncoding, "content encoding %.40q is not read; send the body as it is", enc)
	}
	return format, media, nil
}

func unsupported(header, format string, args ...any) *Problem {
	detail := fmt.Sprintf(format, args...)
	return newProblem(http.StatusUnsupportedMediaType, kindMedia, "The body cannot be read", detail, FieldFault{Parameter: header, Detail: detail})
}
