package slab

import (
	"math"
	"reflect"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"nearmargin/setting/sphere"
)

func TestBetweenParallelContours(t *testing.T) {
	for _, c := range []struct {
		name    string
		westLon float64
		lonDeg  float64 // from the western end
		latDeg  float64
		depthKm float64
		sigmaKm float64
		dipRise float64 // km a degree of arc
		inside  bool
	}{
		{name: "a quarter down the first strip", lonDeg: 2, latDeg: -0.25, depthKm: 20, sigmaKm: 3, dipRise: 40, inside: true},
		{name: "half way down the first strip", lonDeg: 0.7, latDeg: -0.5, depthKm: 30, sigmaKm: 4, dipRise: 40, inside: true},
		{name: "just above the middle contour", lonDeg: 2, latDeg: -0.9999, depthKm: 49.996, sigmaKm: 5.9996, dipRise: 40, inside: true},
		{name: "just below the middle contour", lonDeg: 2, latDeg: -1.0001, depthKm: 50.012, sigmaKm: 6.0006, dipRise: 120, inside: true},
		{name: "three quarters down the second strip", lonDeg: 3.9, latDeg: -1.75, depthKm: 140, sigmaKm: 10.5, dipRise: 120, inside: true},
		{name: "just above the deepest contour", lonDeg: 2, latDeg: -1.9999, depthKm: 169.988, sigmaKm: 11.9994, dipRise: 120, inside: true},
		{name: "north of the first contour", lonDeg: 2, latDeg: 0.001},
		{name: "south of the last contour", lonDeg: 2, latDeg: -2.001},
		{name: "west of the western end", lonDeg: -0.001, latDeg: -1.5},
		{name: "east of the eastern end", lonDeg: 4.001, latDeg: -1.5},
		{name: "at the antipode", lonDeg: 182, latDeg: 1},
	} {
		for _, westLon := range []float64{30, -180, 178, -2} { // the second and third at and across ±180°
			p := at(westLon+c.lonDeg, c.latDeg)
			r, in := southward(t, westLon).At(p)
			if in != c.inside {
				t.Errorf("%s, from %g E: inside %v, want %v", c.name, westLon, in, c.inside)
			}
			if !in || !c.inside {
				continue
			}
			dip := math.Atan(c.dipRise/kmPerDeg) * 180 / math.Pi
			for _, x := range []struct {
				what           string
				got, want, tol float64
			}{
				{"depth", r.DepthKm, c.depthKm, 2e-3}, {"σ", r.SigmaKm, c.sigmaKm, 2e-4}, {"dip", r.DipDeg, dip, 1e-3}, {"dip azimuth", r.DipAzimuthDeg, 180, 1e-2},
			} {
				if !(math.Abs(x.got-x.want) <= x.tol) {
					t.Errorf("%s, from %g E: %s %.6f, want %.6f", c.name, westLon, x.what, x.got, x.want)
				}
			}
			if !math.IsNaN(r.ThicknessKm) {
				t.Errorf("%s: thickness %g, want NaN: contours give none", c.name, r.ThicknessKm)
			}
		}
	}
}

// A slab that goes down to the north, the east, the west: the dip's direction
// follows the contours.
func TestDipAzimuth(t *testing.T) {
	meridian := func(depthKm, lon, fromLat, toLat float64) Contour {
		return Contour{depthKm, 5, []sphere.LonLat{{Lon: lon, Lat: fromLat}, {Lon: lon, Lat: toLat}}}
	}
	for _, c := range []struct {
		name     string
		contours []Contour
		p        sphere.Vec
		want     float64
	}{
		{"to the north", []Contour{parallel(0, 1, 4, 0, -1), parallel(80, 1, 4, 0, 0)}, at(2, -0.5), 0},
		{"to the south", []Contour{parallel(0, 1, 0, 4, 1), parallel(80, 1, 0, 4, 0)}, at(2, 0.5), 180},
		{"to the east", []Contour{meridian(0, 10, -2, 2), meridian(90, 11, -2, 2)}, at(10.3, 0), 90},
		{"to the west across 180", []Contour{meridian(0, -179.5, 2, -2), meridian(90, 179.5, 2, -2)}, at(180, 0), 270},
	} {
		r, in := must[Surface](t)(NewContours(c.contours)).At(c.p)
		if off := math.Abs(math.Mod(r.DipAzimuthDeg-c.want+540, 360) - 180); !in || off > 0.01 {
			t.Errorf("%s: inside %v, dip azimuth %g, want %g", c.name, in, r.DipAzimuthDeg, c.want)
		}
	}
}

