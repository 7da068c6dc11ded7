package bundle

import (
	"errors"
	"strings"
	"testing"
)

// deliberate is a fault put into one file of the small model.
type deliberate struct {
	name      string
	file      string
	old, with string // old "" replaces the whole file
	line      int    // where the error must point; 0 for files without lines
	want      string
}

func checkFaults(t *testing.T, dir string, list []deliberate) {
	t.Helper()
	for _, c := range list {
		t.Run(c.name, func(t *testing.T) {
			_, err := Read(changed(t, dir, c.file, c.old, c.with))
			var fe *FileError
			if !errors.As(err, &fe) {
				t.Fatalf("error %v, want a *FileError", err)
			}
			if fe.File != c.file || fe.Line != c.line || !strings.Contains(err.Error(), c.want) {
				t.Errorf("%s:%d: %q; want %s:%d and %q", fe.File, fe.Line, err, c.file, c.line, c.want)
			}
		})
	}
}

func TestFaultsOfTheWrittenForm(t *testing.T) {
	const a, b = "boundaries/a.txt", "boundaries/b.txt"
	checkFaults(t, "testdata/written", []deliberate{
		{"node without a position", a, "node east 90 0 East triple junction", "node east 90", 3, `want "node NAME LON LAT TITLE"`},
		{"node's name in capitals", a, "node east", "node East", 3, "in lower case with hyphens"},
		{"node's longitude no number", a, "node east 90", "node east 9O", 3, `"9O" "0" is not a longitude and a latitude`},
		{"node off the globe", a, "node east 90 0", "node east 90 90.5", 3, "node east: latitude 90.5 is out of range -90 to 90"},
		{"node twice", b, "line back", "node east 1 2\nline back", 1, "node east stands already at boundaries/a.txt:3"},
		{"node unused", a, "node west", "node lost 1 2\nnode west", 4, "no line ends at node lost"},
		{"node unknown", b, "@west", "@wset", 13, "there is no node wset"},
		{"node inside a line", b, "135 -1", "@west", 9, "node west stands inside line back"},
		{"line without an id", b, "line back", "line", 1, `want "line ID"`},
		{"line's id in capitals", b, "line back", "line Back", 1, `not "line Back"`},
		{"line twice", b, "line south", "line front", 15, "line front stands already at boundaries/a.txt:6"},
		{"line of one vertex", b, "@east rift\n90 -60\n170 -85\n-90 -60\n@west", "@east rift", 15, "line south has 1 vertices; at least 2 are needed"},
		{"line from nowhere", b, "@east rift", "89 0 rift", 21, "line south must start and end at a node"},
		{"line to nowhere", b, "-90 -60\n@west", "-90 -60", 24, "line south must start and end at a node"},
		{"first vertex without a kind", b, "@east rift", "@east", 21, "needs a kind: collision, convergence, fault, ridge, rift, transform, trench"},
		{"kind unknown", a, "1 trench", "1 trensh", 17, `"trensh" is no kind of leg; the kinds are collision`},
		{"kind of a node unknown", b, "@east rift", "@east reef", 21, `"reef" is no kind of leg`},
		{"vertex of one number", a, "30 2.125", "30", 18, `want "LON LAT [KIND [NAME]]"`},
		{"vertex of a word", a, "30 2.125", "30 north", 18, `"30" "north" is not`},
		{"longitude out of range", a, "30 2.125", "230 2.125", 18, "longitude 230 is out of range -180 to 180"},
		{"latitude not a number", a, "30 2.125", "30 nan", 18, "latitude NaN is out of range"},
		{"vertex before any line", a, "# The equator", "1 2\n# The equator", 1, `"1 2" stands before the first line or node`},
		{"header unknown", a, "subducts BB", "sinks BB", 9, `"sinks" is unknown here; want name, plates, subducts`},
		{"header without a value", a, "subducts BB", "subducts # BB", 9, "subducts has no value"},
		{"one plate", a, "plates AA BB", "plates AA", 8, `want "plates LEFT RIGHT", not "AA"`},
		{"σ no number", a, "sigma_km 12", "sigma_km twelve", 10, `want "sigma_km [KIND] NUMBER", not "twelve"`},
		{"σ of an unknown kind", a, "sigma_km transform 15", "sigma_km transfrom 15", 11, `"transfrom" is no kind of leg`},
		{"σ of three words", a, "sigma_km transform 15", "sigma_km transform 15 16", 11, `want "sigma_km [KIND] NUMBER"`},
		{"no σ", b, "sigma_km 30\n", "", 15, "sigma_km is 0; it must be more than 0"},
		{"no name", b, "name South\n", "", 15, `boundary "south": name is empty`},
		{"status unknown", b, "consulted", "hearsay", 1, `source_status is "hearsay"`},
		{"trench without a lower plate", a, "subducts BB\n", "", 6, "type subduction needs a subducting_plate"},
		{"lower plate is neither", a, "subducts BB", "subducts CC", 6, `subducting_plate "CC" is neither`},
		{"vertex twice", a, "60 1 collision", "30 2.125\n60 1 collision", 6, "vertices 2 and 3 (30, 2.125) coincide"},
		{"another encoding", a, "Front fracture zone", "Fr\xf6nt", 15, "not valid UTF-8"},
		{"a control character", a, "Front fracture zone", "Fr\x00nt", 15, "holds a control character"},
	})
}

