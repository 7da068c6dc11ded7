package main

import (
	"bufio"
	"encoding/hex"
	"encoding/json"
	"io"
	"net/http"
	"net/http/httptest"
	"os"
	"runtime/pprof"
	"strings"
	"sync"
	"testing"

	collector "go.opentelemetry.io/proto/otlp/collector/trace/v1"
	common "go.opentelemetry.io/proto/otlp/common/v1"
	spans "go.opentelemetry.io/proto/otlp/trace/v1"
	"google.golang.org/protobuf/proto"
)

// receiver is a collector on the loopback interface, which decodes what it is sent.
type receiver struct {
	*httptest.Server
	mu       sync.Mutex
	spans    []*spans.Span
	resource map[string]string
	headers  http.Header
}

func newReceiver(t *testing.T) *receiver {
	t.Helper()
	r := &receiver{}
	r.Server = httptest.NewServer(http.HandlerFunc(func(w http.ResponseWriter, q *http.Request) {
		raw, err := io.ReadAll(q.Body)
		var m collector.ExportTraceServiceRequest
		if err == nil {
			err = proto.Unmarshal(raw, &m)
		}
		if err != nil || q.URL.Path != "/v1/traces" || q.Header.Get("Content-Type") != "application/x-protobuf" {
			t.Errorf("%s, %s: %v", q.URL.Path, q.Header.Get("Content-Type"), err)
		}
		r.mu.Lock()
		defer r.mu.Unlock()
		r.headers = q.Header
		for _, rs := range m.ResourceSpans {
			r.resource = attributes(rs.Resource.Attributes)
			for _, ss := range rs.ScopeSpans {
				r.spans = append(r.spans, ss.Spans...)
			}
		}
		w.Header().Set("Content-Type", "application/x-protobuf")
	}))
	t.Cleanup(r.Close)
	return r
}

func (r *receiver) count() int {
	r.mu.Lock()
	defer r.mu.Unlock()
	return len(r.spans)
}

func attributes(list []*common.KeyValue) map[string]string {
	out := map[string]string{}
	for _, kv := range list {
		switch v := kv.Value.Value.(type) {
		case *common.AnyValue_StringValue:
			out[kv.Key] = v.StringValue
		case *common.AnyValue_IntValue:
			raw, _ := json.Marshal(v.IntValue) // an integer is always JSON
			out[kv.Key] = string(raw)
		}
	}
	return out
}

