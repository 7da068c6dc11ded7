package api

import (
	"flag"
	"net/http"
	"os"
	"path/filepath"
	"testing"
)

var update = flag.Bool("update", false, "write the golden files anew")

// golden compares a body with a file below testdata.
func golden(t *testing.T, name string, got []byte) {
	t.Helper()
	path := filepath.Join("testdata", name)
	if *update {
		if err := os.MkdirAll("testdata", 0o755); err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(path, got, 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	if string(got) != string(want) {
		t.Errorf("%s differs (write it anew with -update)\n got: %s\nwant: %s", path, got, want)
	}
}

// TestGoldens compares whole bodies, on the made-up model, with those kept: a
// change of any of them is a change of what callers see.
func TestGoldens(t *testing.T) {
	const batch = "/v1/annotate"
	r := newRig(t)
	for _, c := range []struct {
		name, method, target, contentType, body string
		status                                  int
	}{
		{"point_forearc.json", "GET", "/v1/point?lon=61&lat=5&depth_km=25&uncertainty_km=4&age_ma=12", "", "", 200},
		{"point_slab.json", "GET", "/v1/point?lon=62.2&lat=-5&depth_km=100", "", "", 200},
		{"point_interior.json", "GET", "/v1/point?lon=-90&lat=20", "", "", 200},
		{"point_on_the_line.json", "GET", "/v1/point?lon=0&lat=0", "", "", 200},
		{"point_no_motion.json", "GET", "/v1/point?lon=62&lat=5&motion=partial", "", "", 200},
		{"point_pole.json", "GET", "/v1/point?lon=77&lat=90", "", "", 200},
		{"boundaries_dateline.geojson", "GET", "/v1/boundaries?bbox=175,-10,-175,10", "", "", 200},
		{"plates.json", "GET", "/v1/plates", "", "", 200},
		{"models.json", "GET", "/v1/models", "", "", 200},
		{"readyz.json", "GET", "/readyz", "", "", 200},
		{"annotate.csv", "POST", batch, "text/csv", "id,lon,lat\n007,61,5\nx,,\n008,400,5\n\"a \"\"b\"\"\",-90,20\n", 200},
		{"annotate.ndjson", "POST", batch, "application/x-ndjson", "{\"lon\":61.0,\"lat\":5e0}\nnot json\n", 200},
		{"annotate.geojson", "POST", batch, "application/geo+json", `{"type":"FeatureCollection","name":"n","features":[{"type":"Feature","properties":null,"geometry":{"type":"Point","coordinates":[61,5]}}],"after":[1.0]}`, 200},
		{"problem_query.json", "GET", "/v1/point?lon=7,5&depth=3", "", "", 400},
		{"problem_range.json", "GET", "/v1/point?lon=-36&lat=-172", "", "", 400},
		{"problem_table.json", "POST", batch, "text/csv", "id,x,y\n1,2,3\n", 400},
		{"problem_collection.json", "POST", batch, "application/geo+json", `{"type":"Point"}`, 400},
		{"problem_path.json", "GET", "/nope", "", "", 404},
		{"problem_model.json", "GET", "/v1/models/mine", "", "", 404},
		{"problem_method.json", "GET", batch, "", "", 405},
		{"problem_type.json", "POST", batch, "image/png", "x", 415},
	} {
		t.Run(c.name, func(t *testing.T) {
			w := r.ask(c.method, c.target, c.contentType, c.body)
			if w.Code != c.status {
				t.Errorf("status %d, want %d", w.Code, c.status)
			}
			golden(t, c.name, w.Body.Bytes())
		})
	}
}

// TestPointIsTheSameTwice: answers are a function of the request alone.
func TestPointIsTheSameTwice(t *testing.T) {
	a, b := newRig(t), newRig(t)
	for _, target := range []string{"/v1/point?lon=61&lat=5", "/v1/point?lon=180&lat=-90", "/v1/boundaries", "/v1/plates"} {
		first := a.ask(http.MethodGet, target, "", "").Body.String()
		if again := a.get(target).Body.String(); again != first {
			t.Errorf("%s: asked again: %s", target, again)
		}
		if other := b.get(target).Body.String(); other != first {
			t.Errorf("%s: asked elsewhere: %s", target, other)
		}
	}
}
