package api

import (
	"net/http"

	"github.com/labstack/echo/v4"
	"go.opentelemetry.io/otel/attribute"
	"go.opentelemetry.io/otel/codes"
	"go.opentelemetry.io/otel/propagation"
	semconv "go.opentelemetry.io/otel/semconv/v1.43.0"
	"go.opentelemetry.io/otel/trace"

	"nearmargin/api/annotate"
	"nearmargin/setting"
)

// The attributes of a span that OpenTelemetry's conventions have no name for.
const (
	spanRequestID = attribute.Key("nearmargin.request_id")
	spanModel     = attribute.Key("nearmargin.model") // the edition that answered
	spanRows      = attribute.Key("nearmargin.rows")  // of a batch
	spanRowErrors = attribute.Key("nearmargin.row_errors")
)

// keyModel is the key under which a request's model is kept.
const keyModel = "model"

// traceContext reads the W3C headers traceparent and tracestate.
var traceContext propagation.TraceContext

// startSpan begins the span of a request, as a child of the caller's where the
// request names one, and puts it into the request's context. It returns nil where
// no traces are kept. Like the log, a span never holds the query.
func (s *Server) startSpan(c echo.Context) trace.Span {
	if s.cfg.Tracer == nil {
		return nil
	}
	r := c.Request()
	name, method := r.Method, semconv.HTTPRequestMethodKey.String(r.Method)
	if !knownMethods[r.Method] {
		name, method = "HTTP", semconv.HTTPRequestMethodOther
	}
	attrs := []attribute.KeyValue{method, spanRequestID.String(requestIDOf(c))}
	if route := c.Path(); route != "" {
		name += " " + route
		attrs = append(attrs, semconv.HTTPRoute(route))
	}
	ctx := traceContext.Extract(r.Context(), propagation.HeaderCarrier(r.Header))
	ctx, span := s.cfg.Tracer.Start(ctx, name, trace.WithSpanKind(trace.SpanKindServer), trace.WithAttributes(attrs...))
	c.SetRequest(r.WithContext(ctx))
	return span
}

// endSpan ends a request's span with what came of it. A fault of the request is no
// error of the service, and so none of its span.
func endSpan(span trace.Span, c echo.Context, whole bool) {
	if span == nil {
		return
	}
	status := c.Response().Status
	span.SetAttributes(semconv.HTTPResponseStatusCode(status))
	if m, ok := c.Get(keyModel).(*setting.Model); ok {
		span.SetAttributes(spanModel.String(m.Ref()))
	}
	if st, ok := c.Get(keyRows).(annotate.Stats); ok {
		span.SetAttributes(spanRows.Int64(st.Rows), spanRowErrors.Int64(st.Errors))
	}
	switch {
	case !whole:
		span.SetAttributes(semconv.ErrorTypeKey.String(statusAborted))
		span.SetStatus(codes.Error, "the answer was broken off")
	case status >= http.StatusInternalServerError:
		span.SetStatus(codes.Error, "")
	}
	span.End()
}

// traceID returns the id of the trace that a request is part of, "" where none is kept.
func (s *Server) traceID(c echo.Context) string {
	if s.cfg.Tracer == nil {
		return ""
	}
	return trace.SpanContextFromContext(c.Request().Context()).TraceID().String()
}
