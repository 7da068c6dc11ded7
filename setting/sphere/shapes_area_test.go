package sphere

import (
	"bytes"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"os/exec"
	"slices"
	"strconv"
	"strings"
	"testing"

	"github.com/tidwall/geodesic"
)

// earthKm2 is the area of the WGS84 ellipsoid, eight times what GeographicLib's
// Planimeter 2.1.2 gives for an octant.
const earthKm2 = 8 * 63758202.7155111

func closeTo(t *testing.T, what string, got, want, rel float64) {
	t.Helper()
	if math.Abs(got-want) > rel*math.Abs(want) {
		t.Errorf("%s: %.6f, want %.6f within %g of it", what, got, want, rel)
	}
}

func TestAreasInClosedForm(t *testing.T) {
	closeTo(t, "the Earth", EarthAreaKm2, earthKm2, 1e-14)
	closeTo(t, "the Earth as a quad", mustQuad(t, -180, -90, 180, 90).AreaKm2(), earthKm2, 1e-14)
	for name, ring := range map[string][]LonLat{
		"north-east": places(0, 0, 90, 0, 0, 90), "south, across ±180°": places(100, 0, -170, 0, 7, -90), "written clockwise": places(0, 0, 0, 90, 90, 0),
	} {
		closeTo(t, "octant "+name, mustPolygon(t, closed(ring)).AreaKm2(), earthKm2/8, 1e-12)
	}
	closeTo(t, "a quarter", mustQuad(t, -25, -90, 65, 90).AreaKm2(), earthKm2/4, 1e-14)
	// the authalic sphere's form of the same: q of Snyder 1987, equation 3-12
	for _, b := range [][4]float64{{0, 0, 90, 90}, {10, 20, 30, 40}, {-76, -40, -68, -30}, {170, -5, -170, 5}, {0, 89, 1, 90}, {0, -90, 300, -30}} {
		span := math.Mod(b[2]-b[0]+360, 360) * math.Pi / 180
		q := func(lat float64) float64 {
			e, s := math.Sqrt(wgs84E2), math.Sin(lat*math.Pi/180)
			return (1 - wgs84E2) * (s/(1-wgs84E2*s*s) - math.Log((1-e*s)/(1+e*s))/(2*e))
		}
		want := wgs84A * wgs84A / 2 * span * (q(b[3]) - q(b[1]))
		closeTo(t, fmt.Sprint("box ", b), mustQuad(t, b[0], b[1], b[2], b[3]).AreaKm2(), want, 1e-12)
		if b[2]-b[0] < 180 && b[3]-b[1] < 90 {
			// the same as a polygon of many positions along the parallels
			var ring []LonLat
			const n = 4000
			for i := range n + 1 {
				ring = append(ring, LonLat{b[0] + math.Mod(b[2]-b[0]+360, 360)*float64(i)/n, b[1]})
			}
			for i := range n + 1 {
				ring = append(ring, LonLat{b[0] + math.Mod(b[2]-b[0]+360, 360)*float64(n-i)/n, b[3]})
			}
			closeTo(t, fmt.Sprint("polygon ", b), mustPolygon(t, closed(ring)).AreaKm2(), want, 1e-6)
		}
	}
}

// rings of the size of countries and seas; the areas are worked out by others.
var areaRings = map[string][]LonLat{
	"rhombus in Africa":      places(10, 0, 20, -10, 30, 0, 20, 12),
	"Iberia, roughly":        places(-9.5, 37, -9, 43, -1.8, 43.4, 3.2, 42.3, -0.3, 38.7, -2, 36.8, -5.6, 36),
	"Fiji, across ±180°":     places(176.5, -19.5, -178, -20, -178.5, -15.5, 177, -16),
	"Antarctica, a pole":     places(-60, -65, 0, -70, 50, -66, 110, -66, 165, -72, -150, -77, -100, -73),
	"the Arctic, a pole":     places(0, 75, 90, 72, 180, 70, -90, 71),
	"a hectare":              places(-70, -30, -69.999, -30, -69.999, -29.999, -70, -29.999),
	"a third of the Pacific": places(150, 45, -130, 45, -110, 0, -120, -40, 170, -40, 150, 0),
}

// dense puts places along the great-circle arcs of a ring, so that geodesics
// between them follow it.
func dense(ring []LonLat, steps int) (out []LonLat) {
	ring = closed(ring)
	for i := 1; i < len(ring); i++ {
		arc, _ := NewArc(FromLonLat(ring[i-1]), FromLonLat(ring[i]))
		for k := range steps {
			out = append(out, arc.At(float64(k)/float64(steps)).LonLat())
		}
	}
	return out
}

// TestAreasAgainstGeodesicPolygons compares with Karney (2013), section 6, as
// implemented by tidwall/geodesic: between places 1/500 of an edge apart a
// geodesic and a great-circle arc are the same to 1e-6 of the area.
func TestAreasAgainstGeodesicPolygons(t *testing.T) {
	for name, ring := range areaRings {
		p := geodesic.WGS84.PolygonInit(false)
		for _, q := range dense(ring, 500) {
			p.AddPoint(q.Lat, q.Lon)
		}
		var m2 float64
		p.Compute(false, true, &m2, nil)
		closeTo(t, name, mustPolygon(t, closed(ring)).AreaKm2(), math.Abs(m2)/1e6, 1e-6)
	}
}

