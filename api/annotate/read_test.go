package annotate

import (
	"bytes"
	"context"
	"math"
	"strings"
	"testing"

	"nearmargin/api/internal/testmodel"
	"nearmargin/setting"
)

// TestReadWhatRunWrites annotates the same three sites in each format and reads the
// answers back.
func TestReadWhatRunWrites(t *testing.T) {
	l, err := testmodel.New(t).Lookup(setting.Options{})
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct {
		name   string
		format Format
		in     string
	}{
		{"commas", CSV, "id,lon,lat\ns1,61,5\ns2,,\ns3,-90,20\n"},
		{"semicolons and decimal commas", CSV, "id;lon;lat\ns1;61,0;5,0\ns2;;\ns3;-90;20\n"},
		{"lines", NDJSON, `{"id":"s1","lon":61,"lat":5}` + "\n" + `{"id":"s2"}` + "\n" + `{"id":"s3","lon":-90,"lat":20}` + "\n"},
		{"features", GeoJSON, `{"type":"FeatureCollection","features":[
			{"type":"Feature","id":"s1","properties":null,"geometry":{"type":"Point","coordinates":[61,5]}},
			{"type":"Feature","id":"s2","properties":null,"geometry":null},
			{"type":"Feature","id":"s3","properties":{"p":1},"geometry":{"type":"Point","coordinates":[-90,20]}}],"features2":[]}`},
	} {
		t.Run(c.name, func(t *testing.T) {
			var out bytes.Buffer
			if _, err := Run(context.Background(), strings.NewReader(c.in), &out, c.format, Options{Lookup: l}); err != nil {
				t.Fatal(err)
			}
			var rows []Row
			if err := Read(&out, c.format, ReadOptions{}, func(r Row) error { rows = append(rows, r); return nil }); err != nil {
				t.Fatal(err)
			}
			if len(rows) != 3 {
				t.Fatalf("%d rows: %+v", len(rows), rows)
			}
			r := rows[0]
			if r.Number != 1 || r.Name != "s1" || r.Lon != 61 || r.Lat != 5 || r.Label != "forearc" || r.Family != "subduction" || r.Confidence == "" || r.Reason == "" ||
				r.BoundaryType != "subduction" || !(r.DistanceKm > 100 && r.DistanceKm < 120) || r.Model != "made-up@7" || r.Error != "" {
				t.Errorf("row 1 is %+v", r)
			}
			if r := rows[1]; r.Name != "s2" || r.Label != "" || r.Error == "" || !math.IsNaN(r.Lon) {
				t.Errorf("row 2 is %+v", r)
			}
			if r := rows[2]; r.Number != 3 || r.Label != "plate_interior" || r.Lon != -90 {
				t.Errorf("row 3 is %+v", r)
			}
		})
	}
}

func TestReadRefuses(t *testing.T) {
	for _, c := range []struct {
		name   string
		format Format
		in     string
		want   string
	}{
		{"table without answers", CSV, "lon,lat\n1,2\n", "no column ts_setting"},
		{"lines without answers", NDJSON, "{\"lon\":1}\n", "no member tectonic"},
		{"features without answers", GeoJSON, `{"type":"Feature","properties":{}}`, "no property tectonic"},
		{"not JSON", GeoJSON, "lon,lat", "not JSON"},
		{"an array", GeoJSON, "[]", "not a JSON object"},
		{"cut short", GeoJSON, `{"type":"FeatureCollection","features":[{"properties":{"tectonic_error":"x"}},`, "not JSON, near byte 7"},
		{"nothing", GeoJSON, "", "not JSON, near byte 0: unexpected EOF"},
		{"features that are none", GeoJSON, `{"features":{}}`, "features must be an array"},
		{"more after the end", GeoJSON, `{"features":[]} {}`, "something follows"},
		{"a line too long", NDJSON, `{"tectonic_error":"` + strings.Repeat("x", 2<<20) + `"}`, "line 1: longer than"},
		{"a line that is not JSON", NDJSON, "{}\nx\n", "line 2"},
		{"no coordinates", CSV, "a,ts_setting\n1,trench\n", "no column for longitude"},
		{"array", JSON, "[]", "want csv, ndjson or geojson"},
	} {
		t.Run(c.name, func(t *testing.T) {
			err := Read(strings.NewReader(c.in), c.format, ReadOptions{}, func(Row) error { return nil })
			if err == nil || !strings.Contains(err.Error(), c.want) {
				t.Errorf("%v, want %q in it", err, c.want)
			}
		})
	}
}
