package api

import (
	"bytes"
	"encoding/json"
	"fmt"
	"io"
	"math"
	"net/http"
	"net/http/httptest"
	"strings"
	"testing"

	"nearmargin/api/annotate"
	"nearmargin/setting"
	"nearmargin/setting/builtin"
)

// areaTargets are areas of every kind on the made-up globe.
var areaTargets = []struct{ name, target, body string }{
	{"an interior", "/v1/area?bbox=-100,10,-80,30", ""},
	{"across every boundary", "/v1/area?bbox=-180,-90,180,90", ""},
	{"across ±180°", "/v1/area?bbox=170,-20,-170,20&motion=partial", ""},
	{"a plate without motion", "/v1/area?bbox=55,0,65,15&motion=partial", ""},
	{"motion from the fallback", "/v1/area?bbox=55,0,65,15&motion=partial&motion_fallback=full", ""},
	{"a pole", "/v1/area", `{"type":"Polygon","coordinates":[[[0,60],[120,62],[240,70],[0,60]]]}`},
	{"a hole", "/v1/area?model=made-up", `{"type":"Polygon","coordinates":[[[50,-10],[70,-10],[70,10],[50,10],[50,-10]],[[55,-5],[65,-5],[65,5],[55,5],[55,-5]]]}`},
	{"a feature of two", "/v1/area", `{"type":"Feature","properties":null,"geometry":{"type":"MultiPolygon","coordinates":[[[[20,-8],[40,-8],[30,8],[20,-8]]],[[[175,0],[-175,0],[180,9],[175,0]]]]}}`},
	{"a hectare", "/v1/area", `{"type":"Polygon","coordinates":[[[61,5],[61.001,5],[61.001,5.001],[61,5.001],[61,5]]]}`},
}

func (r *rig) askArea(target, body string) *httptest.ResponseRecorder {
	if body == "" {
		return r.get(target)
	}
	return r.ask(http.MethodPost, target, "application/geo+json", body)
}

func TestAreaAnswersMatchTheirSchema(t *testing.T) {
	b, err := builtin.Load()
	if err != nil {
		t.Fatal(err)
	}
	s := schema(t, "AreaAnswer")
	for _, r := range []*rig{newRig(t), newRig(t, b.Model)} {
		for _, c := range areaTargets {
			target := c.target
			if r.cfg.Models.Active().ID() == "builtin" {
				target = strings.NewReplacer("partial", "itrf2014", "full", "pb2002", "made-up", "builtin").Replace(target)
			}
			w := r.askArea(target, c.body)
			if w.Code != http.StatusOK || w.Header().Get("Content-Type") != "application/json" {
				t.Fatalf("%s: status %d: %s", c.name, w.Code, w.Body)
			}
			a := valid(t, s, c.name, w.Body.Bytes())
			for _, list := range []string{"plates", "settings"} {
				sum := 0.0
				for _, x := range a[list].([]any) {
					f, _ := x.(map[string]any)["fraction"].(json.Number).Float64()
					sum += f
				}
				if math.Abs(sum-1) > 2e-4 {
					t.Errorf("%s: the fractions of %s add up to %g", c.name, list, sum)
				}
			}
		}
	}
}

func TestAreaGoldens(t *testing.T) {
	r := newRig(t)
	for _, c := range []struct {
		name, target, body string
		status             int
	}{
		{"area_box.json", "/v1/area?bbox=50,-5,70,25", "", 200},
		{"area_interior.json", "/v1/area", `{"type":"Polygon","coordinates":[[[-100,10],[-80,10],[-90,30],[-100,10]]]}`, 200},
		{"area_two.json", "/v1/area?motion=partial", areaTargets[7].body, 200},
		{"problem_area.json", "/v1/area", `{"type":"Polygon","coordinates":[[[0,0],[1,1],[0,1],[1,0],[0,0]]]}`, 422},
	} {
		t.Run(c.name, func(t *testing.T) {
			w := r.askArea(c.target, c.body)
			if w.Code != c.status {
				t.Errorf("status %d, want %d", w.Code, c.status)
			}
			golden(t, c.name, w.Body.Bytes())
			if again := newRig(t).askArea(c.target, c.body).Body.String(); again != w.Body.String() {
				t.Errorf("asked elsewhere: %s", again)
			}
		})
	}
}

