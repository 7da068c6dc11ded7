package wire

import (
	"encoding/json"
	"math"
	"testing"

	"pgregory.net/rapid"

	"nearmargin/api/internal/testmodel"
	"nearmargin/setting"
	"nearmargin/setting/slab"
	"nearmargin/setting/sphere"
)

// segments calls f with the ends of every segment of a GeoJSON document.
func segments(v any, f func(a, b []any)) {
	switch v := v.(type) {
	case map[string]any:
		for _, x := range v {
			segments(x, f)
		}
	case []any:
		for i, x := range v {
			p, line := x.([]any)
			if _, position := first(p).(float64); line && position && i > 0 {
				f(v[i-1].([]any), p)
				continue
			}
			segments(x, f)
		}
	}
}

func first(v []any) any {
	if len(v) == 0 {
		return nil
	}
	return v[0]
}

// doesNotJump fails where a segment of a document spans more than 180° of longitude,
// and returns how many segments there are and the types of the geometries.
func doesNotJump(t interface{ Fatalf(string, ...any) }, doc []byte) (n int, types map[string]int) {
	var got struct {
		Features []struct {
			Geometry struct {
				Type        string
				Coordinates any
			}
		}
	}
	if err := json.Unmarshal(doc, &got); err != nil {
		t.Fatalf("%v: %s", err, doc)
	}
	types = map[string]int{}
	for _, f := range got.Features {
		types[f.Geometry.Type]++
		segments(f.Geometry.Coordinates, func(a, b []any) {
			n++
			if math.Abs(a[0].(float64)-b[0].(float64)) > 180 {
				t.Fatalf("the segment from %v to %v spans more than 180°", a, b)
			}
		})
	}
	return n, types
}

// TestLayersAreCut: no line or ring that the service sends jumps across ±180°
// (RFC 7946, section 3.1.9).
func TestLayersAreCut(t *testing.T) {
	if n, types := doesNotJump(t, AppendBoundaries(nil, testmodel.New(t).Network().Boundaries())); n < 100 || types["MultiLineString"] == 0 {
		t.Errorf("boundaries: %d segments, types %v; the line along 180° was to cross it", n, types)
	}
	rapid.Check(t, func(t *rapid.T) {
		west := rapid.SampledFrom([]float64{170, 179, 179.75, -185, 175.3}).Draw(t, "west")
		south := rapid.Float64Range(-80, 70).Draw(t, "south")

		l := &slab.Layer{West: west, South: south, Step: 0.5, Cols: 21, Rows: 13}
		for row := range l.Rows {
			for col := range l.Cols {
				l.Values = append(l.Values, float32(10+8*float64(col)+5*math.Sin(float64(row))))
			}
		}
		surface, err := slab.NewGrid(slab.Layers{Depth: l})
		if err != nil {
			t.Fatal(err)
		}
		s, err := slab.New(slab.Spec{ID: "g", Name: "Grid", Kind: slab.Subduction, Subducting: "PP", Overriding: "HH", ArcMinDepthKm: 80, Source: "made up", SourceStatus: "memory", Surface: surface})
		if err != nil {
			t.Fatal(err)
		}
		doc := AppendSlabContours(nil, []*slab.Slab{s})
		if n, _ := doesNotJump(t, doc); n < 7 {
			t.Fatalf("the grid gives %d segments: %s", n, doc)
		}

		east, north := west+rapid.Float64Range(1, 30).Draw(t, "width"), south+rapid.Float64Range(1, 19).Draw(t, "height")
		ring := []sphere.LonLat{{Lon: west, Lat: south}, {Lon: east, Lat: south}, {Lon: east, Lat: north}, {Lon: west, Lat: north}, {Lon: west, Lat: south}}
		for i := range ring {
			ring[i].Lon = sphere.WrapLon(ring[i].Lon)
		}
		z, err := setting.NewZone(setting.Zone{Name: "Z", Kind: setting.MixedKind, Source: "made up", Rings: [][]sphere.LonLat{ring}})
		if err != nil {
			t.Fatal(err)
		}
		n, types := doesNotJump(t, AppendZones(nil, []*setting.Zone{z}))
		across := west < 180 && east > 180 || west < -180 && east > -180
		if n < 4 || across != (types["MultiPolygon"] == 1) {
			t.Fatalf("the zone from %g to %g: %d segments, types %v", west, east, n, types)
		}
	})
}
