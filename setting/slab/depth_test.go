package slab

import (
	"cmp"
	"math"
	"slices"
	"testing"

	"pgregory.net/rapid"

	"nearmargin/setting/sphere"
)

func TestRelate(t *testing.T) {
	for _, c := range []struct {
		name                     string
		depth, sigma, dip, thick float64
		site                     float64
		want                     Relation
		clearance                float64
	}{
		{"far above", 100, 5, 30, nan, 20, Above, 80},
		{"above sea level", 100, 5, 30, nan, -3, Above, 103},
		{"just above the interface", 100, 5, 30, nan, 89.9, Above, 10.1},
		{"10 km above counts as near", 100, 5, 30, nan, 90, NearInterface, 10},
		{"on the top", 100, 5, 30, nan, 100, NearInterface, 0},
		{"10 km below counts as near", 100, 5, 30, 60, 110, NearInterface, -10},
		{"σ unknown: 10 km", 100, nan, 30, nan, 110.1, Below, -10.1},
		{"σ larger than 10 km", 100, 25, 30, nan, 76, NearInterface, 24},
		{"beyond the larger σ", 100, 25, 30, nan, 74.9, Above, 25.1},
		{"below the larger σ, thickness unknown", 100, 25, 30, nan, 125.1, Below, -25.1},
		{"within a flat slab", 100, 5, 0, 60, 159, Within, -59},
		{"at the base of a flat slab", 100, 5, 0, 60, 160, Within, -60},
		{"below a flat slab", 100, 5, 0, 60, 160.1, Below, -60.1},
		{"thickness unknown", 100, 5, 0, nan, 130, Below, -30},
		{"a steep slab is thicker along the vertical", 100, 5, 60, 60, 219.9, Within, -119.9},
		{"below a steep slab", 100, 5, 60, 60, 220.1, Below, -120.1},
		{"a vertical slab is not without end", 100, 5, 90, 10, 299.9, Within, -199.9},
		{"below a vertical slab", 100, 5, 90, 10, 300.1, Below, -200.1},
	} {
		r := Reading{DepthKm: c.depth, SigmaKm: c.sigma, DipDeg: c.dip, ThicknessKm: c.thick}
		got, clearance := r.Relate(c.site)
		if got != c.want || math.Abs(clearance-c.clearance) > 1e-9 {
			t.Errorf("%s: %v, clearance %g; want %v, %g", c.name, got, clearance, c.want, c.clearance)
		}
	}
}

func TestRelationNames(t *testing.T) {
	for r, want := range map[Relation]string{NoRelation: "none", Above: "above", NearInterface: "near_interface", Within: "within", Below: "below"} {
		if got := r.String(); got != want {
			t.Errorf("relation %d is %q, want %q", r, got, want)
		}
	}
}

// searched returns the distance from a site to the surface by trying a fine grid
// of places all over the circle in which the nearest must lie, and a finer one
// around each of the places that are almost as near as the best.
func searched(s Surface, p sphere.Vec, siteDepthKm float64) float64 {
	here, ok := s.At(p)
	if !ok {
		return nan
	}
	site := p.Scale(sphere.MeanRadiusKm - siteDepthKm)
	east, north := p.EastNorth()
	to := func(eastKm, northKm float64) float64 {
		q := p.Add(east.Scale(eastKm / sphere.MeanRadiusKm)).Add(north.Scale(northKm / sphere.MeanRadiusKm)).Unit()
		if r, ok := s.At(q); ok {
			return q.Scale(sphere.MeanRadiusKm - r.DepthKm).Sub(site).Norm()
		}
		return math.Inf(1)
	}
	const n, fine, refined = 50, 8, 40
	cell := 1.15 * math.Abs(here.DepthKm-siteDepthKm) / n
	type place struct{ km, east, north float64 }
	places := []place{{to(0, 0), 0, 0}}
	for i := -n; i <= n; i++ {
		for j := -n; j <= n; j++ {
			places = append(places, place{to(cell*float64(i), cell*float64(j)), cell * float64(i), cell * float64(j)})
		}
	}
	slices.SortFunc(places, func(a, b place) int { return cmp.Compare(a.km, b.km) })
	best := places[0].km
	for _, q := range places[:refined] {
		for i := -fine; i <= fine; i++ {
			for j := -fine; j <= fine; j++ {
				best = min(best, to(q.east+cell*float64(i)/fine, q.north+cell*float64(j)/fine))
			}
		}
	}
	return best
}

