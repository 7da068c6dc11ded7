package api

import (
	"encoding/json"
	"encoding/xml"
	"fmt"
	"io"
	"math"
	"net/http"
	"net/http/httptest"
	"strings"
	"testing"

	"nearmargin/setting/builtin"
	"nearmargin/setting/slab"
)

// TestSectionGoldens compares whole sections of the made-up slab, in both forms,
// with those kept.
func TestSectionGoldens(t *testing.T) {
	r := newRig(t)
	for _, c := range []struct {
		name, target, contentType string
		status                    int
	}{
		{"section.json", "/v1/section?lon=62.2&lat=-5&depth_km=100", "application/json", 200},
		{"section_past_rim.json", "/v1/section?lon=67.3&lat=-5&motion=partial", "application/json", 200},
		{"section.svg", "/v1/section.svg?lon=62.2&lat=-5&depth_km=100", "image/svg+xml", 200},
		{"problem_section.json", "/v1/section?lon=-90&lat=20", "application/problem+json", 422},
	} {
		t.Run(c.name, func(t *testing.T) {
			w := r.get(c.target)
			if w.Code != c.status || w.Header().Get("Content-Type") != c.contentType {
				t.Errorf("status %d, type %q, want %d, %q", w.Code, w.Header().Get("Content-Type"), c.status, c.contentType)
			}
			golden(t, c.name, w.Body.Bytes())
		})
	}
}

// TestSectionsMatchTheirSchema cuts the made-up slab and those of the built-in
// model at sites above them and beside them.
func TestSectionsMatchTheirSchema(t *testing.T) {
	made, s := newRig(t), schema(t, "Section")
	ok, nulls := 0, map[string]bool{}
	check := func(r *rig, query string) {
		t.Helper()
		w := r.get("/v1/section?" + query)
		if w.Code == http.StatusUnprocessableEntity {
			valid(t, schema(t, "Problem"), query, w.Body.Bytes())
			return
		}
		if w.Code != http.StatusOK {
			t.Fatalf("%s: status %d: %s", query, w.Code, w.Body)
		}
		for k, v := range valid(t, s, query, w.Body.Bytes()) {
			if v == nil {
				nulls[k] = true
			}
		}
		ok++
	}
	for _, q := range []string{"lon=62.2&lat=-5", "lon=60.2&lat=-5", "lon=59.5&lat=-5", "lon=67.3&lat=-5", "lon=62.2&lat=-5&motion=partial", "lon=422.2&lat=-5", "lon=62.2&lat=-5&motion=partial&motion_fallback=full&model=made-up@7"} {
		check(made, strings.Replace(q, "lon=422.2", "lon=62.2", 1))
	}
	if ok != 7 {
		t.Errorf("%d of 7 sections of the made-up slab", ok)
	}
	b, err := builtin.Load()
	if err != nil {
		t.Fatal(err)
	}
	r := newRig(t, b.Model)
	for _, sl := range b.Model.Slabs() {
		for _, c := range slab.Contours(sl.Surface) {
			p := c.Path[len(c.Path)/2]
			check(r, fmt.Sprintf("lon=%g&lat=%g&depth_km=70", p.Lon, p.Lat))
			check(r, fmt.Sprintf("lon=%g&lat=%g", p.Lon+0.7, math.Min(90, p.Lat+0.7)))
		}
	}
	if ok < 400 {
		t.Errorf("only %d sections", ok)
	}
	for _, k := range []string{"slab_below_site", "trench", "arc_band"} {
		if !nulls[k] {
			t.Errorf("%s was never null", k)
		}
	}
}

// TestSectionSamplesEqualPoints asks for every sample's place by itself: the depth
// is that of the section.
func TestSectionSamplesEqualPoints(t *testing.T) {
	r := newRig(t)
	var s struct {
		Slab    struct{ Slab string }
		Samples []struct {
			Km       float64  `json:"distance_km"`
			Depth    *float64 `json:"depth_km"`
			Lon, Lat float64
		}
	}
	if err := json.Unmarshal(r.get("/v1/section?lon=62.2&lat=-5").Body.Bytes(), &s); err != nil {
		t.Fatal(err)
	}
	met := 0
	for i, x := range s.Samples {
		if i > 0 && x.Km-s.Samples[i-1].Km != 5 {
			t.Errorf("samples at %g and %g km", s.Samples[i-1].Km, x.Km)
		}
		var a struct {
			Slabs []struct {
				Slab  string
				Depth float64 `json:"depth_km"`
			}
		}
		if err := json.Unmarshal(r.get(fmt.Sprintf("/v1/point?lon=%v&lat=%v", x.Lon, x.Lat)).Body.Bytes(), &a); err != nil {
			t.Fatal(err)
		}
		switch {
		case (x.Depth != nil) != (len(a.Slabs) == 1):
			t.Errorf("at %g km: depth %v in the section, %d slabs at the point", x.Km, x.Depth, len(a.Slabs))
		case x.Depth != nil:
			met++
			if math.Abs(*x.Depth-a.Slabs[0].Depth) > 1 {
				t.Errorf("at %g km: %g km deep in the section, %g at the point", x.Km, *x.Depth, a.Slabs[0].Depth)
			}
		}
	}
	if met < 100 {
		t.Errorf("%d samples with a depth", met)
	}
}

