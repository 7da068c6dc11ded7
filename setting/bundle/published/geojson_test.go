package published

import (
	"strings"
	"testing"

	"nearmargin/setting/boundary"
)

const smallMapping = "id=NR,name=LABEL,type=KIND,left_plate=L,right_plate=R,subducting_plate=DOWN,sigma_km=S,source='invented',type:SPREAD=spreading_ridge"

func TestReadGeoJSON(t *testing.T) {
	m, err := ParseMapping(smallMapping)
	if err != nil {
		t.Fatal(err)
	}
	list, tally, err := ReadGeoJSON("dir/boundaries.geojson", strings.NewReader(slurp(t, "boundaries.geojson")), m, BirdCodes())
	if err != nil || tally.Read != 3 || tally.Rejected != 0 || len(list) != 3 {
		t.Fatalf("%+v, %v", tally, err)
	}
	for i, want := range []struct {
		id, name, left, right, sinks string
		kind                         boundary.Type
		sigma                        float64
	}{
		{"1", "Zero Ridge", "NU", "BB", "", boundary.SpreadingRidge, 10},
		{"2", "East Belt", "PA", "NU", "", boundary.ContinentalConvergent, 40},
		{"3", "West Trench", "BB", "PA", "PA", boundary.Subduction, 7.5},
	} {
		b := list[i]
		if b.ID() != want.id || b.Name() != want.name || b.Left() != want.left || b.Right() != want.right || b.Subducting() != want.sinks || b.Type() != want.kind || b.SigmaKm() != want.sigma || b.Source() != "invented" || len(b.Path()) != 4 {
			t.Errorf("%+v, want %+v", b, want)
		}
	}
}

func TestReadGeoJSONNamesWhatIsWrong(t *testing.T) {
	m, err := ParseMapping("")
	if err != nil {
		t.Fatal(err)
	}
	const good = `{"type":"Feature","properties":{"type":"OSR","left_plate":"AA","right_plate":"BB"},"geometry":{"type":"LineString","coordinates":[[0,0],[1,1]]}}`
	wrap := func(f string) string {
		return "{\"type\":\"FeatureCollection\",\"features\":[\n" + good + ",\n\n" + f + "\n]}"
	}
	for _, c := range []struct{ name, text, reject, err string }{
		{"two boundaries of two parts", wrap(strings.Replace(good, `"LineString","coordinates":[[0,0],[1,1]]`, `"MultiLineString","coordinates":[[[0,0],[1,1]],[[2,2],[3,3]]]`, 1)), "", ""},
		{"no geometry", wrap(`{"type":"Feature","properties":{},"geometry":null}`), "feature 2: it has no geometry", ""},
		{"a point", wrap(strings.Replace(good, "LineString", "Point", 1)), `geometry is "Point"`, ""},
		{"no type", wrap(strings.Replace(good, `"type":"OSR",`, "", 1)), `property "type", for type, is missing`, ""},
		{"an unknown type", wrap(strings.Replace(good, "OSR", "ridge", 1)), "type:ridge=TYPE", ""},
		{"a plate's code", wrap(strings.Replace(good, `"AA"`, `"Alpha"`, 1)), `plate "Alpha"`, ""},
		{"the other plate goes down", wrap(strings.Replace(good, `"AA"`, `"AA","subducting_plate":"CC"`, 1)), `subducting_plate "CC"`, ""},
		{"a position", wrap(strings.Replace(good, "[1,1]", "[1]", 1)), "a position has 1 numbers", ""},
		{"a latitude", wrap(strings.Replace(good, "[1,1]", "[1,91]", 1)), "is not a longitude", ""},
		{"no line", wrap(strings.Replace(good, "[1,1]", "[0,0]", 1)), "has 1 vertices", ""},
		{"an empty geometry", wrap(strings.Replace(good, `"LineString","coordinates":[[0,0],[1,1]]`, `"MultiLineString","coordinates":[]`, 1)), "its geometry is empty", ""},
		{"sigma", wrap(strings.Replace(good, `"AA"`, `"AA","sigma_km":"wide"`, 1)), `sigma_km is "wide"`, ""},
		{"an id twice", strings.ReplaceAll(wrap(good), `"AA"`, `"AA","id":"x y"`), `id "x-y" stands in line 2 already`, ""},
		{"no JSON", "hello", "", "does not begin with {"},
		{"no features", `{"type":"Feature"}`, "", `has no "features"`},
		{"features of another form", `{"features":{}}`, "", "is no array"},
		{"cut off", wrap(good)[:80], "", "EOF"},
		{"cut off at its end", strings.TrimSuffix(wrap(good), "}"), "", "does not end"},
	} {
		list, tally, err := ReadGeoJSON("f", strings.NewReader(c.text), m, nil)
		switch {
		case c.err != "":
			if err == nil || !strings.Contains(err.Error(), c.err) {
				t.Errorf("%s: error %v, want %q", c.name, err, c.err)
			}
		case c.reject != "":
			if err != nil || tally.Read != 1 || len(list) != 1 || tally.Rejected != 1 || !strings.Contains(tally.Rejects[0].Reason, c.reject) || tally.Rejects[0].Line != 4 {
				t.Errorf("%s: %+v, %v; want %q in line 4", c.name, tally, err, c.reject)
			}
		case err != nil || len(list) != 3 || list[1].ID() != "boundary-2-1" || list[2].ID() != "boundary-2-2":
			t.Errorf("%s: %d boundaries, %+v, %v", c.name, len(list), tally, err)
		}
	}
}

func TestParseMappingRefuses(t *testing.T) {
	for _, c := range []struct{ text, want string }{
		{"name", "want field=PROPERTY"},
		{"name=", "want field=PROPERTY"},
		{"colour=C", `there is no field "colour"`},
		{"name=A,name=B", "stands twice"},
		{"type:R=ridge", `boundary type "ridge" is unknown`},
		{"source='a", "the closing '"},
	} {
		if _, err := ParseMapping(c.text); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%q: error %v, want %q", c.text, err, c.want)
		}
	}
}