// On every contour inside the surface the depth is the contour's, at vertices and
// between them, and 10 m to either side it has hardly changed.
func TestContoursAreMetAndCrossedWithoutAStep(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		c := genCurved().Draw(t, "surface")
		if len(c.contours) < 3 {
			t.Skip("no inner contour")
		}
		k := c.contours[rapid.IntRange(1, len(c.contours)-2).Draw(t, "contour")]
		j := rapid.IntRange(1, len(k.Path)-1).Draw(t, "leg")
		leg, _ := sphere.NewArc(sphere.FromLonLat(k.Path[j-1]), sphere.FromLonLat(k.Path[j]))
		along := rapid.Float64Range(0, 1).Draw(t, "along")
		if j == 1 {
			along = max(along, 0.01) // at the very ends the footprint ends
		}
		if j == len(k.Path)-1 {
			along = min(along, 0.99)
		}
		on := leg.At(along)
		for _, metres := range []float64{0, 10, -10} {
			r, in := c.surface.At(on.Add(leg.N.Scale(metres / 1000 / sphere.MeanRadiusKm)).Unit())
			tol := 1e-6
			if metres != 0 {
				tol = 0.01 * 10 // the strips are no steeper than 10 in 1
			}
			if !in || math.Abs(r.DepthKm-k.DepthKm) > tol {
				t.Fatalf("%g m to the left of the contour of %g km: inside %v, depth %.9f", metres, k.DepthKm, in, r.DepthKm)
			}
		}
	})
}

func TestVerticesOfInnerContoursAreInside(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		c := genCurved().Draw(t, "surface")
		for _, k := range c.contours[1 : len(c.contours)-1] {
			for j, p := range k.Path[1 : len(k.Path)-1] {
				if r, in := c.surface.At(sphere.FromLonLat(p)); !in || math.Abs(r.DepthKm-k.DepthKm) > 1e-6 {
					t.Fatalf("vertex %d of the contour of %g km: inside %v, depth %g", j+2, k.DepthKm, in, r.DepthKm)
				}
			}
		}
	})
}

func TestDepthStaysBetweenItsContours(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		c := genCurved().Draw(t, "surface")
		i := rapid.IntRange(0, len(c.contours)-2).Draw(t, "strip")
		down := rapid.Float64Range(0.15, 0.85).Draw(t, "down")
		p := c.where(float64(i)+down, rapid.Float64Range(0.05, 0.95).Draw(t, "along"))
		r, in := c.surface.At(p)
		lo, hi := c.contours[i], c.contours[i+1]
		if !in || !(r.DepthKm > lo.DepthKm && r.DepthKm < hi.DepthKm) || !(r.SigmaKm > lo.SigmaKm && r.SigmaKm < hi.SigmaKm) ||
			!(r.DipDeg > 0 && r.DipDeg < 90) || !(r.DipAzimuthDeg >= 0 && r.DipAzimuthDeg < 360) {
			t.Fatalf("%v: inside %v, %+v; want between %g and %g km", p.LonLat(), in, r, lo.DepthKm, hi.DepthKm)
		}
	})
}

func TestContoursComeBack(t *testing.T) {
	want := []Contour{parallel(10, 2, 0, 4, 0), parallel(50, 6, 0, 4, -1)}
	s := must[Surface](t)(NewContours(want))
	if got := Contours(s); !reflect.DeepEqual(got, want) {
		t.Errorf("contours %+v, want %+v", got, want)
	}
	if l, ok := GridLayers(s); ok {
		t.Errorf("contours have layers %+v", l)
	}
}

