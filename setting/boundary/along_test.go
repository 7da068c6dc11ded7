package boundary

import (
	"math"
	"testing"

	"nearmargin/setting/sphere"
)

// TestAlongTo looks along a line at two ridge segments that a transform offsets.
func TestAlongTo(t *testing.T) {
	run := func(id string, kind Type, path ...sphere.LonLat) *Boundary {
		b, err := New(Spec{ID: id, Name: id, Type: kind, Left: "AA", Right: "BB", SigmaKm: 5, Source: "made up", SourceStatus: FromMemory, Path: path})
		if err != nil {
			t.Fatal(err)
		}
		return b
	}
	// a ridge on the equator from 0 to 10° E, a transform north to 2° N, a ridge on to 20° E
	n, err := NewNetwork([]*Boundary{
		run("west", SpreadingRidge, sphere.LonLat{}, sphere.LonLat{Lon: 10}),
		run("offset", OceanicTransform, sphere.LonLat{Lon: 10}, sphere.LonLat{Lon: 10, Lat: 2}),
		run("east", SpreadingRidge, sphere.LonLat{Lon: 10, Lat: 2}, sphere.LonLat{Lon: 20, Lat: 2}),
	})
	if err != nil {
		t.Fatal(err)
	}
	degree := sphere.RadToKm(math.Pi / 180)
	for _, c := range []struct {
		name    string
		lon     float64
		lat     float64
		azimuth float64
		plate   string
		maxKm   float64
		want    float64 // km; NaN for none
	}{
		{"north of the western segment, looking north and south", 5, 1, 0, "AA", 500, degree},
		{"the same, looking the other way round", 5, 1, 180, "BB", 500, degree},
		{"south of the eastern segment, whose end is nearer than what lies along", 10.5, -1, 0, "BB", 500, 3.03 * degree},
		{"along the ridge", 5, 1, 90, "AA", 500, math.NaN()},
		{"too far", 5, 1, 0, "AA", 100, math.NaN()},
		{"another plate", 5, 1, 0, "CC", 500, math.NaN()},
	} {
		t.Run(c.name, func(t *testing.T) {
			km, ok := n.AlongTo(PlaceAt(sphere.LonLat{Lon: c.lon, Lat: c.lat}), c.azimuth, SpreadingRidge, c.plate, c.maxKm)
			if ok == math.IsNaN(c.want) {
				t.Fatalf("found %t, want %g km", ok, c.want)
			}
			if ok && math.Abs(km-c.want) > 0.01*c.want {
				t.Errorf("%g km, want %g", km, c.want)
			}
		})
	}
}