// TestBadAreas: given a server, when an area is at fault, expect 400 for its form
// and 422 where it is well formed and cannot be, with parameter or pointer.
func TestBadAreas(t *testing.T) {
	const geo, cannot = "application/geo+json", "impossible-geometry"
	r := newRig(t)
	square := `[[0,0],[1,0],[1,1],[0,1],[0,0]]`
	for _, c := range []refusal{
		{name: "no box", target: "", place: one("bbox"), detail: one("is missing")},
		{name: "a word for a box", target: "?bbox=a", place: one("bbox"), detail: one("west,south,east,north")},
		{name: "three numbers", target: "?bbox=1,2,3", place: one("bbox"), detail: one("3 numbers")},
		{name: "a decimal comma too many", target: "?bbox=1,2,3,4,5", place: one("bbox"), detail: one("5 numbers")},
		{name: "NaN in a box", target: "?bbox=1,2,3,NaN", place: one("bbox")},
		{name: "upside down", target: "?bbox=1,20,3,10", place: one("bbox"), detail: one("south 20")},
		{name: "beyond the pole", target: "?bbox=1,20,3,91", place: one("bbox")},
		{name: "unknown parameter", target: "?bbox=1,1,2,2&lon=1", place: one("lon"), detail: one("it takes bbox")},
		{name: "two faults", target: "?bbox=1,1,1,1&lon=1", place: []string{"lon", "bbox"}},
		{name: "no such motion", target: "?bbox=1,1,2,2&motion=x", place: one("motion"), detail: one("full, partial")},
		{name: "no such model", target: "?bbox=1,1,2,2&model=x", status: 404, kind: "no-such-model", place: one("model")},
		{name: "no height", target: "?bbox=1,1,2,1", status: 422, kind: cannot, place: one("bbox"), detail: one("no area")},
		{name: "no width", target: "?bbox=1,1,1,2", status: 422, kind: cannot, place: one("bbox"), detail: one("no area")},
		{name: "bbox in a POST", method: "POST", target: "?bbox=1,1,2,2", contentType: geo, body: "{}", place: one("bbox"), detail: one("it takes motion")},
		{name: "no body", method: "POST", contentType: geo, place: one("#"), detail: one("empty")},
		{name: "not JSON", method: "POST", contentType: geo, body: "{\n\"type\"", place: one("line 2"), detail: one("not JSON")},
		{name: "a point", method: "POST", contentType: geo, body: `{"type":"Point","coordinates":[1,2]}`, place: one("#/type"), detail: one("Point")},
		{name: "an open ring", method: "POST", contentType: geo, body: `{"type":"Polygon","coordinates":[[[0,0],[1,0],[1,1],[0,1]]]}`, place: one("#/coordinates/0/3"), detail: one("must end where it starts")},
		{name: "latitude 100", method: "POST", contentType: geo, body: `{"type":"Feature","geometry":{"type":"MultiPolygon","coordinates":[[[[0,0],[1,100],[1,1],[0,0]]]]}}`, place: one("#/geometry/coordinates/0/0/1"), detail: one("-90 to 90")},
		{name: "a bow-tie", method: "POST", contentType: "application/json", body: `{"type":"Polygon","coordinates":[[[0,0],[1,1],[0,1],[1,0],[0,0]]]}`, status: 422, kind: cannot, place: one("#/coordinates/0/2"), detail: one("meets itself")},
		{name: "no area", method: "POST", contentType: geo, body: `{"type":"Polygon","coordinates":[[[0,0],[0,0],[0,0],[0,0]]]}`, status: 422, kind: cannot, place: one("#/coordinates/0")},
		{name: "a hole outside", method: "POST", contentType: geo, body: `{"type":"Polygon","coordinates":[` + square + `,[[5,5],[6,5],[6,6],[5,5]]]}`, status: 422, kind: cannot, place: one("#/coordinates/1/0"), detail: one("must be inside")},
		{name: "overlap", method: "POST", contentType: geo, body: `{"type":"MultiPolygon","coordinates":[[` + square + `],[` + square + `]]}`, status: 422, kind: cannot, place: one("#/coordinates/1"), detail: one("overlap")},
		{name: "too large for a hemisphere", method: "POST", contentType: geo, body: `{"type":"Polygon","coordinates":[[[0,-5],[120,-5],[240,-5],[0,-5]]]}`, status: 200},
		{name: "around the equator", method: "POST", contentType: geo, body: `{"type":"Polygon","coordinates":[[[0,0],[120,0],[240,0],[0,0]]]}`, status: 422, kind: cannot, place: one("#/coordinates/0"), detail: one("hemisphere")},
		{name: "a body too long", method: "POST", contentType: geo, body: strings.Repeat(" ", annotate.MaxArrayBytes) + "{}", status: 413, kind: "too-large", place: one("#"), detail: one("4194304")},
		{name: "positions without end", method: "POST", contentType: geo, body: `{"type":"Polygon","coordinates":[[` + strings.Repeat("[1,1],", setting.MaxAreaPositions) + `[1,1]]]}`, status: 413, kind: "too-large", place: one("#/coordinates/0/20000"), detail: one("20000")},
		{name: "a table", method: "POST", contentType: "text/csv", body: "lon,lat\n", status: 415, kind: "unsupported-media-type", place: one("Content-Type"), detail: one("application/geo+json")},
		{name: "no content type", method: "POST", body: "{}", status: 415, kind: "unsupported-media-type", place: one("Content-Type")},
		{name: "another charset", method: "POST", contentType: geo + "; charset=latin1", body: "{}", status: 415, kind: "unsupported-media-type", place: one("Content-Type"), detail: one("UTF-8")},
		{name: "DELETE", method: "DELETE", status: 405, kind: "method-not-allowed", place: one("method"), allow: []string{"GET", "HEAD", "OPTIONS", "POST"}},
	} {
		t.Run(c.name, func(t *testing.T) {
			c.target = "/v1/area" + c.target
			if c.status == 0 {
				c.status, c.kind = http.StatusBadRequest, "invalid-request"
			}
			if c.status == http.StatusOK { // as near to the limit as it may be
				if w := r.ask(c.method, c.target, c.contentType, c.body); w.Code != http.StatusOK {
					t.Errorf("status %d: %s", w.Code, w.Body)
				}
				return
			}
			c.check(t, r)
		})
	}
}