// TestSectionNegotiates: given what a caller accepts, expect the form it prefers.
func TestSectionNegotiates(t *testing.T) {
	const isJSON, isSVG = "application/json", "image/svg+xml"
	r := newRig(t)
	for _, c := range []struct{ name, path, accept, want string }{
		{"nothing said", "/v1/section", "", isJSON},
		{"anything", "/v1/section", "*/*", isJSON},
		{"SVG", "/v1/section", "image/svg+xml", isSVG},
		{"SVG in capitals", "/v1/section", "Image/SVG+XML", isSVG},
		{"SVG before anything", "/v1/section", "image/svg+xml,*/*;q=0.8", isSVG},
		{"any image", "/v1/section", "image/*", isSVG},
		{"an image element", "/v1/section", "image/avif,image/webp,image/svg+xml,image/*;q=0.8,*/*;q=0.5", isSVG},
		{"an address bar", "/v1/section", "text/html,application/xhtml+xml,application/xml;q=0.9,*/*;q=0.8", isJSON},
		{"JSON before SVG", "/v1/section", "application/json, image/svg+xml;q=0.5", isJSON},
		{"SVG before JSON", "/v1/section", "application/json;q=0.5, image/svg+xml; q=0.6", isSVG},
		{"both the same", "/v1/section", "image/svg+xml,application/json", isJSON},
		{"SVG refused", "/v1/section", "image/svg+xml;q=0,*/*", isJSON},
		{"a weight that is none", "/v1/section", "image/svg+xml;q=high", isJSON},
		{"the figure's own path", "/v1/section.svg", "application/json", isSVG},
	} {
		t.Run(c.name, func(t *testing.T) {
			req := httptest.NewRequest(http.MethodGet, c.path+"?lon=62.2&lat=-5", nil)
			if c.accept != "" {
				req.Header.Set("Accept", c.accept)
			}
			w := httptest.NewRecorder()
			r.ServeHTTP(w, req)
			if got := w.Header().Get("Content-Type"); w.Code != http.StatusOK || got != c.want {
				t.Fatalf("status %d, type %q, want %q", w.Code, got, c.want)
			}
			if vary := w.Header().Get("Vary"); (vary == "Accept") != (c.path == "/v1/section") {
				t.Errorf("Vary is %q", vary)
			}
			if c.want == isJSON {
				if !json.Valid(w.Body.Bytes()) {
					t.Errorf("not JSON: %.80s", w.Body)
				}
				return
			}
			d := xml.NewDecoder(w.Body)
			root := ""
			for {
				tok, err := d.Token()
				if err == io.EOF {
					break
				}
				if err != nil {
					t.Fatalf("not well formed: %v", err)
				}
				if e, ok := tok.(xml.StartElement); ok && root == "" {
					root = e.Name.Local
				}
			}
			if root != "svg" {
				t.Errorf("the root is %q", root)
			}
		})
	}
}

// TestBadSections: given a section that cannot be, expect a problem document that
// says why, from both paths.
func TestBadSections(t *testing.T) {
	r := newRig(t)
	for _, path := range []string{"/v1/section", "/v1/section.svg"} {
		for _, c := range []refusal{
			{name: "nothing given", status: 400, kind: "invalid-request", place: []string{"lon", "lat"}},
			{name: "out of range", target: "?lon=1&lat=91", status: 400, kind: "invalid-request", place: one("lat"), detail: one("-90 to 90")},
			{name: "too deep", target: "?lon=62.2&lat=-5&depth_km=900", status: 400, kind: "invalid-request", place: one("depth_km")},
			{name: "unknown parameter", target: "?lon=62.2&lat=-5&age_ma=3", status: 400, kind: "invalid-request", place: one("age_ma"), detail: one("it takes lon, lat, depth_km")},
			{name: "no such motion", target: "?lon=62.2&lat=-5&motion=x", status: 400, kind: "invalid-request", place: one("motion"), detail: one("full, partial")},
			{name: "no such model", target: "?lon=62.2&lat=-5&model=x", status: 404, kind: "no-such-model", place: one("model")},
			{name: "no slab near", target: "?lon=-90&lat=20", status: 422, kind: "no-slab", place: one("lon, lat"), detail: one("the nearest is East slab, 1")},
			{name: "past the lateral end", target: "?lon=62.2&lat=0", status: 422, kind: "no-slab", place: one("lon, lat"), detail: one("past the lateral end of the nearest slab, East slab")},
			{name: "post", method: "POST", target: "?lon=62.2&lat=-5", status: 405, kind: "method-not-allowed", place: one("method"), allow: []string{"GET", "HEAD", "OPTIONS"}},
		} {
			t.Run(path+" "+c.name, func(t *testing.T) {
				c.target = path + c.target
				c.check(t, r)
			})
		}
	}
}
