package slab

import (
	"math"
	"testing"

	"pgregory.net/rapid"

	"nearmargin/setting/sphere"
)

// A plane in longitude and latitude has straight lines at known places.
func TestIsolinesOfAPlane(t *testing.T) {
	for _, west := range []float64{-75, 178.5, -181.5, 358.5} {
		// 40 km a degree to the east, from 0 km
		depth := layer(west, 10, 0.25, 41, 17, func(lon, _ float64) float64 { return 40 * (lon - west) })
		sigma := layer(west, 10, 0.25, 41, 17, func(lon, lat float64) float64 { return 5 + lat })
		got := Isolines(must[Surface](t)(NewGrid(Layers{Depth: depth, Sigma: sigma})))
		if len(got) != 9 { // 20 to 400 km
			t.Fatalf("%d lines, want 9: %+v", len(got), got)
		}
		for i, c := range got {
			if c.DepthKm != isoDepths[i] || math.Abs(c.SigmaKm-17) > 1e-6 {
				t.Errorf("line %d: depth %g, σ %g; want %g, 17", i, c.DepthKm, c.SigmaKm, isoDepths[i])
			}
			for _, p := range c.Path {
				if want := sphere.WrapLon(west + c.DepthKm/40); math.Abs(p.Lon-want) > 1e-6 {
					t.Errorf("%g km: at longitude %g, want %g", c.DepthKm, p.Lon, want)
				}
			}
			// deeper to the right means northwards here
			if first, last := c.Path[0].Lat, c.Path[len(c.Path)-1].Lat; first != 10 || last != 14 {
				t.Errorf("%g km runs from %g to %g, want from 10 to 14", c.DepthKm, first, last)
			}
			if len(c.Path) != 2 {
				t.Errorf("%g km has %d vertices on a meridian, want 2", c.DepthKm, len(c.Path))
			}
		}
	}
}

// A bowl has closed lines, at known distances from its middle, clockwise: deeper inside.
func TestIsolinesOfABowl(t *testing.T) {
	const lon, lat = -179.98, 51.0
	middle := at(lon, lat)
	depth := layer(170, 45, 0.1, 201, 121, func(x, y float64) float64 {
		return max(0, 350-sphere.RadToKm(sphere.Angle(at(x, y), middle)))
	})
	got := Isolines(must[Surface](t)(NewGrid(Layers{Depth: depth})))
	if len(got) != 8 { // 20 to 300 km
		t.Fatalf("%d lines, want 8", len(got))
	}
	for _, c := range got {
		if !math.IsNaN(c.SigmaKm) {
			t.Errorf("%g km: σ %g, want none", c.DepthKm, c.SigmaKm)
		}
		if n := len(c.Path); n < 12 || c.Path[0] != c.Path[n-1] {
			t.Fatalf("%g km: %d vertices, from %v to %v", c.DepthKm, n, c.Path[0], c.Path[n-1])
		}
		for i, p := range c.Path {
			v := sphere.FromLonLat(p)
			if km := sphere.RadToKm(sphere.Angle(v, middle)); math.Abs(km-(350-c.DepthKm)) > 0.4 {
				t.Errorf("%g km: %v is %.2f km from the middle, want %g", c.DepthKm, p, km, 350-c.DepthKm)
			}
			if i > 0 {
				arc, _ := sphere.NewArc(sphere.FromLonLat(c.Path[i-1]), v)
				if arc.Side(middle) >= 0 {
					t.Errorf("%g km: the middle, which is deeper, is to the left", c.DepthKm)
				}
				if km := sphere.RadToKm(sphere.Angle(arc.Midpoint(), middle)); math.Abs(km-(350-c.DepthKm)) > 0.4+thinKm {
					t.Errorf("%g km: between vertices the line is %.2f km from the middle", c.DepthKm, km)
				}
			}
		}
	}
}

// On any grid, holes and saddles included, the surface has the line's depth along it,
// and lines end at the rim alone.
func TestIsolinesLieOnTheSurface(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		west := rapid.SampledFrom([]float64{-75, 178, 359}).Draw(t, "west")
		cols, rows := rapid.IntRange(2, 7).Draw(t, "cols"), rapid.IntRange(2, 7).Draw(t, "rows")
		depth := layer(west, -20, 0.5, cols, rows, func(float64, float64) float64 {
			if rapid.IntRange(0, 9).Draw(t, "hole") == 0 {
				return nan
			}
			return rapid.OneOf(rapid.Float64Range(0, 250), rapid.SampledFrom([]float64{20, 40, 100})).Draw(t, "depth")
		})
		depth.Values[0] = 55.5
		s, err := NewGrid(Layers{Depth: depth})
		if err != nil {
			t.Fatal(err)
		}
		g := s.(*gridSurface)
		for _, c := range Isolines(s) {
			for _, p := range c.Path {
				r, in := s.At(sphere.FromLonLat(p))
				if !in || math.Abs(r.DepthKm-c.DepthKm) > 1e-3 {
					t.Fatalf("%g km at %v: inside %v, depth %g", c.DepthKm, p, in, r.DepthKm)
				}
			}
			for _, end := range []sphere.LonLat{c.Path[0], c.Path[len(c.Path)-1]} {
				if c.Path[0] == c.Path[len(c.Path)-1] {
					break
				}
				// an end lies on an edge that has a whole cell on one side only
				col, row, fx, fy := g.cell(sphere.FromLonLat(end))
				whole := func(col, row int) bool {
					return !math.IsNaN(depth.node(col, row) + depth.node(col+1, row) + depth.node(col, row+1) + depth.node(col+1, row+1))
				}
				cells := [][2]int{{col, row}}
				if fx == 0 {
					cells = append(cells, [2]int{col - 1, row})
				}
				if fy == 0 {
					cells = append(cells, [2]int{col, row - 1})
				}
				all := len(cells) > 1
				for _, k := range cells {
					all = all && whole(k[0], k[1])
				}
				if all && !(fx == 0 && fy == 0) {
					t.Fatalf("the line of %g km ends at %v, within the grid", c.DepthKm, end)
				}
			}
		}
	})
}

// Contours that a surface was built from are its lines.
func TestIsolinesOfContours(t *testing.T) {
	cs := []Contour{
		{DepthKm: 15, SigmaKm: 3, Path: []sphere.LonLat{{Lon: 0, Lat: 0}, {Lon: 0, Lat: 2}}},
		{DepthKm: 45, SigmaKm: 3, Path: []sphere.LonLat{{Lon: 1, Lat: 0}, {Lon: 1, Lat: 2}}},
	}
	if got := Isolines(must[Surface](t)(NewContours(cs))); len(got) != 2 || got[0].DepthKm != 15 || got[1].DepthKm != 45 {
		t.Errorf("got %+v", got)
	}
}
