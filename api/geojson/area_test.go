package geojson

import (
	"errors"
	"fmt"
	"math"
	"strings"
	"testing"

	"nearmargin/setting"
)

// squareText is the coordinates of a ring two degrees wide.
func squareText(w, s int) string {
	return fmt.Sprintf("[[%d,%d],[%d,%d],[%d,%d],[%d,%d],[%d,%d]]", w, s, w+2, s, w+2, s+2, w, s+2, w, s)
}

func polygonText(coordinates string) string {
	return `{"type":"Polygon","coordinates":` + coordinates + `}`
}

func TestDecodeAreaRefusals(t *testing.T) {
	const form, geometry, large = setting.AreaForm, setting.AreaGeometry, setting.AreaTooLarge
	sq := squareText(0, 0)
	for _, c := range []struct {
		name, text string
		kind       setting.AreaFault
		pointer    string
		says       string
	}{
		{"an array", `[1]`, form, "", "an array"},
		{"a number", `7`, form, "", "a number"},
		{"null", `null`, form, "", "null"},
		{"blank", " \n", form, "", "empty"},
		{"no members", `{}`, form, "", "type is missing"},
		{"type is a number", `{"type":5}`, form, "/type", "a number"},
		{"type twice", `{"type":"Polygon","type":"Polygon","coordinates":[` + sq + `]}`, form, "/type", "2 times"},
		{"a line", `{"type":"LineString","coordinates":[[0,0],[1,1]]}`, form, "/type", "LineString"},
		{"lower case", `{"type":"polygon","coordinates":[` + sq + `]}`, form, "/type", "polygon"},
		{"a collection", `{"type":"FeatureCollection","features":[]}`, form, "/type", "/v1/annotate"},
		{"no coordinates", `{"type":"Polygon"}`, form, "", "coordinates is missing"},
		{"coordinates twice", `{"type":"Polygon","coordinates":[` + sq + `],"coordinates":[]}`, form, "/coordinates", "2 times"},
		{"coordinates null", polygonText("null"), form, "/coordinates", "null"},
		{"coordinates an object", polygonText("{}"), form, "/coordinates", "an object"},
		{"no rings", polygonText("[]"), form, "/coordinates", "empty"},
		{"a number for a ring", polygonText("[" + sq + ",7]"), form, "/coordinates/1", "a number"},
		{"an empty ring", polygonText("[[]]"), form, "/coordinates/0", "0 positions"},
		{"an empty hole", polygonText("[" + sq + ",[]]"), form, "/coordinates/1", "0 positions"},
		{"three positions", polygonText("[[[0,0],[1,1],[0,0]]]"), form, "/coordinates/0", "at least 4"},
		{"not closed", polygonText("[[[0,0],[1,0],[1,1],[0,1]]]"), form, "/coordinates/0/3", "end where it starts"},
		{"a MultiPolygon's depth in a Polygon", polygonText("[[" + sq + "]]"), form, "/coordinates/0/0", "an array; longitude"},
		{"a Polygon's depth in a MultiPolygon", `{"type":"MultiPolygon","coordinates":[` + sq + `]}`, form, "/coordinates/0/0/0", "a number; it must be an array"},
		{"one number", polygonText("[[[0],[1],[2],[0]]]"), form, "/coordinates/0/0", "has 1 numbers"},
		{"no numbers", polygonText("[[[0,0],[],[1,1],[0,0]]]"), form, "/coordinates/0/1", "has 0 numbers"},
		{"words", polygonText(`[[["a","b"],[1,1],[2,2],[0,0]]]`), form, "/coordinates/0/0", "a string"},
		{"null in a position", polygonText(`[[[0,0],[1,null],[2,2],[0,0]]]`), form, "/coordinates/0/1", "null"},
		{"a position that is null", polygonText(`[[[0,0],[1,1],null,[0,0]]]`), form, "/coordinates/0/2", "null"},
		{"height in words", polygonText(`[[[0,0,"high"],[1,1],[2,2],[0,0]]]`), form, "/coordinates/0/0", "number 3"},
		{"a number without end", polygonText(`[[[0,0],[1e999,1],[2,2],[0,0]]]`), form, "/coordinates/0/1", "beyond"},
		{"latitude 100", polygonText(`[[[0,0],[1,0],[0,100],[0,0]]]`), form, "/coordinates/0/2", "-90 to 90"},
		{"longitude 400", polygonText(`[[[0,0],[400,0],[0,10],[0,0]]]`), form, "/coordinates/0/1", "-180 to 360"},
		{"no polygons", `{"type":"MultiPolygon","coordinates":[]}`, form, "/coordinates", "at least one"},
		{"an empty polygon", `{"type":"MultiPolygon","coordinates":[[` + sq + `],[]]}`, form, "/coordinates/1", "empty"},
		{"a position of the second polygon", `{"type":"MultiPolygon","coordinates":[[` + sq + `],[[[10,0],[12,0],[12,95],[10,0]]]]}`, form, "/coordinates/1/0/2", "-90 to 90"},
		{"a feature without geometry", `{"type":"Feature","properties":{}}`, form, "", "geometry is missing"},
		{"a feature of null", `{"type":"Feature","geometry":null}`, form, "/geometry", "null"},
		{"a feature of a point", `{"type":"Feature","geometry":{"type":"Point","coordinates":[1,2]}}`, form, "/geometry/type", "Point"},
		{"a feature of nothing", `{"type":"Feature","geometry":{}}`, form, "/geometry", "type is missing"},
		{"a feature of an open ring", `{"type":"Feature","geometry":` + polygonText("[[[0,0],[1,0],[1,1],[0,1]]]") + `}`, form, "/geometry/coordinates/0/3", "not closed"},
		{"another reference system", `{"type":"Polygon","crs":{"type":"name","properties":{"name":"EPSG:3857"}},"coordinates":[` + sq + `]}`, form, "/crs", "WGS84"},
		{"one place", polygonText("[[[0,0],[0,0],[0,0],[0,0]]]"), geometry, "/coordinates/0", "no area"},
		{"a line there and back", polygonText("[[[0,0],[1,0],[2,0],[0,0]]]"), geometry, "/coordinates/0", "no area"},
		{"a bow-tie", polygonText("[[[0,0],[1,1],[0,1],[1,0],[0,0]]]"), geometry, "/coordinates/0/2", "meets itself"},
		{"a hole outside", polygonText("[" + sq + "," + squareText(10, 0) + "]"), geometry, "/coordinates/1/0", "outside"},
		{"more than a hemisphere", polygonText("[[[0,0],[90,0],[180,0],[-90,0],[0,0]]]"), geometry, "/coordinates/0", "hemisphere"},
		{"overlapping polygons", `{"type":"MultiPolygon","coordinates":[[` + sq + `],[` + squareText(1, 1) + `]]}`, geometry, "/coordinates/1", "overlaps polygon 0"},
		{"a hole of the second polygon", `{"type":"Feature","geometry":{"type":"MultiPolygon","coordinates":[[` + sq + `],[` + squareText(10, 0) + `,` + squareText(20, 0) + `]]}}`, geometry, "/geometry/coordinates/1/1/0", "outside"},
		{"too many positions", polygonText("[[" + strings.Repeat("[1,1],", setting.MaxAreaPositions) + "[1,1]]]"), large, "/coordinates/0/20000", "20000"},
		{"too many rings", polygonText("[" + strings.Repeat("[],", setting.MaxAreaRings) + "[]]"), large, "/coordinates/1000", "1000"},
	} {
		t.Run(c.name, func(t *testing.T) {
			a, err := DecodeArea([]byte(c.text))
			var f *Fault
			if !errors.As(err, &f) {
				t.Fatalf("%v, %v; want a *Fault", a, err)
			}
			if f.Kind != c.kind || f.Pointer != c.pointer || f.Line != 0 || !strings.Contains(f.Detail, c.says) {
				t.Errorf("kind %d at %q: %s\nwant %d at %q, with %q", f.Kind, f.Pointer, f.Detail, c.kind, c.pointer, c.says)
			}
		})
	}
}