func checkDistance(t *rapid.T, surface Surface, p sphere.Vec) {
	r, in := surface.At(p)
	if !in {
		t.Skip("outside")
	}
	site := rapid.Float64Range(0, 400).Draw(t, "site depth")
	s := &Slab{Spec: Spec{Surface: surface}}
	got, want := s.Distance3D(p, site), searched(surface, p, site)
	if !(got <= 1.02*want+0.01 && got >= 0.98*want-0.01) {
		t.Fatalf("%v at %g km, slab at %g km dipping %g: distance %g, searched %g", p.LonLat(), site, r.DepthKm, r.DipDeg, got, want)
	}
	if clearance := math.Abs(r.DepthKm - site); got > clearance+1e-6 {
		t.Fatalf("distance %g is more than the clearance %g", got, clearance)
	}
}

func TestDistance3DOnCurvedContours(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		c := genCurved().Draw(t, "surface")
		checkDistance(t, c.surface, c.where(rapid.Float64Range(0.05, float64(len(c.contours))-1.05).Draw(t, "down"), rapid.Float64Range(0.05, 0.95).Draw(t, "along")))
	})
}

func TestDistance3DOnGrids(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s := genGrid().Draw(t, "grid")
		l, _ := GridLayers(s)
		checkDistance(t, s, at(l.Depth.West+rapid.Float64Range(0, 3).Draw(t, "x"), l.Depth.South+rapid.Float64Range(0, 3).Draw(t, "y")))
	})
}

// To a plane that dips by δ the distance is the clearance times cos δ. At depth a
// degree is shorter and the plane as much steeper; the rest of the Earth's
// curvature counts little over 30 km.
func TestDistance3DToAPlane(t *testing.T) {
	for _, dip := range []float64{5, 30, 45, 60, 75} {
		gap := 2.0 // degrees
		deep := 20 + gap*kmPerDeg*math.Tan(dip*math.Pi/180)
		if deep > 800 {
			gap = 780 / kmPerDeg / math.Tan(dip*math.Pi/180)
			deep = 20 + gap*kmPerDeg*math.Tan(dip*math.Pi/180)
		}
		surface := must[Surface](t)(NewContours([]Contour{parallel(20, 2, 0, 4, 0), parallel(deep, 9, 0, 4, -gap)}))
		p := at(2, -gap/2)
		r, _ := surface.At(p)
		s := &Slab{Spec: Spec{Surface: surface}}
		for _, clearance := range []float64{30, -30} {
			steeper := math.Tan(dip*math.Pi/180) * sphere.MeanRadiusKm / (sphere.MeanRadiusKm - r.DepthKm)
			want := 30 * math.Cos(math.Atan(steeper))
			if got := s.Distance3D(p, r.DepthKm-clearance); math.Abs(got/want-1) > 0.02 {
				t.Errorf("dip %g, clearance %g: distance %g, want %g", dip, clearance, got, want)
			}
		}
		if got := s.Distance3D(p, r.DepthKm); got > 1e-9 {
			t.Errorf("dip %g: on the surface the distance is %g", dip, got)
		}
	}
}

func TestDistance3DOutside(t *testing.T) {
	s := &Slab{Spec: Spec{Surface: southward(t, 0)}}
	if got := s.Distance3D(at(2, 1), 10); !math.IsNaN(got) {
		t.Errorf("outside of the footprint the distance is %g, want NaN", got)
	}
}