func TestFaultsOfTables(t *testing.T) {
	const plates, hotspots = "plates.csv", "hotspots.csv"
	checkFaults(t, "testdata/written", []deliberate{
		{"empty file", plates, "", "", 1, "the file is empty"},
		{"columns in another order", plates, "code,name", "name,code", 1, "the columns are name,code; they must start with code,name"},
		{"a column missing", plates, "", "code\nAA\n", 1, "they must start with code,name"},
		{"a column too many", plates, "", "code,name,colour\nAA,Ay,red\n", 1, `column "colour" is unknown`},
		{"a field too many", plates, "AA,Ay", "AA,Ay,1", 3, "wrong number of fields"},
		{"a quote left open", plates, "AA,Ay", `AA,"Ay`, 3, `"`},
		{"code in lower case", plates, "AA,Ay", "aa,Ay", 3, `code "aa" must be two upper-case letters`},
		{"code of two blanks", plates, "AA,Ay", "  ,Ay", 3, `code "  " must be`},
		{"code of digits", plates, "AA,Ay", "12,Ay", 3, `code "12" must be`},
		{"code of three letters", plates, "AA,Ay", "AAA,Ay", 3, `code "AAA" must be`},
		{"plate without a name", plates, "AA,Ay", "AA,", 3, "plate AA has no name"},
		{"the line counts empty lines", plates, "CC,\"Cee, the wide one\"\nAA,Ay", "CC,Cee\n\n\nAA,", 5, "plate AA has no name"},
		{"a line break in a name", plates, "Cee, the", "Cee,\nthe", 2, "holds a line break"},
		{"another encoding", plates, "Ay", "A\xff", 0, "not valid UTF-8"},
		{"hotspot's longitude no number", hotspots, "-179.5", "west", 2, `lon is "west"; it must be a number`},
		{"hotspot at infinity", hotspots, "-179.5", "-Inf", 2, `lon is "-Inf"; it must be a number`},
		{"hotspot off the globe", hotspots, "-179.5", "-190", 2, "longitude -190 is out of range -180 to 180"},
		{"hotspot without a name", hotspots, "Plume", "", 2, "needs a name and a source"},
		{"hotspot without a source", hotspots, "made up", "", 2, "needs a name and a source"},
	})
	const junctions = "junctions.csv"
	checkFaults(t, "testdata/geojson", []deliberate{
		{"junction off the globe", junctions, "90,0\n", "90,99\n", 2, "latitude 99 is out of range"},
		{"junction without a name", junctions, "East triple junction", "", 3, "the junction at 90, 0 has no name"},
		{"junction twice", junctions, "East triple junction,90", "East triple junction,-90", 3, `named already: "Ay-Bee-Cee, the wide one triple junction"`},
		{"junction's columns", junctions, "name,lon,lat", "name,lat,lon", 1, "they must start with name,lon,lat"},
	})
}

