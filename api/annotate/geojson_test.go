package annotate

import (
	"encoding/json"
	"fmt"
	"strings"
	"testing"

	"github.com/tidwall/gjson"
)

// TestFeatures: features as people have them, each alone and in a collection.
func TestFeatures(t *testing.T) {
	point := func(coordinates string) string {
		return `"geometry":{"type":"Point","coordinates":` + coordinates + `}`
	}
	for _, c := range []expectation{
		{name: "plain", in: `{"type":"Feature","properties":{"n":1.50},` + point("[61, 5.0]") + `}`, plate: "GG",
			raw: map[string]string{"properties.n": "1.50", "geometry.coordinates": "[61, 5.0]"}},
		{name: "foreign members", in: `{"id":"007","bbox":[1.0],"type":"Feature",` + point("[61,5]") + `,"properties":{},"x":{"y":1e2}}`, plate: "GG",
			raw: map[string]string{"id": `"007"`, "bbox": "[1.0]", "x.y": "1e2"}},
		{name: "properties null", in: `{"type":"Feature","properties":null,` + point("[61,5]") + `}`, plate: "GG"},
		{name: "properties missing", in: `{"type":"Feature",` + point("[61,5]") + `}`, plate: "GG"},
		{name: "an earlier answer", in: `{"type":"Feature","properties":{"tectonic":{"old":1},"tectonic_error":"old","a":1},` + point("[61,5]") + `}`, plate: "GG",
			raw: map[string]string{"properties.tectonic.old": "", "properties.a": "1"}},
		{name: "third coordinate not asked for", in: `{"type":"Feature",` + point("[62,-5,100]") + `}`, plate: "GG",
			raw: map[string]string{"geometry.coordinates": "[62,-5,100]", "properties.tectonic.site.depth_km": "null"}},
		{name: "third coordinate", in: `{"type":"Feature",` + point("[62,-5,100]") + `}`, o: Options{DepthColumn: ThirdCoordinate}, plate: "GG",
			raw: map[string]string{"properties.tectonic.site.depth_km": "100"}},
		{name: "third coordinate missing", in: `{"type":"Feature",` + point("[62,-5]") + `}`, o: Options{DepthColumn: ThirdCoordinate}, plate: "GG",
			raw: map[string]string{"properties.tectonic.site.depth_km": "null"}},
		{name: "third coordinate null", in: `{"type":"Feature",` + point("[62,-5,null]") + `}`, o: Options{DepthColumn: ThirdCoordinate}, plate: "GG",
			raw: map[string]string{"properties.tectonic.site.depth_km": "null"}},
		{name: "third coordinate of another kind", in: `{"type":"Feature",` + point("[62,-5,[1]]") + `}`, o: Options{DepthColumn: ThirdCoordinate}, fault: "depth:"},
		{name: "third coordinate out of range", in: `{"type":"Feature",` + point("[62,-5,5000]") + `}`, o: Options{DepthColumn: ThirdCoordinate}, fault: "depth_km: 5000"},
		{name: "depth among the properties", in: `{"type":"Feature","properties":{"d":"12.5"},` + point("[62,-5]") + `}`, o: Options{DepthColumn: "d"}, plate: "GG",
			raw: map[string]string{"properties.tectonic.site.depth_km": "12.5"}},
		{name: "geometry null", in: `{"type":"Feature","properties":{"a":1},"geometry":null}`, fault: "geometry is null; it must be a Point",
			raw: map[string]string{"geometry": "null", "properties.a": "1"}},
		{name: "no geometry", in: `{"type":"Feature","properties":{}}`, fault: "geometry is missing"},
		{name: "a line", in: `{"type":"Feature","properties":{},"geometry":{"type":"LineString","coordinates":[[1,2],[3,4]]}}`, fault: `geometry is "LineString"; only a Point`},
		{name: "one coordinate", in: `{"type":"Feature",` + point("[61]") + `}`, fault: "at least two numbers"},
		{name: "text for coordinates", in: `{"type":"Feature",` + point(`["61","5"]`) + `}`, fault: "at least two numbers"},
		{name: "no coordinates", in: `{"type":"Feature","geometry":{"type":"Point"}}`, fault: "at least two numbers"},
		{name: "swapped", in: `{"type":"Feature",` + point("[-36,-172]") + `}`, fault: "swapped?"},
	} {
		t.Run(c.name, func(t *testing.T) {
			out, st, err := run(t, GeoJSON, c.in, c.o)
			if err != nil || st.Rows != 1 || (st.Errors == 1) != (c.fault != "") {
				t.Fatalf("%v, %+v", err, st)
			}
			c.check(t, out, "properties.")
			out, st, err = run(t, GeoJSON, `{"features":[`+c.in+","+c.in+`],"type":"FeatureCollection"}`, c.o)
			if err != nil || st.Rows != 2 || gjson.Get(out, "features.#").Int() != 2 {
				t.Fatalf("%v, %+v: %s", err, st, out)
			}
			for i := range 2 {
				c.check(t, gjson.Get(out, fmt.Sprintf("features.%d", i)).Raw, "properties.")
			}
		})
	}
}