// TestAreaBodyBreaksOff: a client that goes away half way is no fault of ours.
func TestAreaBodyBreaksOff(t *testing.T) {
	req := httptest.NewRequest(http.MethodPost, "/v1/area", io.MultiReader(strings.NewReader(`{"type":`), brokenReader{}))
	req.Header.Set("Content-Type", "application/json")
	w := httptest.NewRecorder()
	newRig(t).ServeHTTP(w, req)
	if p := problem(t, w); w.Code != http.StatusBadRequest || !strings.Contains(p.Errors[0].Detail, "breaks off") {
		t.Errorf("status %d, %+v", w.Code, p)
	}
}

type brokenReader struct{}

func (brokenReader) Read([]byte) (int, error) { return 0, io.ErrUnexpectedEOF }

// TestAnnotatePolygons: a Feature of a polygon gets what /v1/area says of it, in
// every form that holds Features; one at fault keeps its place.
func TestAnnotatePolygons(t *testing.T) {
	r := newRig(t)
	const polygon = `{"type":"Polygon","coordinates":[[[50,-10],[70,-10],[70,10],[50,10],[50,-10]]]}`
	const multi = `{"type":"MultiPolygon","coordinates":[[[[20,-8],[40,-8],[30,8],[20,-8]]]]}`
	feature := func(geometry string) string {
		return `{"type":"Feature","properties":{"a":1.0},"geometry":` + geometry + `}`
	}
	features := []string{feature(polygon), feature(`{"type":"Point","coordinates":[61,5]}`), feature(multi), feature(`{"type":"Polygon","coordinates":[[[0,0],[1,1],[0,1],[1,0],[0,0]]]}`), feature(`{"type":"Polygon","coordinates":[]}`)}
	want := []string{
		strings.TrimSpace(r.askArea("/v1/area", polygon).Body.String()),
		strings.TrimSpace(r.get("/v1/point?lon=61&lat=5").Body.String()),
		strings.TrimSpace(r.askArea("/v1/area", multi).Body.String()),
		"", "",
	}
	errors := []string{3: "/geometry/coordinates/0/2: the ring meets itself", 4: "/geometry/coordinates: the polygon is empty"}
	forms := map[string]string{
		"application/geo+json": `{"type":"FeatureCollection","features":[` + strings.Join(features, ",") + `]}`,
		"application/json":     "[" + strings.Join(features, ",") + "]",
		"application/x-ndjson": strings.Join(features, "\n"),
	}
	one := schema(t, "AnnotatedFeature")
	for form, body := range forms {
		w := r.ask(http.MethodPost, "/v1/annotate", form, body)
		if w.Code != http.StatusOK {
			t.Fatalf("%s: status %d: %s", form, w.Code, w.Body)
		}
		var got []json.RawMessage
		var err error
		switch form {
		case "application/geo+json":
			var c struct{ Features []json.RawMessage }
			err = json.Unmarshal(w.Body.Bytes(), &c)
			got = c.Features
		case "application/json":
			err = json.Unmarshal(w.Body.Bytes(), &got)
		default:
			for line := range bytes.Lines(w.Body.Bytes()) {
				got = append(got, line)
			}
		}
		if err != nil || len(got) != len(features) {
			t.Fatalf("%s: %d features, %v", form, len(got), err)
		}
		for i, raw := range got {
			valid(t, one, fmt.Sprint(form, " ", i), raw)
			var f struct {
				Properties struct {
					Tectonic json.RawMessage
					Error    string `json:"tectonic_error"`
				}
			}
			if err := json.Unmarshal(raw, &f); err != nil {
				t.Fatal(err)
			}
			if string(f.Properties.Tectonic) != want[i] {
				t.Errorf("%s: feature %d: %s\nwant %s", form, i, f.Properties.Tectonic, want[i])
			}
			if i < len(errors) && !strings.HasPrefix(f.Properties.Error, errors[i]) || errors[i] == "" && f.Properties.Error != "" {
				t.Errorf("%s: feature %d: %q, want %q", form, i, f.Properties.Error, errors[i])
			}
		}
	}
}

// TestAnnotateSiteAfterPolygon: an object with a site, after a Feature of a
// polygon, gets the answer for its site.
func TestAnnotateSiteAfterPolygon(t *testing.T) {
	r := newRig(t)
	w := r.ask(http.MethodPost, "/v1/annotate", "application/x-ndjson", `{"type":"Feature","properties":{},"geometry":{"type":"Polygon","coordinates":[[[50,-10],[70,-10],[70,10],[50,-10]]]}}`+"\n"+`{"lon":61,"lat":5}`+"\n")
	lines := strings.Split(strings.TrimSpace(w.Body.String()), "\n")
	if len(lines) != 2 {
		t.Fatalf("%d lines: %s", len(lines), w.Body)
	}
	if want := `{"lon":61,"lat":5,"tectonic":` + strings.TrimSpace(r.get("/v1/point?lon=61&lat=5").Body.String()) + "}"; lines[1] != want {
		t.Errorf("%s\nwant %s", lines[1], want)
	}
}