func TestFaultsOfMotionTables(t *testing.T) {
	const poles, cartesian, covariance = "motion/poles.csv", "motion/cartesian.csv", "motion/covariance.csv"
	checkFaults(t, "testdata/written", []deliberate{
		{"unknown columns", poles, "lat_deg,lon_deg", "lon_deg,lat_deg", 1, "the columns are [plate lon_deg lat_deg"},
		{"latitude no number", poles, "-30.5", "south", 3, `lat_deg is "south"; it must be a number`},
		{"latitude out of range", poles, "-30.5", "-93", 3, "lat_deg -93 and lon_deg 120 are no position"},
		{"longitude out of range", poles, "200", "400", 4, "lat_deg 10 and lon_deg 400 are no position"},
		{"σ no number", poles, "0.02", "?", 3, `rate_sigma_deg_myr is "?"`},
		{"σ below 0", poles, "0.02", "-0.02", 3, "rate σ -0.02 must be 0 or more"},
		{"σ of a rate of 0", poles, "AA,90,0,0,,", "AA,90,0,0,0.1,", 2, "the rate 0 more than 0"},
		{"plate twice", poles, "BB,", "AA,", 0, `plate "AA" stands twice`},
		{"no basis", poles, "composed:BB", "", 0, `plate "CC": basis "" must be`},
		{"anchor unknown", poles, "composed:BB", "composed:DD", 0, `plate "CC" is composed on "DD"`},
		{"faster than any plate", poles, "0.75", "750", 0, `plate "BB" turns at`},
		{"component no number", cartesian, "-1.1", "NaN", 3, `wx_mas_yr is "NaN"`},
		{"component σ below 0", cartesian, "0.02", "-0.02", 3, "must be 0 or more"},
		{"variance below 0", covariance, "4e-4", "-4e-4", 2, "diagonal element 1"},
		{"covariance no number", covariance, "1e-4", "", 2, `cxy is ""; it must be a number`},
		{"empty file", covariance, "", "", 1, "the file is empty"},
	})
}

func TestFaultsOfFeatures(t *testing.T) {
	const file = "boundaries.geojson"
	feature := func(properties, kind, coordinates string) string {
		return `{"type":"FeatureCollection","features":[{"type":"Feature","properties":` + properties + `,"geometry":{"type":"` + kind + `","coordinates":` + coordinates + `}}]}`
	}
	const good = `{"id":"a","name":"A","type":"spreading_ridge","left_plate":"AA","right_plate":"BB","subducting_plate":null,"sigma_km":1,"source":"s","source_status":"memory"}`
	const line = `[[0,0],[1,1]]`
	checkFaults(t, "testdata/geojson", []deliberate{
		{"no JSON", file, "", "{", 0, "unexpected EOF"},
		{"empty file", file, "", "", 0, "EOF"},
		{"something after the value", file, "", feature(good, "LineString", line) + "x", 0, "something follows the JSON value"},
		{"another encoding", file, "", "\xff", 0, "not valid UTF-8"},
		{"a single feature", file, "", `{"type":"Feature","features":[]}`, 0, `type is "Feature"; it must be "FeatureCollection"`},
		{"no features", file, "", `{"type":"FeatureCollection","features":[{"type":"Point"}]}`, 0, `features[0]: type is "Point"; it must be "Feature"`},
		{"unknown member", file, `"sigma_km"`, `"sigma"`, 0, `unknown field "sigma"`},
		{"unknown type", file, `"continental_rift"`, `"rift"`, 0, `features[0] (id "south"): boundary type "rift" is unknown; the types are [subduction`},
		{"geometry of points", file, "", feature(good, "MultiPoint", line), 0, `features[0] (id "a"): geometry is "MultiPoint"; it must be LineString`},
		{"no coordinates", file, "", feature(good, "LineString", "null"), 0, "has 0 positions"},
		{"coordinates no list", file, "", feature(good, "LineString", `"x"`), 0, "cannot unmarshal"},
		{"a position of one number", file, "", feature(good, "LineString", `[[0,0],[1]]`), 0, "a position has 1 numbers"},
		{"longitude out of range", file, "", feature(good, "LineString", `[[0,0],[181,0]]`), 0, "longitude 181 is out of range -180 to 180"},
		{"no parts", file, "", feature(good, "MultiLineString", `[]`), 0, "has 0 vertices"},
		{"an empty part", file, "", feature(good, "MultiLineString", `[[],[[180,0],[179,0]]]`), 0, "part 1 has 0 positions; a line has at least 2"},
		{"a part of one position", file, "", feature(good, "MultiLineString", `[[[179,0],[180,0]],[[-180,0]]]`), 0, "part 2 has 1 positions"},
		{"parts that do not join", file, "", feature(good, "MultiLineString", `[[[0,0],[1,1]],[[1,1],[2,2]]]`), 0, "the parts of a MultiLineString must join at ±180°"},
		{"parts that join at another latitude", file, "", feature(good, "MultiLineString", `[[[179,0],[180,1]],[[-180,2],[-179,2]]]`), 0, "must join at ±180°, where the one before ends at [180 1]"},
		{"parts on the same edge", file, "", feature(good, "MultiLineString", `[[[179,0],[180,1]],[[180,1],[179,2]]]`), 0, "must join at ±180°"},
		{"vertices coincide", file, "", feature(good, "LineString", `[[0,0],[0,0]]`), 0, "coincide"},
		{"no id", file, `"id": "south"`, `"id": ""`, 0, "id is empty"},
	})
	const zones = "zones.geojson"
	checkFaults(t, "testdata/written", []deliberate{
		{"zone of a line", zones, `"Polygon"`, `"LineString"`, 0, `features[0]: zone "Belt": geometry is "LineString"; it must be Polygon`},
		{"zone's kind unknown", zones, `"mixed"`, `"mixture"`, 0, `zone kind "mixture" is unknown; the kinds are [collision`},
		{"zone without a name", zones, `"Belt"`, `""`, 0, "name is empty"},
		{"zone without a source", zones, `"made up"`, `""`, 0, "source is empty"},
		{"zone's ring open", zones, `,[170,-10]]`, `]`, 0, "is not closed"},
		{"zone's ring too short", zones, `,[179,1],[178,-1]]`, `,[178,-1]]`, 0, "has 3 positions"},
		{"zone without rings", zones, "", `{"type":"FeatureCollection","features":[{"type":"Feature","properties":{"name":"a","kind":"mixed","source":"s"},"geometry":{"type":"Polygon","coordinates":[]}}]}`, 0, "needs a ring"},
		{"zone off the globe", zones, "[179,1]", "[179,91]", 0, "latitude 91 is out of range"},
		{"zone's position of one number", zones, "[179,1]", "[179]", 0, "a position has 1 numbers"},
		{"unknown member", zones, `"kind"`, `"sort"`, 0, `unknown field "sort"`},
	})
}