// TestTraces: given a collector, expect a span for each request, child of the
// caller's, with what was answered and nothing of where; its trace in the log; and
// the last spans sent at the end, for nothing else sends them here.
func TestTraces(t *testing.T) {
	r := newReceiver(t)
	t.Setenv(otelEndpoint, r.URL)
	t.Setenv(otelHeaders, "x-key=a%20secret")
	t.Setenv("OTEL_BSP_SCHEDULE_DELAY", "3600000")
	t.Setenv("OTEL_RESOURCE_ATTRIBUTES", "deployment.environment.name=trial")
	s := startIn(t, os.Getenv)
	const traceID, parent = "4bf92f3577b34da6a3ce929d0e0e4736", "00f067aa0ba902b7"
	send := func(method, target, contentType, body string, header ...string) {
		t.Helper()
		req, err := http.NewRequest(method, "http://"+s.address+target, strings.NewReader(body))
		if err != nil {
			t.Fatal(err)
		}
		req.Header.Set("Content-Type", contentType)
		for i := 0; i < len(header); i += 2 {
			req.Header.Set(header[i], header[i+1])
		}
		res, err := http.DefaultClient.Do(req)
		if err != nil {
			t.Fatal(err)
		}
		defer res.Body.Close()
		if _, err := io.Copy(io.Discard, res.Body); err != nil {
			t.Fatal(err)
		}
	}
	send("GET", "/v1/point?lon=-72.4&lat=-36.125", "", "", "X-Request-Id", "job-1", "traceparent", "00-"+traceID+"-"+parent+"-01", "tracestate", "vendor=7")
	send("POST", "/v1/annotate", "text/csv", "lon,lat\n1,2\nx,3\n-72.4,-36.125\n")
	send("GET", "/v1/point?lon=x", "", "", "traceparent", "00-not-a-trace-01")
	send("GET", "/v1/point?lon=1&lat=2", "", "", "traceparent", "00-"+strings.Repeat("a", 32)+"-"+parent+"-00") // its caller keeps no trace
	send("GET", "/nowhere", "", "")
	if n := r.count(); n != 0 {
		t.Fatalf("%d spans are there before the end", n)
	}
	s.stop()
	if status := <-s.status; status != exitDone {
		t.Fatalf("status %d: %s", status, s.log)
	}

	edition := record(t, s.log.String(), "msg", "listening")["model"]
	got := r.spans
	want := []struct {
		name       string
		attributes map[string]string
	}{
		{"GET /v1/point", map[string]string{"http.request.method": "GET", "http.route": "/v1/point", "http.response.status_code": "200", "nearmargin.request_id": "job-1", "nearmargin.model": edition}},
		{"POST /v1/annotate", map[string]string{"http.request.method": "POST", "http.route": "/v1/annotate", "http.response.status_code": "200", "nearmargin.rows": "3", "nearmargin.row_errors": "1", "nearmargin.model": edition}},
		{"GET /v1/point", map[string]string{"http.route": "/v1/point", "http.response.status_code": "400"}},
		{"GET", map[string]string{"http.response.status_code": "404"}},
	}
	if len(got) != len(want) {
		t.Fatalf("%d spans, want %d: %v", len(got), len(want), got)
	}
	for i, w := range want {
		g := got[i]
		a := attributes(g.Attributes)
		for k, v := range w.attributes {
			if a[k] != v || v == "" {
				t.Errorf("span %d: %s is %q, want %q", i, k, a[k], v)
			}
		}
		if g.Name != w.name || g.Kind != spans.Span_SPAN_KIND_SERVER || g.EndTimeUnixNano < g.StartTimeUnixNano || g.Status.GetCode() == spans.Status_STATUS_CODE_ERROR || a["nearmargin.request_id"] == "" {
			t.Errorf("span %d: %v", i, g)
		}
		if rec := record(t, s.log.String(), "request_id", a["nearmargin.request_id"]); rec["trace_id"] != hex.EncodeToString(g.TraceId) {
			t.Errorf("span %d is of trace %x, logged is %v", i, g.TraceId, rec)
		}
	}
	if g := got[0]; hex.EncodeToString(g.TraceId) != traceID || hex.EncodeToString(g.ParentSpanId) != parent || g.TraceState != "vendor=7" {
		t.Errorf("the caller's trace is not carried on: %v", g)
	}
	if len(got[1].ParentSpanId) != 0 || len(got[2].ParentSpanId) != 0 {
		t.Error("a span has a parent that nobody named")
	}
	if r.resource["service.name"] != "nearmargin" || r.resource["service.version"] != release || r.resource["deployment.environment.name"] != "trial" {
		t.Errorf("resource %v", r.resource)
	}
	if r.headers.Get("X-Key") != "a secret" || strings.Contains(s.log.String(), "secret") {
		t.Errorf("headers %v; log:\n%s", r.headers, s.log)
	}
	for _, g := range got {
		if strings.Contains(g.String(), "36.125") {
			t.Errorf("a span tells where: %v", g)
		}
	}
}

// record returns the first log record in which a text member has a value.
func record(t *testing.T, log, key, value string) map[string]string {
	t.Helper()
	for sc := bufio.NewScanner(strings.NewReader(log)); sc.Scan(); {
		var rec map[string]any
		if err := json.Unmarshal(sc.Bytes(), &rec); err != nil {
			t.Fatal(err)
		}
		if rec[key] == value {
			out := map[string]string{}
			for k, v := range rec {
				if s, ok := v.(string); ok {
					out[k] = s
				}
			}
			return out
		}
	}
	t.Fatalf("no record has %s %q:\n%s", key, value, log)
	return nil
}

