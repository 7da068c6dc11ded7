package api

import (
	"compress/gzip"
	"io"
	"math"
	"net/http"
	"net/http/httptest"
	"regexp"
	"strconv"
	"testing"

	"nearmargin/setting/builtin"
)

// TestLayersMatchTheirSchema checks the layers of the made-up and the built-in model.
func TestLayersMatchTheirSchema(t *testing.T) {
	b, err := builtin.Load()
	if err != nil {
		t.Fatal(err)
	}
	made, real := newRig(t), newRig(t, b.Model)
	for _, c := range []struct {
		path, schema string
		least        int // features of the built-in model
	}{
		{"/v1/slabs", "ContourCollection", 2 * len(b.Model.Slabs())},
		{"/v1/zones", "ZoneCollection", len(b.Model.Zones())},
		{"/v1/hotspots", "HotspotCollection", len(b.Model.Hotspots())},
	} {
		s := schema(t, c.schema)
		valid(t, s, c.path, made.get(c.path).Body.Bytes())
		w := real.get(c.path)
		if ct := w.Header().Get("Content-Type"); ct != "application/geo+json" {
			t.Errorf("%s: content type %q", c.path, ct)
		}
		got := valid(t, s, c.path, w.Body.Bytes())
		if n := len(got["features"].([]any)); n < c.least || n == 0 {
			t.Errorf("%s: %d features, want at least %d", c.path, n, c.least)
		}
		if w := made.get(c.path + "?model=none"); w.Code != http.StatusNotFound {
			t.Errorf("%s of a model that is not loaded: status %d", c.path, w.Code)
		}
	}
}

// TestLayersStayOnTheirSide: nothing of the built-in model is drawn around the globe the
// wrong way (RFC 7946, section 3.1.9).
func TestLayersStayOnTheirSide(t *testing.T) {
	b, err := builtin.Load()
	if err != nil {
		t.Fatal(err)
	}
	r := newRig(t, b.Model)
	for _, path := range []string{"/v1/boundaries", "/v1/slabs", "/v1/zones", "/v1/boundaries?bbox=170,-50,-170,0"} {
		positions := regexp.MustCompile(`\[(-?[\d.]+),(-?[\d.]+)\](,)?`).FindAllStringSubmatch(r.get(path).Body.String(), -1)
		if len(positions) < 100 {
			t.Errorf("%s: %d positions", path, len(positions))
		}
		var before float64
		within := false // a line that goes on
		for _, p := range positions {
			lon, err := strconv.ParseFloat(p[1], 64)
			if err != nil {
				t.Fatal(err)
			}
			if within && math.Abs(lon-before) > 180 {
				t.Errorf("%s: from longitude %g to %g, %s", path, before, lon, p[2])
			}
			before, within = lon, p[3] != ""
		}
	}
}

// TestEntityTags: an answer that a client holds is not sent again; a long one is packed
// for a client that takes gzip; how long it may be kept depends on the edition.
func TestEntityTags(t *testing.T) {
	r := newRig(t)
	ask := func(target string, header ...string) *httptest.ResponseRecorder {
		req := httptest.NewRequest(http.MethodGet, target, nil)
		for i := 0; i < len(header); i += 2 {
			req.Header.Set(header[i], header[i+1])
		}
		w := httptest.NewRecorder()
		r.ServeHTTP(w, req)
		return w
	}
	const point = "/v1/point?lon=61&lat=5"
	first := ask(point)
	tag := first.Header().Get("ETag")
	if tag == "" || first.Header().Get("Cache-Control") != "no-cache" {
		t.Errorf("header %v", first.Header())
	}
	if w := ask(point, "If-None-Match", tag); w.Code != http.StatusNotModified || w.Body.Len() != 0 || w.Header().Get("ETag") != tag {
		t.Errorf("asked again: status %d, %d bytes", w.Code, w.Body.Len())
	}
	if w := ask("/v1/point?lon=61&lat=6", "If-None-Match", tag); w.Code != http.StatusOK || w.Header().Get("ETag") == tag {
		t.Errorf("another place: status %d, the same tag: %v", w.Code, w.Header().Get("ETag") == tag)
	}
	if w := ask(point + "&model=made-up@7"); w.Code != http.StatusOK || w.Header().Get("Cache-Control") != "max-age=86400" {
		t.Errorf("a named edition: status %d, %q", w.Code, w.Header().Get("Cache-Control"))
	}
	plain := ask("/v1/boundaries")
	packed := ask("/v1/boundaries", "Accept-Encoding", "gzip")
	if packed.Header().Get("Content-Encoding") != "gzip" || packed.Body.Len() >= plain.Body.Len() {
		t.Fatalf("header %v, %d bytes of %d", packed.Header(), packed.Body.Len(), plain.Body.Len())
	}
	z, err := gzip.NewReader(packed.Body)
	if err != nil {
		t.Fatal(err)
	}
	if got, err := io.ReadAll(z); err != nil || string(got) != plain.Body.String() {
		t.Errorf("unpacked it differs (%v)", err)
	}
	if w := r.ask(http.MethodPost, "/v1/area", "application/geo+json", `{"type":"Polygon","coordinates":[[[1,1],[2,1],[2,2],[1,1]]]}`); w.Code != http.StatusOK || w.Header().Get("ETag") != "" {
		t.Errorf("a POST: status %d, tag %q", w.Code, w.Header().Get("ETag"))
	}
}

// TestPagesAreServed: the pages stand at their paths; a file that is not there is a
// problem document.
func TestPagesAreServed(t *testing.T) {
	r := newRig(t)
	for path, want := range map[string]string{"/": "text/html; charset=utf-8", "/reference": "text/html; charset=utf-8", "/assets/app.js": "text/javascript; charset=utf-8", "/assets/vendor/d3.LICENSE": "text/plain; charset=utf-8"} {
		w := r.get(path)
		if w.Code != http.StatusOK || w.Header().Get("Content-Type") != want || w.Header().Get("Content-Security-Policy") == "" {
			t.Errorf("%s: status %d, header %v", path, w.Code, w.Header())
		}
	}
	w := r.get("/assets/../api/openapi.json")
	if w.Code != http.StatusNotFound || problem(t, w).Errors == nil {
		t.Errorf("status %d", w.Code)
	}
}