// TestDecodeAreaSyntax: text that is no JSON is answered with line and column.
func TestDecodeAreaSyntax(t *testing.T) {
	for _, c := range []struct {
		name, text   string
		line, column int
	}{
		{"a letter", "x", 1, 1},
		{"a comma too many", "{\"type\":\n  \"Polygon\",}", 2, 13},
		{"cut short", "{\"type\":\"Poly", 1, 13},
		{"two documents", "{}\n\n {}", 3, 2},
		{"brackets without end", strings.Repeat("[", 100000), 1, 10001},
		{"NaN", `{"type":"Polygon","coordinates":[[[NaN,0]]]}`, 1, 36},
	} {
		_, err := DecodeArea([]byte(c.text))
		var f *Fault
		if !errors.As(err, &f) {
			t.Fatalf("%s: %v; want a *Fault", c.name, err)
		}
		if f.Line != c.line || f.Column != c.column || f.Kind != setting.AreaForm || f.Detail == "" {
			t.Errorf("%s: line %d, column %d: %s; want %d, %d", c.name, f.Line, f.Column, f.Detail, c.line, c.column)
		}
	}
}

func TestDecodeAreaTakes(t *testing.T) {
	sq := squareText(0, 0)
	const one = 49231.7 // km² of a square of 2° from the equator to 2° north: the zone's 49232.9 less the arc's bulge
	for _, c := range []struct {
		name, text string
		km2        float64
	}{
		{"a polygon", polygonText("[" + sq + "]"), one},
		{"heights and more", polygonText("[[[0,0,1],[2,0,2,3],[2,2],[0,2],[0,0,7]]]"), one},
		{"spaces and unknown members", " {\"bbox\":[0,0,2,2], \"type\" : \"Polygon\",\n\"x\":{\"type\":1}, \"coordinates\":[ " + sq + " ] } \n", one},
		{"escaped names", `{"t\u0079pe":"Pol\u0079gon","coordinates":[` + sq + `]}`, one},
		{"a feature", `{"type":"Feature","id":1,"properties":{"coordinates":1},"geometry":` + polygonText("["+sq+"]") + `}`, one},
		{"two polygons", `{"type":"MultiPolygon","coordinates":[[` + sq + `],[` + squareText(10, 0) + `]]}`, 2 * one},
		{"WGS84 by name", `{"type":"Polygon","crs":{"type":"name","properties":{"name":"urn:ogc:def:crs:OGC:1.3:CRS84"}},"coordinates":[` + sq + `]}`, one},
		{"across ±180°", polygonText("[[[179,0],[181,0],[181,2],[-181e0,2],[179,0]]]"), 0},
		{"exponents", polygonText("[[[0,0],[20e-1,0],[2.0,2],[0,0.2e1],[-0,0]]]"), one},
	} {
		a, err := DecodeArea([]byte(c.text))
		if c.km2 == 0 { // -181 is out of range
			var f *Fault
			if !errors.As(err, &f) || f.Pointer != "/coordinates/0/3" {
				t.Errorf("%s: %v", c.name, err)
			}
			continue
		}
		if err != nil {
			t.Errorf("%s: %v", c.name, err)
			continue
		}
		if math.Abs(a.AreaKm2()-c.km2) > 1e-3*c.km2 {
			t.Errorf("%s: %.2f km², want %.2f", c.name, a.AreaKm2(), c.km2)
		}
	}
}

