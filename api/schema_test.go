package api

import (
	"bufio"
	"bytes"
	"fmt"
	"net/http"
	"net/url"
	"strings"
	"testing"

	"github.com/santhosh-tekuri/jsonschema/v6"

	"nearmargin/api/internal/testmodel"
	"nearmargin/setting"
	"nearmargin/setting/builtin"
)

// valid checks a body against a schema and returns it.
func valid(t *testing.T, s *jsonschema.Schema, what string, body []byte) map[string]any {
	t.Helper()
	v, err := jsonschema.UnmarshalJSON(bytes.NewReader(body))
	if err != nil {
		t.Fatalf("%s: not JSON: %v\n%s", what, err, body)
	}
	if err := s.Validate(v); err != nil {
		t.Fatalf("%s: %v\n%s", what, err, body)
	}
	m, _ := v.(map[string]any)
	return m
}

// TestAnswersMatchTheirSchema asks for sites all over the made-up globe: within
// every setting, on the lines, at the poles and on both sides of ±180°.
func TestAnswersMatchTheirSchema(t *testing.T) {
	r, s := newRig(t), schema(t, "Answer")
	met, nulls, slabs := map[string]bool{}, map[string]bool{}, 0
	check := func(query string) {
		t.Helper()
		w := r.get("/v1/point?" + query)
		if w.Code != http.StatusOK {
			t.Fatalf("%s: status %d: %s", query, w.Code, w.Body)
		}
		a := valid(t, s, query, w.Body.Bytes())
		met[a["setting"].(map[string]any)["label"].(string)] = true
		for k, v := range a {
			if v == nil {
				nulls[k] = true
			}
		}
		slabs += len(a["slabs"].([]any))
	}
	for _, c := range []struct{ name, query string }{
		{"north pole", "lon=10&lat=90"},
		{"south pole", "lon=-180&lat=-90"},
		{"on a line", "lon=0&lat=0"},
		{"antimeridian", "lon=180&lat=0"},
		{"a hair west of it", "lon=179.99999999&lat=45"},
		{"a hair east of it", "lon=-179.99999999&lat=70"},
		{"longitude of the second kind", "lon=359.5&lat=20"},
		{"every optional parameter", "lon=55&lat=5&depth_km=30&uncertainty_km=4&age_ma=6&motion=partial&motion_fallback=full&model=" + testmodel.ID},
		{"a plate without motion", "lon=65&lat=5&motion=partial"},
		{"ends of the ranges", "lon=-180&lat=-89.5&depth_km=-10&uncertainty_km=0&age_ma=0"},
		{"other ends of the ranges", "lon=360&lat=89.5&depth_km=800&uncertainty_km=1000&age_ma=4600"},
		{"exponents", "lon=1e1&lat=-.5e-3"},
		{"above a slab", "lon=63&lat=-5"},
		{"within a slab", "lon=63&lat=-5&depth_km=250"},
		{"near the hotspot", "lon=-90.5&lat=20.5"},
	} {
		t.Run(c.name, func(t *testing.T) { check(c.query) })
	}
	for lat := -87.0; lat <= 87; lat += 7.25 {
		for lon := -180.0; lon <= 180; lon += 0.8 {
			check(fmt.Sprintf("lon=%g&lat=%g", lon, lat))
		}
	}
	for _, l := range setting.AllLabels {
		if l != setting.BackArcSpreading && !met[l.String()] {
			t.Errorf("no site has the label %v", l)
		}
	}
	if slabs == 0 {
		t.Error("no site lies above a slab")
	}
	for _, k := range []string{"controlling_boundary", "triple_junction", "diffuse_zone", "hotspot"} {
		if !nulls[k] {
			t.Errorf("%s was never null", k)
		}
	}
}

// TestBuiltinAnswersMatchTheirSchema does the same on the built-in model, and
// for everything else that is said of it.
func TestBuiltinAnswersMatchTheirSchema(t *testing.T) {
	b, err := builtin.Load()
	if err != nil {
		t.Fatal(err)
	}
	r, s := newRig(t, b.Model), schema(t, "Answer")
	step := 6.0
	if testing.Short() {
		step = 15
	}
	for lat := -90.0; lat <= 90; lat += step {
		for lon := -180.0; lon <= 180; lon += step {
			for _, extra := range []string{"", "&depth_km=40&uncertainty_km=10&age_ma=20&motion_fallback=pb2002"} {
				query := fmt.Sprintf("lon=%g&lat=%g%s", lon, lat, extra)
				w := r.get("/v1/point?" + query)
				if w.Code != http.StatusOK {
					t.Fatalf("%s: status %d: %s", query, w.Code, w.Body)
				}
				valid(t, s, query, w.Body.Bytes())
			}
		}
	}
	checkModelPaths(t, r, b.Model.Ref())
}

// TestModelPathsMatchTheirSchemas checks the made-up model's description.
func TestModelPathsMatchTheirSchemas(t *testing.T) {
	r := newRig(t, testmodel.New(t), testmodel.Named(t, testmodel.ID, "6"))
	checkModelPaths(t, r, testmodel.ID+"@6")
}

