package page

import (
	"slices"
	"strings"
	"testing"

	"nearmargin/setting/sphere"
)

// TestDecodeTopology reads a square of two arcs, one of them backwards, by hand: steps
// of half a degree from 10° E 20° N.
func TestDecodeTopology(t *testing.T) {
	const square = `{"transform":{"scale":[0.5,0.5],"translate":[10,20]},"arcs":[[[0,0],[0,2],[2,0]],[[0,0],[2,0],[0,2]]],
		"objects":{"land":{"geometries":[{"type":"MultiPolygon","arcs":[[[0,-2]]]},{"type":"Polygon","arcs":[[0,-2]]}]}}}`
	got, err := decodeTopology([]byte(square))
	if err != nil {
		t.Fatal(err)
	}
	want := []sphere.LonLat{{Lon: 10, Lat: 20}, {Lon: 10, Lat: 21}, {Lon: 11, Lat: 21}, {Lon: 11, Lat: 20}, {Lon: 10, Lat: 20}}
	if len(got) != 2 || !slices.Equal(got[0][0], want) || !slices.Equal(got[1][0], want) {
		t.Errorf("got %v, want twice %v", got, want)
	}
	for name, bad := range map[string]string{
		"no transform": `{"arcs":[]}`,
		"no such arc":  strings.ReplaceAll(square, "[0,-2]", "[7]"),
	} {
		if _, err := decodeTopology([]byte(bad)); err == nil {
			t.Errorf("%s: no error", name)
		}
	}
}