// TestAreasAgainstPlanimeter compares with GeographicLib's own Planimeter.
func TestAreasAgainstPlanimeter(t *testing.T) {
	if _, err := exec.LookPath("Planimeter"); err != nil {
		if os.Getenv("NEARMARGIN_REQUIRE_TOOLS") != "" {
			t.Fatal("Planimeter is not installed (package geographiclib-tools)")
		}
		t.Skip("Planimeter is not installed (package geographiclib-tools)")
	}
	for name, ring := range areaRings {
		var in bytes.Buffer
		for _, q := range dense(ring, 500) {
			fmt.Fprintf(&in, "%.13f %.13f\n", q.Lat, q.Lon)
		}
		cmd := exec.Command("Planimeter")
		cmd.Stdin = &in
		out, err := cmd.Output()
		if err != nil {
			t.Fatal(err)
		}
		m2, err := strconv.ParseFloat(strings.Fields(string(out))[2], 64)
		if err != nil {
			t.Fatalf("%s: %q", name, out)
		}
		closeTo(t, name, mustPolygon(t, closed(ring)).AreaKm2(), math.Abs(m2)/1e6, 1e-6)
	}
}

// TestAreaDoesNotDependOnHowARingIsWritten turns, reverses and doubles positions.
func TestAreaDoesNotDependOnHowARingIsWritten(t *testing.T) {
	r := seeded(t)
	for range 100 {
		ring := star(r, anyCentre(r), 4+r.IntN(30), math.Pow(10, -4*r.Float64()), 0.3)
		p := mustPolygon(t, ring)
		k := 1 + r.IntN(len(ring)-2)
		turned := closed(append(slices.Clone(ring[k:len(ring)-1]), ring[:k]...))
		back := slices.Clone(ring)
		slices.Reverse(back)
		doubled := slices.Insert(slices.Clone(ring), k, ring[k])
		for name, other := range map[string][]LonLat{"turned": turned, "reversed": back, "doubled": doubled} {
			o := mustPolygon(t, other)
			closeTo(t, name, o.AreaKm2(), p.AreaKm2(), 1e-9)
			c, rad := p.Cap()
			for range 20 {
				if v := near(r, c, min(1.5, rad)); o.Contains(v) != p.Contains(v) {
					t.Errorf("%s: %v is inside of one alone", name, v.LonLat())
				}
			}
		}
	}
}

// TestPartsAddUp divides polygons by a line through them.
func TestPartsAddUp(t *testing.T) {
	r := seeded(t)
	for range 100 {
		ring := star(r, anyCentre(r), 8+r.IntN(30), math.Pow(10, -3*r.Float64()), 0.6)
		whole := mustPolygon(t, ring)
		mid := whole.centre.LonLat()
		i, j := 0, (len(ring)-1)/2
		left := append(slices.Clone(ring[i:j+1]), mid)
		right := append(slices.Clone(ring[j:]), mid)
		a, errA := NewPolygon(closed(left))
		b, errB := NewPolygon(closed(right))
		if errA != nil || errB != nil { // the middle is not seen from both positions
			continue
		}
		closeTo(t, "two parts", a.AreaKm2()+b.AreaKm2(), whole.AreaKm2(), 1e-9)
		if v, over := a.Overlaps(b); over {
			t.Errorf("the parts overlap at %v", v.LonLat())
		}
		if _, over := a.Overlaps(whole); !over {
			t.Error("a part does not overlap the whole")
		}
	}
}

func TestHolesAreTakenOff(t *testing.T) {
	outer, hole := closed(places(0, 0, 10, 0, 10, 10, 0, 10)), closed(places(2, 2, 4, 2, 4, 4, 2, 4))
	closeTo(t, "with a hole", mustPolygon(t, outer, hole).AreaKm2(), mustPolygon(t, outer).AreaKm2()-mustPolygon(t, hole).AreaKm2(), 1e-12)
	for name, h := range map[string][]LonLat{
		"a hole that touches the ring with a corner": closed(places(0, 5, 4, 2, 4, 4)),
		"a hole along a side":                        closed(places(0, 2, 4, 2, 4, 4, 0, 4)),
	} {
		p := mustPolygon(t, outer, h)
		if p.Contains(FromLonLat(LonLat{3, 3})) || !p.Contains(FromLonLat(LonLat{8, 8})) {
			t.Errorf("%s: it is not left out", name)
		}
	}
}

// TestAreaOfAnyRingAgreesWithDice throws places at a cap around the ring.
func TestAreaOfAnyRingAgreesWithDice(t *testing.T) {
	r := rand.New(rand.NewPCG(7, 7))
	for range fewer(20) {
		s := anyShape(t, r)
		c, rad := s.Cap()
		sum, n := 0.0, 100000
		for range n {
			if v := inCap(r, c, rad); s.Contains(v) {
				sum += AreaDensity(v)
			}
		}
		cap := 2 * math.Pi * (1 - math.Cos(rad))
		got := sum / float64(n) * cap
		p := s.AreaKm2() / (cap * meanDensity)
		if sigma := math.Sqrt(p*(1-min(1, p))/float64(n)) * cap * meanDensity; math.Abs(got-s.AreaKm2()) > 5*sigma+1e-3*s.AreaKm2() {
			t.Errorf("%#v: %g km², by dice %g ± %g", s, s.AreaKm2(), got, sigma)
		}
	}
}