// TestCollections: what stands around the features comes back as it was.
func TestCollections(t *testing.T) {
	const feature = `{"type":"Feature","properties":{},"geometry":{"type":"Point","coordinates":[61,5]}}`
	out, st, err := run(t, GeoJSON, `{"name" : "n\u00fc", "crs":{"a":[1.0, 2]}, "type":"FeatureCollection","features":[ `+feature+` , `+feature+` ],"after":1e3,"totals":{"b":null}}`+"\n ", Options{})
	if err != nil || st.Rows != 2 {
		t.Fatalf("%v, %+v", err, st)
	}
	if !json.Valid([]byte(out)) {
		t.Fatalf("not JSON: %s", out)
	}
	for path, want := range map[string]string{"name": `"n\u00fc"`, "crs.a": "[1.0, 2]", "after": "1e3", "totals": `{"b":null}`, "features.#": "2", "features.1.properties.tectonic.plate.code": `"GG"`} {
		if got := gjson.Get(out, path).Raw; got != want {
			t.Errorf("%s is %s, want %s", path, got, want)
		}
	}
	var keys []string
	gjson.Parse(out).ForEach(func(k, _ gjson.Result) bool { keys = append(keys, k.Str); return true })
	if got := strings.Join(keys, " "); got != "name crs type features after totals" {
		t.Errorf("members in the order %s", got)
	}
	for _, in := range []string{`{"type":"FeatureCollection","features":[]}`, `{"features":[],"type":"FeatureCollection"}`} {
		out, st, err := run(t, GeoJSON, in, Options{})
		if err != nil || st.Rows != 0 || out != in {
			t.Errorf("%s becomes %s, %+v, %v", in, out, st, err)
		}
	}
}

// TestCollectionsRefused: faults of the whole.
func TestCollectionsRefused(t *testing.T) {
	for _, c := range []struct {
		name, in string
		want     InputError
	}{
		{"nothing", "", InputError{Line: 1, Detail: "ends too early"}},
		{"text", "lon,lat", InputError{Line: 1, Detail: "not JSON"}},
		{"an array", "[]", InputError{Line: 1, Detail: "not a JSON object"}},
		{"no type", `{"features":[]}`, InputError{Pointer: "/type", Detail: `must be a "FeatureCollection"`}},
		{"another type", `{"type":"Topology"}`, InputError{Pointer: "/type", Detail: `"Topology"`}},
		{"a geometry", `{"type":"Point","coordinates":[1,2]}`, InputError{Pointer: "/type", Detail: `"Feature" of a Point`}},
		{"no features", `{"type":"FeatureCollection"}`, InputError{Pointer: "/type", Detail: "features"}},
		{"features null", `{"type":"FeatureCollection","features":null}`, InputError{Pointer: "/features", Detail: "array"}},
		{"features twice", `{"type":"FeatureCollection","features":[],"features":[]}`, InputError{Pointer: "/features", Detail: "twice"}},
		{"a feature that is text", `{"type":"FeatureCollection","features":["x"]}`, InputError{Pointer: "/features/0", Detail: "object"}},
		{"a type that is a list", `{"type":[],"features":[]}`, InputError{Pointer: "/type", Detail: "must be"}},
		{"trailing bytes", `{"type":"FeatureCollection","features":[]}{}`, InputError{Line: 1, Detail: "follows"}},
		{"trailing text", `{"type":"FeatureCollection","features":[]} nonsense`, InputError{Line: 1, Detail: "byte"}},
		{"no comma", `{"type":"FeatureCollection","features":[{}{}]}`, InputError{Line: 1, Detail: "not JSON"}},
		{"a comma too many", `{"type":"FeatureCollection","features":[{},]}`, InputError{Line: 1, Detail: "not JSON"}},
		{"the wrong bracket", `{"type":"FeatureCollection","features":[{}}`, InputError{Line: 1, Detail: "not JSON"}},
		{"cut within a feature", `{"type":"FeatureCollection","features":[{"type":`, InputError{Line: 1, Detail: "ends too early"}},
		{"cut after a feature", `{"type":"FeatureCollection","features":[{}`, InputError{Line: 1, Detail: "ends too early"}},
		{"cut after the features", `{"type":"FeatureCollection","features":[]`, InputError{Line: 1, Detail: "ends too early"}},
		{"a long member", `{"x":"` + strings.Repeat("x", MaxRowBytes) + `","y":1}`, InputError{Pointer: "/features/0", Detail: "longer than"}},
	} {
		t.Run(c.name, func(t *testing.T) {
			out, _, err := run(t, GeoJSON, c.in, Options{})
			wantFault(t, err, c.want)
			if out != "" {
				t.Errorf("%q was written", out)
			}
		})
	}
}