func TestNewContoursErrors(t *testing.T) {
	a, b := parallel(10, 2, 0, 4, 0), parallel(50, 6, 0, 4, -1)
	with := func(c Contour, f func(*Contour)) Contour { f(&c); return c }
	twice := append(append([]sphere.LonLat{}, b.Path[:3]...), b.Path[2:]...)
	for _, c := range []struct {
		name string
		in   []Contour
		want string
	}{
		{"none", nil, "0 contours; at least 2 are needed"},
		{"one", []Contour{a}, "1 contours; at least 2 are needed"},
		{"above sea level", []Contour{with(a, func(c *Contour) { c.DepthKm = -1 }), b}, "contour 1: depth_km is -1; it must be within 0 and 800"},
		{"depth not a number", []Contour{a, with(b, func(c *Contour) { c.DepthKm = math.NaN() })}, "contour 2: depth_km is NaN; it must be within 0 and 800"},
		{"too deep", []Contour{a, with(b, func(c *Contour) { c.DepthKm = 800.5 })}, "contour 2: depth_km is 800.5"},
		{"the same depth twice", []Contour{a, with(b, func(c *Contour) { c.DepthKm = 10 })}, "contour 2: depth_km 10 does not lie below the one before, 10"},
		{"from the deepest", []Contour{with(a, func(c *Contour) { c.DepthKm = 90 }), b}, "contour 2: depth_km 50 does not lie below the one before, 90"},
		{"no σ", []Contour{a, with(b, func(c *Contour) { c.SigmaKm = 0 })}, "contour 50 km: sigma_km is 0; it must be more than 0"},
		{"σ not a number", []Contour{a, with(b, func(c *Contour) { c.SigmaKm = math.NaN() })}, "contour 50 km: sigma_km is NaN"},
		{"σ without bound", []Contour{a, with(b, func(c *Contour) { c.SigmaKm = math.Inf(1) })}, "contour 50 km: sigma_km is +Inf"},
		{"no vertex", []Contour{a, with(b, func(c *Contour) { c.Path = nil })}, "contour 50 km: a path has 0 vertices; at least 2 are needed"},
		{"one vertex", []Contour{with(a, func(c *Contour) { c.Path = c.Path[:1] }), b}, "contour 10 km: a path has 1 vertices"},
		{"a vertex twice", []Contour{a, with(b, func(c *Contour) { c.Path = twice })}, "contour 50 km: vertices 3 and 4 of a path (0.2000, -1.0000) coincide"},
		{"on the left", []Contour{a, parallel(50, 6, 0, 4, 1)}, "the contour of 50 km lies to the left of that of 10 km; the slab must deepen to the right"},
		{"both the wrong way round", []Contour{parallel(10, 2, 4, 0, 0), parallel(50, 6, 4, 0, -1)}, "must deepen to the right"},
		{"one the wrong way round", []Contour{a, parallel(50, 6, 4, 0, -1)}, "run in opposite directions"},
		{"round half the Earth", []Contour{{10, 1, []sphere.LonLat{{Lon: 0}, {Lon: 90}, {Lon: 179}}}, {20, 1, []sphere.LonLat{{Lon: 0, Lat: -1}, {Lon: 90, Lat: -1}, {Lon: 179, Lat: -1}}}}, "between the contours of 10 and 20 km: ring 1 does not fit into the hemisphere"},
		{"ends that meet", []Contour{a, with(b, func(c *Contour) { c.Path = append([]sphere.LonLat{a.Path[0]}, c.Path...) })}, "the contours' ends: vertices 1 and 2 of a path (0.0000, 0.0000) coincide"},
	} {
		t.Run(c.name, func(t *testing.T) {
			s, err := NewContours(c.in)
			if err == nil || !strings.Contains(err.Error(), c.want) || s != nil {
				t.Errorf("%v, error %v; want %q", s, err, c.want)
			}
		})
	}
}

func TestOutsideOfContours(t *testing.T) {
	for _, c := range []struct {
		name     string
		lon, lat float64
		beyond   Beyond
		km       float64
		depthKm  float64 // at the nearest point of the footprint
	}{
		{"past the rim", 2, -2.5, PastRim, 0.5 * kmPerDeg, 170},
		{"past the rim and round the corner", 4.2, -2.4, PastRim, 0.44714 * kmPerDeg, 170},
		{"past the eastern end", 4.5, -1.5, PastEnd, 0.49983 * kmPerDeg, 110},
		{"past the western end", -0.5, -0.5, PastEnd, 0.49998 * kmPerDeg, 30},
		{"before the start", 2, 0.5, BeforeStart, 0.5 * kmPerDeg, 10},
		{"before the start and round the corner", 4.2, 0.4, BeforeStart, 0.44721 * kmPerDeg, 10},
	} {
		for _, westLon := range []float64{0, 178} {
			s := southward(t, westLon)
			p := at(westLon+c.lon, c.lat)
			if _, in := s.At(p); in {
				t.Errorf("%s: the place is inside", c.name)
			}
			o, near := s.Outside(p, c.km+1)
			if !near || o.Beyond != c.beyond || math.Abs(o.Km-c.km) > 0.01 || math.Abs(o.Reading.DepthKm-c.depthKm) > 0.1 {
				t.Errorf("%s, from %g E: near %v, %+v; want beyond %d at %.2f km, depth %g", c.name, westLon, near, o, c.beyond, c.km, c.depthKm)
			}
			if o, near := s.Outside(p, c.km-1); near {
				t.Errorf("%s: %g km is within %g km", c.name, o.Km, c.km-1)
			}
		}
	}
	if o, near := southward(t, 0).Outside(at(182, 1), 5000); near {
		t.Errorf("the antipode is %g km away", o.Km)
	}
}
