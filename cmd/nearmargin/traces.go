package main

import (
	"context"
	"errors"
	"fmt"
	"log/slog"
	"net/url"
	"slices"
	"strings"
	"time"

	"github.com/go-logr/logr"
	"go.opentelemetry.io/otel"
	"go.opentelemetry.io/otel/exporters/otlp/otlptrace/otlptracehttp"
	"go.opentelemetry.io/otel/sdk/resource"
	sdktrace "go.opentelemetry.io/otel/sdk/trace"
	semconv "go.opentelemetry.io/otel/semconv/v1.43.0"
	"go.opentelemetry.io/otel/trace"
)

// flushTime is how long the last spans may take to be sent when the service ends.
const flushTime = 3 * time.Second

// The variables by which OpenTelemetry itself is set up. The exporter and the SDK
// read these and others (OTEL_EXPORTER_OTLP_HEADERS, _CERTIFICATE, _TIMEOUT,
// OTEL_TRACES_SAMPLER, OTEL_SERVICE_NAME, OTEL_RESOURCE_ATTRIBUTES, OTEL_BSP_...)
// themselves; what is checked here they would pass over, or repeat in the log.
const (
	otelDisabled       = "OTEL_SDK_DISABLED"
	otelExporter       = "OTEL_TRACES_EXPORTER"
	otelEndpoint       = "OTEL_EXPORTER_OTLP_ENDPOINT"
	otelTracesEndpoint = "OTEL_EXPORTER_OTLP_TRACES_ENDPOINT"
	otelProtocol       = "OTEL_EXPORTER_OTLP_PROTOCOL"
	otelTracesProtocol = "OTEL_EXPORTER_OTLP_TRACES_PROTOCOL"
	otelHeaders        = "OTEL_EXPORTER_OTLP_HEADERS"
	otelTracesHeaders  = "OTEL_EXPORTER_OTLP_TRACES_HEADERS"
)

// wantsTraces reports whether the environment asks for traces: it names an endpoint
// and does not switch them off. An error names the variable at fault and never
// repeats a header.
func wantsTraces(env func(string) string) (bool, error) {
	if strings.EqualFold(env(otelDisabled), "true") || env(otelExporter) == "none" {
		return false, nil
	}
	if env(otelEndpoint) == "" && env(otelTracesEndpoint) == "" {
		return false, nil
	}
	var errs []error
	if x := env(otelExporter); x != "" && x != "otlp" {
		errs = append(errs, fmt.Errorf("%s is %.40q; want otlp or none", otelExporter, x))
	}
	for _, name := range []string{otelEndpoint, otelTracesEndpoint} {
		if v := env(name); v != "" {
			if u, err := url.Parse(v); err != nil || u.Scheme != "http" && u.Scheme != "https" || u.Host == "" {
				errs = append(errs, fmt.Errorf("%s is no address of a collector; want such as http://127.0.0.1:4318", name))
			}
		}
	}
	for _, name := range []string{otelProtocol, otelTracesProtocol} {
		if v := env(name); !slices.Contains([]string{"", "http/protobuf", "http/json"}, v) {
			errs = append(errs, fmt.Errorf("%s is %.40q; want http/protobuf or http/json", name, v))
		}
	}
	for _, name := range []string{otelHeaders, otelTracesHeaders} {
		if v := env(name); v != "" && !headerList(v) {
			errs = append(errs, fmt.Errorf("%s must be of the form name=value,name=value, with values percent-encoded", name))
		}
	}
	return true, errors.Join(errs...)
}

// headerList reports whether a text is a list of headers as OpenTelemetry reads it.
func headerList(text string) bool {
	for pair := range strings.SplitSeq(text, ",") {
		name, value, ok := strings.Cut(pair, "=")
		if _, err := url.PathUnescape(value); !ok || err != nil || !headerName(strings.TrimSpace(name)) {
			return false
		}
	}
	return true
}

// headerName reports whether a text is a token of RFC 9110.
func headerName(text string) bool {
	return text != "" && !strings.ContainsFunc(text, func(c rune) bool {
		return c <= ' ' || c > '~' || strings.ContainsRune(`"(),/:;<=>?@[\]{}`, c)
	})
}

// startTraces returns what makes the spans of requests and sends them to the
// collector that the environment names, and the function that sends the last ones. A
// collector that is away costs spans and never a request.
func startTraces(ctx context.Context, log *slog.Logger) (trace.Tracer, func(), error) {
	otel.SetLogger(logr.FromSlogHandler(log.Handler()))
	otel.SetErrorHandler(otel.ErrorHandlerFunc(func(err error) { log.Warn("traces", "error", err) }))
	res, err := resource.New(ctx,
		resource.WithTelemetrySDK(),
		resource.WithAttributes(semconv.ServiceName("nearmargin"), semconv.ServiceVersion(release), semconv.VCSRefHeadRevision(commit())),
		resource.WithFromEnv(), // the operator's words count more
	)
	if err != nil {
		return nil, nil, fmt.Errorf("traces: %w", err)
	}
	exporter, err := otlptracehttp.New(ctx)
	if err != nil {
		return nil, nil, fmt.Errorf("traces: %w", err)
	}
	p := sdktrace.NewTracerProvider(sdktrace.WithBatcher(exporter), sdktrace.WithResource(res))
	return p.Tracer("nearmargin/api", trace.WithInstrumentationVersion(release)), func() {
		ctx, cancel := context.WithTimeout(context.WithoutCancel(ctx), flushTime)
		defer cancel()
		if err := p.Shutdown(ctx); err != nil {
			log.Warn("the last traces were not sent", "error", err)
		}
	}, nil
}