// FuzzDecodeArea: no text makes it panic; what is refused says why and where, and
// what is taken has an area.
func FuzzDecodeArea(f *testing.F) {
	for _, s := range []string{
		"", "x", "{}", "null", polygonText("[]"), polygonText("[[]]"), polygonText("[" + squareText(0, 0) + "]"),
		polygonText("[" + squareText(0, 0) + ",[[0.5,0.5],[1,0.5],[1,1],[0.5,0.5]]]"),
		`{"type":"MultiPolygon","coordinates":[[` + squareText(179, 0) + `],[` + squareText(-100, 60) + `]]}`,
		`{"type":"Feature","geometry":` + polygonText("[[[0,60],[120,60],[240,60],[0,60]]]") + `}`,
		polygonText("[[[0,0],[1,1],[0,1],[1,0],[0,0]]]"), polygonText("[[[0,0],[90,0],[180,0],[-90,0],[0,0]]]"),
		polygonText("[[[0,90],[1,90],[2,-90],[0,90]]]"), polygonText("[[[1e308,0],[0,1e-320],[2,2],[1e308,0]]]"),
		polygonText("[[[0,0],[180,0],[90,1e-300],[0,0]]]"), polygonText("[[[0,0],[179.99999,0],[90,0.00001],[0,0]]]"),
	} {
		f.Add([]byte(s))
	}
	f.Fuzz(func(t *testing.T, text []byte) {
		a, err := DecodeArea(text)
		if err != nil {
			var fault *Fault
			if !errors.As(err, &fault) {
				t.Fatalf("%T: %v", err, err)
			}
			if fault.Detail == "" || fault.Kind == 0 || fault.Pointer != "" && !strings.HasPrefix(fault.Pointer, "/") {
				t.Fatalf("%+v", fault)
			}
			return
		}
		if !(a.AreaKm2() > 0 && a.AreaKm2() < 510065622) {
			t.Fatalf("%g km²", a.AreaKm2())
		}
	})
}
