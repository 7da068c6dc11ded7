package slab

import (
	"math"
	"testing"

	"nearmargin/setting/sphere"
)

// ramp is a grid on which depth grows by 20 km a degree to the east from 170° E, with
// a rim of nodes that have none.
func ramp() *Layer {
	var nodes []Node
	for lon := 168.0; lon <= 176; lon++ {
		for lat := -4.0; lat <= 4; lat++ {
			z := 20 * (lon - 169)
			if lon < 170 || lon > 175 || math.Abs(lat) > 3 {
				z = math.NaN()
			}
			nodes = append(nodes, Node{lon, lat, z})
		}
	}
	l, err := LayOut(nodes)
	if err != nil {
		panic(err)
	}
	return l
}

func TestUpDipRimOfAGrid(t *testing.T) {
	s, err := NewGrid(Layers{Depth: ramp()})
	if err != nil {
		t.Fatal(err)
	}
	rim := UpDipRim(s)
	// the shallowest column, 20 km, and of the next, 40 km, its two ends
	if len(rim) != 7+2 {
		t.Errorf("%d places, want 9", len(rim))
	}
	for _, r := range rim {
		at := r.At.LonLat()
		if at.Lon > 171.001 || math.Abs(r.DipAzimuthDeg-90) > 1 {
			t.Errorf("place %v dips to %g; want one in the west that dips east", at, r.DipAzimuthDeg)
		}
	}
}

func TestUpDipRimOfContours(t *testing.T) {
	line := func(lon float64) []sphere.LonLat { return []sphere.LonLat{{Lon: lon, Lat: 0}, {Lon: lon, Lat: 1}} }
	s, err := NewContours([]Contour{{10, 1, line(0)}, {50, 1, line(1)}})
	if err != nil {
		t.Fatal(err)
	}
	rim := UpDipRim(s)
	if len(rim) != 12 { // 111.2 km, at most 10 km apart
		t.Errorf("%d places, want 12", len(rim))
	}
	for _, r := range rim {
		if at := r.At.LonLat(); math.Abs(at.Lon) > 1e-9 || at.Lat <= 0 || at.Lat >= 1 || math.Abs(r.DipAzimuthDeg-90) > 1e-6 {
			t.Errorf("place %v dips to %g; want one on the upper contour that dips east", at, r.DipAzimuthDeg)
		}
	}
	if n := len(Spots(s)); n != 4 {
		t.Errorf("%d spots, want the 4 vertices", n)
	}
}

func TestCropKeepsEveryDepth(t *testing.T) {
	// the same across 180°, and beyond it
	for _, shift := range []float64{0, 8, 20} {
		l := ramp()
		l.West += shift
		sigma := *l
		whole := Layers{Depth: l, Sigma: &sigma}
		cut := whole.Crop()
		if cut.Depth.Cols != 6 || cut.Depth.Rows != 7 || cut.Sigma.Cols != 6 || cut.Dip != nil {
			t.Errorf("cropped to %d by %d", cut.Depth.Cols, cut.Depth.Rows)
		}
		if w := cut.Depth.West; w < -180 || w >= 180 {
			t.Errorf("west side at %g", w)
		}
		a, err := NewGrid(whole)
		if err != nil {
			t.Fatal(err)
		}
		b, err := NewGrid(cut)
		if err != nil {
			t.Fatal(err)
		}
		for lon := 168.0; lon <= 176; lon += 0.25 {
			for lat := -4.0; lat <= 4; lat += 0.25 {
				p := sphere.FromLonLat(sphere.LonLat{Lon: lon + shift, Lat: lat})
				ra, oka := a.At(p)
				rb, okb := b.At(p)
				if oka != okb || oka && math.Abs(ra.DepthKm-rb.DepthKm) > 1e-6 {
					t.Fatalf("at %g, %g: %+v %v, cropped %+v %v", lon+shift, lat, ra, oka, rb, okb)
				}
			}
		}
	}
	empty := Layers{Depth: &Layer{Step: 1, Cols: 2, Rows: 2, Values: []float32{float32(math.NaN()), float32(math.NaN()), float32(math.NaN()), float32(math.NaN())}}}
	if got := empty.Crop(); got.Depth.Cols != 2 {
		t.Error("a grid without a depth was cropped")
	}
}

func TestLayOutRefuses(t *testing.T) {
	for _, c := range []struct {
		name  string
		nodes []Node
	}{
		{"three nodes", []Node{{0, 0, 1}, {1, 0, 1}, {0, 1, 1}}},
		{"a line", []Node{{0, 0, 1}, {1, 0, 1}, {2, 0, 1}, {3, 0, 1}}},
		{"a node off the grid", []Node{{0, 0, 1}, {1, 0, 1}, {0, 1, 1}, {1, 1, 1}, {4, 2, 1}, {2.5, 2, 1}}},
		{"too many", []Node{{0, 0, 1}, {1e-5, 0, 1}, {360, 90, 1}, {1, 1, 1}}},
	} {
		if l, err := LayOut(c.nodes); err == nil {
			t.Errorf("%s: laid out as %d by %d", c.name, l.Cols, l.Rows)
		}
	}
}