func TestFaultsOfTheModelFile(t *testing.T) {
	const file = "model.json"
	checkFaults(t, "testdata/written", []deliberate{
		{"unknown member", file, `"licence"`, `"license"`, 0, `unknown field "license"`},
		{"no JSON", file, "", "", 0, "EOF"},
		{"name that leaves the directory", file, `"name": "poles"`, `"name": "../poles"`, 0, `motion model name "../poles" must be lower-case`},
	})
	for _, c := range []struct{ dir, file string }{
		{"testdata/written", "model.json"}, {"testdata/written", "plates.csv"}, {"testdata/written", "motion/poles.csv"}, {"testdata/geojson", "boundaries.geojson"},
	} {
		dir := changed(t, c.dir, "", "", "")
		delete(dir, c.file)
		_, err := Read(dir)
		var fe *FileError
		if !errors.As(err, &fe) || fe.File != c.file || fe.Detail != "the file is missing" {
			t.Errorf("without %s: %v, want that the file is missing", c.file, err)
		}
	}
	_, err := Read(changed(t, "testdata/written", "boundaries.geojson", "", `{"type":"FeatureCollection","features":[]}`))
	if err == nil || !strings.Contains(err.Error(), "boundaries.geojson: stands beside boundaries/*.txt; a model has one or the other") {
		t.Errorf("both forms: %v", err)
	}
}

// Faults that no one file has: the parts do not fit together.
func TestPartsThatDoNotFit(t *testing.T) {
	for _, c := range []deliberate{
		{name: "no id", file: "model.json", old: `"small"`, with: `""`, want: `model id "" must be given`},
		{name: "id with a blank", file: "model.json", old: `"small"`, with: `"a b"`, want: `model id "a b"`},
		{name: "edition with @", file: "model.json", old: `"1.0"`, with: `"1@0"`, want: `model edition "1@0"`},
		{name: "plate twice", file: "plates.csv", old: "BB,", with: "AA,", want: `plate "AA" stands twice`},
		{name: "plate missing", file: "plates.csv", old: "BB,Bee\n", with: "", want: `plate "BB" bounds something and is not in the table of plates`},
		{name: "default motion missing", file: "model.json", old: `"default_motion": "poles"`, with: `"default_motion": "pole"`, want: `the default motion model "pole" is not among the model's: cartesian, covariance, poles`},
		{name: "motion model twice", file: "model.json", old: `"name": "cartesian"`, with: `"name": "poles"`, want: `motion model "poles" stands twice`},
		{name: "plate of a motion unknown", file: "motion/covariance.csv", old: "AA,", with: "DD,", want: `motion model "covariance": plate "DD" is not in the table of plates`},
	} {
		_, err := Read(changed(t, "testdata/written", c.file, c.old, c.with))
		if err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: error %v, want one that says %q", c.name, err, c.want)
		}
	}
}
