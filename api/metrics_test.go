package api

import (
	"errors"
	"fmt"
	"net/http"
	"net/http/httptest"
	"strings"
	"testing"

	"github.com/prometheus/client_golang/prometheus/testutil"
)

// TestMetricsLint lints the names and helps of all metrics, and the text.
func TestMetricsLint(t *testing.T) {
	r := newRig(t)
	r.get("/v1/point?lon=1&lat=1")
	r.ask(http.MethodPost, "/v1/annotate", "text/csv", "lon,lat\n1,2\nx,3\n")
	problems, err := testutil.GatherAndLint(r.reg)
	if err != nil {
		t.Fatal(err)
	}
	for _, p := range problems {
		t.Errorf("%s: %s", p.Metric, p.Text)
	}
	text := r.get("/metrics").Body.String()
	for _, line := range []string{
		`nearmargin_http_requests_total{method="GET",route="/v1/point",status="200"} 1`,
		`nearmargin_http_requests_total{method="POST",route="/v1/annotate",status="200"} 1`,
		`nearmargin_http_request_duration_seconds_count{route="/v1/point"} 1`,
		`nearmargin_annotated_rows_total{format="csv"} 2`,
		`nearmargin_annotated_row_errors_total{format="csv"} 1`,
		`nearmargin_build_info{commit="abc",version="1.2.3"} 1`,
		`nearmargin_model_info{active="true",edition="7",id="made-up",sha256="` + strings.Repeat("0123456789abcdef", 4) + `"} 1`,
	} {
		if !strings.Contains(text, line+"\n") {
			t.Errorf("the metrics lack %s:\n%s", line, text)
		}
	}
}

// TestMetricLabelsAreBounded: given a server, when a thousand different paths
// and methods are asked for, expect no more series than routes and known methods.
func TestMetricLabelsAreBounded(t *testing.T) {
	r := newRig(t)
	for i := range 1000 {
		r.get(fmt.Sprintf("/nope/%d", i))
		r.get(fmt.Sprintf("/v1/models/m%d", i))
		r.get(fmt.Sprintf("/v1/point?lon=1&lat=1&model=m%d", i))
		r.ask(fmt.Sprintf("VERB%d", i), "/healthz", "", "")
	}
	families, err := r.reg.Gather()
	if err != nil {
		t.Fatal(err)
	}
	routes, methods := map[string]bool{}, map[string]bool{}
	for _, f := range families {
		for _, m := range f.GetMetric() {
			for _, l := range m.GetLabel() {
				switch l.GetName() {
				case "route":
					routes[l.GetValue()] = true
				case "method":
					methods[l.GetValue()] = true
				}
			}
		}
	}
	for route := range routes {
		if route != "none" && route != "/v1/models/:id" && route != "/healthz" {
			t.Errorf("route label %q", route)
		}
	}
	for method := range methods {
		if method != "GET" && method != "other" {
			t.Errorf("method label %q", method)
		}
	}
	if len(routes) != 3 || len(methods) != 2 {
		t.Errorf("routes %v, methods %v", routes, methods)
	}
}

// brokenWriter fails in a way that no request causes.
type brokenWriter struct{ *httptest.ResponseRecorder }

var errSecret = errors.New("the secret cause")

func (brokenWriter) EnableFullDuplex() error { return errSecret }

// TestInternalError: given a fault of the service, expect 500 without its cause,
// and one record at level ERROR with it.
func TestInternalError(t *testing.T) {
	r := newRig(t)
	req := httptest.NewRequest(http.MethodPost, "/v1/annotate", strings.NewReader("lon,lat\n1,2\n"))
	req.Header.Set("Content-Type", "text/csv")
	w := brokenWriter{httptest.NewRecorder()}
	r.ServeHTTP(w, req)
	body := w.Body.String()
	p := problem(t, w.ResponseRecorder)
	if w.Code != http.StatusInternalServerError || p.Status != w.Code || p.Type != problemType+"http-500" {
		t.Errorf("status %d: %s", w.Code, body)
	}
	if strings.Contains(body, "secret") {
		t.Errorf("the body tells the cause: %s", body)
	}
	n := 0
	for _, rec := range r.log.records(t) {
		if rec["level"] != "ERROR" {
			continue
		}
		n++
		if rec["msg"] != "request failed" || rec["error"] != errSecret.Error() || rec["path"] != "/v1/annotate" {
			t.Errorf("record %v", rec)
		}
	}
	if n != 1 {
		t.Errorf("%d records at level ERROR, want 1: %v", n, r.log.records(t))
	}
}

// TestRequestsAreLogged: one record a request, with the route and the status,
// and none at level ERROR where the request is at fault.
func TestRequestsAreLogged(t *testing.T) {
	r := newRig(t)
	r.get("/v1/point?lon=1&lat=1")
	r.get("/v1/point?lon=1")
	r.get("/nope")
	want := []struct{ route, status string }{{"/v1/point", "200"}, {"/v1/point", "400"}, {"none", "404"}}
	recs := r.log.records(t)
	if len(recs) != len(want) {
		t.Fatalf("%d records, want %d: %v", len(recs), len(want), recs)
	}
	for i, rec := range recs {
		if rec["msg"] != "request" || rec["level"] != "INFO" || rec["route"] != want[i].route || fmt.Sprint(rec["status"]) != want[i].status {
			t.Errorf("record %d: %v, want %v", i, rec, want[i])
		}
	}
}