func checkModelPaths(t *testing.T, r *rig, ref string) {
	t.Helper()
	for target, name := range map[string]string{
		"/v1/boundaries": "BoundaryCollection",
		"/v1/boundaries?bbox=170,-40,-170,40&type=subduction":       "BoundaryCollection",
		"/v1/boundaries?bbox=1,1,1,1&model=" + url.QueryEscape(ref): "BoundaryCollection",
		"/v1/plates": "Plates",
		"/v1/plates?model=" + url.QueryEscape(ref): "Plates",
		"/v1/models":        "Models",
		"/v1/models/" + ref: "ModelInfo",
		"/v1/models/" + strings.ReplaceAll(ref, "@", "%40"): "ModelInfo",
		"/healthz": "Health",
		"/readyz":  "Readiness",
	} {
		w := r.get(target)
		if w.Code != http.StatusOK {
			t.Errorf("%s: status %d: %s", target, w.Code, w.Body)
			continue
		}
		want := "application/json"
		if name == "BoundaryCollection" {
			want = "application/geo+json"
		}
		if ct := w.Header().Get("Content-Type"); ct != want {
			t.Errorf("%s: content type %q, want %q", target, ct, want)
		}
		valid(t, schema(t, name), target, w.Body.Bytes())
	}
}

// TestAnnotatedBodiesMatchTheirSchemas sends rows that have an answer and rows
// that have none, in each form of JSON.
func TestAnnotatedBodiesMatchTheirSchemas(t *testing.T) {
	r := newRig(t)
	object, feature, collection := schema(t, "AnnotatedObject"), schema(t, "AnnotatedFeature"), schema(t, "AnnotatedCollection")
	const objects = `{"lon":1,"lat":2,"x":"kept"}|{"lon":1}|{"lon":"181","lat":"95"}|{}`
	const features = `{"type":"Feature","properties":null,"geometry":{"type":"Point","coordinates":[1,2,3]}}|` +
		`{"type":"Feature","properties":{"a":1},"geometry":null}`
	t.Run("ndjson", func(t *testing.T) {
		w := r.ask(http.MethodPost, "/v1/annotate", "application/x-ndjson", strings.ReplaceAll(objects, "|", "\n"))
		n := 0
		for sc := bufio.NewScanner(w.Body); sc.Scan(); n++ {
			valid(t, object, "line", sc.Bytes())
		}
		if n != 4 {
			t.Errorf("%d lines, want 4", n)
		}
		w = r.ask(http.MethodPost, "/v1/annotate", "application/x-ndjson", strings.ReplaceAll(features, "|", "\n"))
		n = 0
		for sc := bufio.NewScanner(w.Body); sc.Scan(); n++ {
			valid(t, feature, "feature line", sc.Bytes())
		}
		if n != 2 {
			t.Errorf("%d features, want 2", n)
		}
	})
	t.Run("json", func(t *testing.T) {
		w := r.ask(http.MethodPost, "/v1/annotate", "application/json", "["+strings.ReplaceAll(objects, "|", ",")+"]")
		v, err := jsonschema.UnmarshalJSON(w.Body)
		if err != nil {
			t.Fatal(err)
		}
		items := v.([]any)
		for i, item := range items {
			if err := object.Validate(item); err != nil {
				t.Errorf("element %d: %v", i, err)
			}
		}
		if len(items) != 4 {
			t.Errorf("%d elements, want 4", len(items))
		}
	})
	t.Run("geojson", func(t *testing.T) {
		w := r.ask(http.MethodPost, "/v1/annotate?depth_column=@z", "application/geo+json", `{"type":"FeatureCollection","features":[`+strings.ReplaceAll(features, "|", ",")+`],"after":1}`)
		got := valid(t, collection, "collection", w.Body.Bytes())
		if n := len(got["features"].([]any)); n != 2 {
			t.Errorf("%d features, want 2", n)
		}
		w = r.ask(http.MethodPost, "/v1/annotate", "application/geo+json", strings.Split(features, "|")[0])
		valid(t, feature, "single feature", w.Body.Bytes())
	})
}

// TestSchemaRefusesOtherAnswers breaks an answer in several ways: a schema that
// lets everything pass would prove nothing.
func TestSchemaRefusesOtherAnswers(t *testing.T) {
	s := schema(t, "Answer")
	good := newRig(t).get("/v1/point?lon=55&lat=5").Body.String()
	for _, c := range []struct{ name, from, to string }{
		{"a member more", `{"site":`, `{"extra":1,"site":`},
		{"a member less", `"slabs":[],`, ``},
		{"an unknown label", `"label":"`, `"label":"x`},
		{"longitude -180", `"lon":55`, `"lon":-180`},
		{"latitude 91", `"lat":5`, `"lat":91`},
		{"null for a number", `"lat":5`, `"lat":null`},
		{"text for a number", `"lon":55`, `"lon":"55"`},
		{"an empty name", `"name":"Farland"`, `"name":""`},
		{"a short checksum", `"sha256":"0`, `"sha256":"`},
	} {
		t.Run(c.name, func(t *testing.T) {
			bad := strings.Replace(good, c.from, c.to, 1)
			if bad == good {
				t.Fatalf("the answer has no %s", c.from)
			}
			v, err := jsonschema.UnmarshalJSON(strings.NewReader(bad))
			if err != nil {
				t.Fatal(err)
			}
			if s.Validate(v) == nil {
				t.Errorf("the schema lets it pass: %s", bad)
			}
		})
	}
}