// TestNoTracesUnlessAsked: without an endpoint nothing of OpenTelemetry runs; with
// one it does.
func TestNoTracesUnlessAsked(t *testing.T) {
	runs := func() bool {
		var b strings.Builder
		if err := pprof.Lookup("goroutine").WriteTo(&b, 2); err != nil {
			t.Fatal(err)
		}
		return strings.Contains(b.String(), "go.opentelemetry.io/")
	}
	s := startWith(t)
	if runs() {
		t.Error("goroutines of OpenTelemetry run")
	}
	if got := status(t, "http://"+s.address+"/v1/point?lon=1&lat=2"); got != 200 {
		t.Errorf("status %d", got)
	}
	s.stop()
	<-s.status
	if strings.Contains(s.log.String(), "trace_id") {
		t.Errorf("the log names a trace: %s", s.log)
	}
	t.Setenv(otelEndpoint, newReceiver(t).URL)
	s = startIn(t, os.Getenv)
	if !runs() {
		t.Error("with an endpoint nothing of OpenTelemetry runs")
	}
	s.stop()
	<-s.status
}

// TestCollectorAway: requests are answered, and the service ends, as without one.
func TestCollectorAway(t *testing.T) {
	r := newReceiver(t)
	r.Close() // nobody listens there any more
	t.Setenv(otelEndpoint, r.URL)
	t.Setenv("OTEL_BSP_SCHEDULE_DELAY", "10")
	s := startIn(t, os.Getenv)
	for range 20 {
		if got := status(t, "http://"+s.address+"/v1/point?lon=1&lat=2"); got != 200 {
			t.Fatalf("status %d", got)
		}
	}
	s.stop()
	if got := <-s.status; got != exitDone {
		t.Errorf("status %d", got)
	}
	if !strings.Contains(s.log.String(), "traces") {
		t.Errorf("the log does not say that traces were lost: %s", s.log)
	}
}

func TestWantsTraces(t *testing.T) {
	const url = "http://127.0.0.1:4318"
	for _, c := range []struct {
		name   string
		env    map[string]string
		wanted bool
		fault  string
	}{
		{"nothing", nil, false, ""},
		{"an endpoint", map[string]string{otelEndpoint: url}, true, ""},
		{"an endpoint for traces", map[string]string{otelTracesEndpoint: url + "/traces"}, true, ""},
		{"JSON", map[string]string{otelEndpoint: url, otelProtocol: "http/json"}, true, ""},
		{"headers", map[string]string{otelEndpoint: url, otelHeaders: "a=b%20c, x-d=e"}, true, ""},
		{"switched off", map[string]string{otelEndpoint: url, otelDisabled: "TRUE"}, false, ""},
		{"no exporter", map[string]string{otelEndpoint: url, otelExporter: "none"}, false, ""},
		{"another exporter", map[string]string{otelEndpoint: url, otelExporter: "console"}, false, otelExporter + ` is "console"; want otlp or none`},
		{"gRPC", map[string]string{otelEndpoint: url, otelTracesProtocol: "grpc"}, false, otelTracesProtocol + ` is "grpc"; want http/protobuf`},
		{"no scheme", map[string]string{otelEndpoint: "sesame:4318"}, false, otelEndpoint + " is no address"},
		{"a header without a value", map[string]string{otelEndpoint: url, otelHeaders: "sesame"}, false, otelHeaders + " must be"},
		{"a header that is wrongly encoded", map[string]string{otelEndpoint: url, otelTracesHeaders: "a=sesame%2"}, false, otelTracesHeaders + " must be"},
		{"a header without a name", map[string]string{otelEndpoint: url, otelHeaders: "=sesame"}, false, otelHeaders + " must be"},
	} {
		t.Run(c.name, func(t *testing.T) {
			got := invoke(t, c.env, "", "serve", "--check-config")
			text := got.stdout + got.stderr
			if says := strings.Contains(text, "# traces are sent where"); says != c.wanted {
				t.Errorf("traces are sent: %v, want %v", says, c.wanted)
			}
			if (got.status == exitUsage) != (c.fault != "") || !strings.Contains(text, c.fault) || strings.Contains(text, "sesame") {
				t.Errorf("status %d: %s", got.status, text)
			}
		})
	}
}
