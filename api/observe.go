package api

import (
	"context"
	"errors"
	"fmt"
	"log/slog"
	"net/http"
	"runtime/debug"
	"strconv"
	"time"

	"github.com/labstack/echo/v4"

	"nearmargin/api/annotate"
)

// keyRows is the key under which a batch leaves what it counted.
const keyRows = "rows"

// statusAborted stands for a status where the answer was broken off.
const statusAborted = "aborted"

// handleError sends the problem document for an error, once.
func (s *Server) handleError(err error, c echo.Context) {
	p := problemOf(err)
	var meant *Problem
	if p.Status >= http.StatusInternalServerError && !errors.As(err, &meant) {
		s.cfg.Log.Error("request failed", "request_id", c.Get(keyRequestID), "path", c.Path(), "error", err)
	}
	if c.Response().Committed {
		return
	}
	if p.retryAfter > 0 {
		c.Response().Header().Set(echo.HeaderRetryAfter, formatSeconds(p.retryAfter))
	}
	if err := writeProblem(c, p); err != nil {
		s.cfg.Log.Warn("problem document not sent", "request_id", c.Get(keyRequestID), "error", err)
	}
}

// observe counts and logs a request, and turns a handler's panic into an answer.
func (s *Server) observe(next echo.HandlerFunc) echo.HandlerFunc {
	return func(c echo.Context) error {
		start, whole := s.cfg.Now(), false
		span := s.startSpan(c)
		if s.gate.draining.Load() { // so that no request is on its way when the connection is closed
			c.Response().Header().Set(echo.HeaderConnection, "close")
		}
		defer func() { // also where a handler breaks the answer off
			s.record(c, whole, max(0, s.cfg.Now().Sub(start))) // the clock may have been set back
			endSpan(span, c, whole)
		}()
		if err := s.guarded(next, c); err != nil {
			c.Error(err)
		}
		whole = true
		return nil
	}
}

// guarded calls a handler. A panic becomes an error while nothing has been sent,
// and breaks the answer off later.
func (s *Server) guarded(next echo.HandlerFunc, c echo.Context) (err error) {
	defer func() {
		p := recover()
		if p == nil {
			return
		}
		if p == http.ErrAbortHandler {
			panic(p)
		}
		s.metrics.panics.Inc()
		s.cfg.Log.Error("panic", "request_id", c.Get(keyRequestID), "path", c.Path(), "panic", fmt.Sprint(p), "stack", string(debug.Stack()))
		if c.Response().Committed {
			panic(http.ErrAbortHandler)
		}
		err = statusProblem(http.StatusInternalServerError)
	}()
	return next(c)
}

// record writes one request to the metrics and the log. It names neither the
// query nor any header's value but the request's id.
func (s *Server) record(c echo.Context, whole bool, took time.Duration) {
	route, status := c.Path(), strconv.Itoa(c.Response().Status)
	if route == "" || c.Response().Status == http.StatusNotFound && route != "/v1/models/:id" {
		route = "none"
	}
	if !whole {
		status = statusAborted
	}
	s.metrics.request(route, c.Request().Method, status, took)
	attrs := append(make([]slog.Attr, 0, 12), slog.String("request_id", requestIDOf(c)), slog.String("method", c.Request().Method),
		slog.String("route", route), slog.String("status", status), slog.String("client", c.RealIP()),
		slog.Int64("bytes", c.Response().Size), slog.Float64("ms", float64(took.Microseconds())/1000))
	if id := s.traceID(c); id != "" {
		attrs = append(attrs, slog.String("trace_id", id))
	}
	if holder, ok := c.Get(keyHolder).(string); ok {
		attrs = append(attrs, slog.String("token", holder))
	}
	if st, ok := c.Get(keyRows).(annotate.Stats); ok {
		attrs = append(attrs, slog.Int64("rows", st.Rows), slog.Int64("row_errors", st.Errors))
	}
	s.cfg.Log.LogAttrs(context.Background(), slog.LevelInfo, "request", attrs...)
}
