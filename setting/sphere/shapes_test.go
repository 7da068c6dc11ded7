package sphere

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"
)

// places pairs up numbers as longitude and latitude.
func places(numbers ...float64) (ring []LonLat) {
	for i := 0; i+1 < len(numbers); i += 2 {
		ring = append(ring, LonLat{numbers[i], numbers[i+1]})
	}
	return ring
}

// closed repeats the first position at the end.
func closed(ring []LonLat) []LonLat { return append(slices.Clone(ring), ring[0]) }

func mustPolygon(tb testing.TB, rings ...[]LonLat) *Polygon {
	tb.Helper()
	p, err := NewPolygon(rings...)
	if err != nil {
		tb.Fatal(err)
	}
	return p
}

func mustQuad(tb testing.TB, west, south, east, north float64) *Quad {
	tb.Helper()
	q, err := NewQuad(west, south, east, north)
	if err != nil {
		tb.Fatal(err)
	}
	return q
}

// star draws a ring around a place that meets every ray from it once: n
// positions between a part and all of a radius in radians.
func star(r *rand.Rand, c Vec, n int, rad, least float64) []LonLat {
	east, north := c.EastNorth()
	turn, sense := r.Float64(), 1.0
	if r.IntN(2) == 0 {
		sense = -1
	}
	var ring []LonLat
	for i := range n {
		t := 2 * math.Pi * (turn + sense*(float64(i)+0.8*r.Float64())/float64(n))
		d := rad * (least + (1-least)*r.Float64())
		v := c.Scale(math.Cos(d)).Add(east.Scale(math.Sin(d) * math.Cos(t))).Add(north.Scale(math.Sin(d) * math.Sin(t)))
		ring = append(ring, v.LonLat())
	}
	return closed(ring)
}

// fewer returns n, or a fifth of it in short mode.
func fewer(n int) int {
	if testing.Short() {
		return n / 5
	}
	return n
}

// anyCentre draws middles of shapes: anywhere, or close to a pole or ±180°.
func anyCentre(r *rand.Rand) Vec {
	switch r.IntN(4) {
	case 0:
		return near(r, Vec{Z: float64(2*r.IntN(2) - 1)}, 0.05)
	case 1:
		return FromLonLat(LonLat{180 + 2*r.Float64() - 1, 160*r.Float64() - 80})
	}
	return anyVec(r)
}

// anyShape draws a shape: a star, one with a hole, or a quad.
func anyShape(tb testing.TB, r *rand.Rand) Shape {
	tb.Helper()
	switch r.IntN(4) {
	case 0:
		south := 170*r.Float64() - 90
		return mustQuad(tb, 540*r.Float64()-180, south, 540*r.Float64()-180, min(90, south+1+100*r.Float64()))
	case 1:
		c, rad := anyCentre(r), math.Pow(10, -3*r.Float64())
		return mustPolygon(tb, star(r, c, 5+r.IntN(40), rad, 0.6), star(r, c, 5+r.IntN(20), rad*0.4, 0.3))
	}
	return mustPolygon(tb, star(r, anyCentre(r), 5+r.IntN(60), 1.2*math.Pow(10, -4*r.Float64()), 0.3))
}

// turnsAround reports whether a closed ring turns around v, by the sum of the
// angles at v between each position and the next.
func turnsAround(ring []Vec, v Vec) bool {
	east, north := v.EastNorth()
	sum := 0.0
	for i := 1; i < len(ring); i++ {
		a, b := ring[i-1], ring[i]
		d := math.Atan2(b.Dot(north), b.Dot(east)) - math.Atan2(a.Dot(north), a.Dot(east))
		sum += math.Remainder(d, 2*math.Pi)
	}
	return math.Abs(sum) > math.Pi
}

// holdsTwin is a second, slow opinion on whether a polygon holds a place; it is
// right for places within the hemisphere around the polygon.
func holdsTwin(p *Polygon, v Vec) bool {
	if v.Dot(p.centre) <= 0 || !turnsAround(p.rings[0], v) {
		return false
	}
	for _, hole := range p.rings[1:] {
		if turnsAround(hole, v) {
			return false
		}
	}
	return true
}

func TestContainsAgreesWithTurning(t *testing.T) {
	r := seeded(t)
	inside := 0
	for range 400 {
		p, ok := anyShape(t, r).(*Polygon)
		if !ok {
			continue
		}
		c, rad := p.Cap()
		for range 100 {
			v := near(r, c, min(1.5, 1.2*rad))
			got := p.Contains(v)
			if want := holdsTwin(p, v); got != want {
				t.Fatalf("ring %v: %v inside is %v, want %v", p.rings, v.LonLat(), got, want)
			}
			if got {
				inside++
			}
			if v.Dot(c) > 0 && p.Contains(v.Scale(-1)) {
				t.Fatalf("the antipode of %v is inside", v.LonLat())
			}
		}
	}
	if inside < 1000 {
		t.Errorf("only %d places were inside", inside)
	}
}

func TestQuadContains(t *testing.T) {
	for _, c := range []struct {
		name                     string
		west, south, east, north float64
		in, out                  []LonLat
	}{
		{"plain", 10, 20, 30, 40, places(20, 30, 11, 39, 380-360, 21), places(9, 30, 31, 30, 20, 19, 20, 41, -160, -30)},
		{"across ±180°", 170, -10, -170, 10, places(180, 0, -180, 0, 175, 9, -171, -9), places(0, 0, 169, 0, -169, 0)},
		{"longitudes of the second kind", 190, -10, 350, 10, places(-90, 0, -169, 0, -11, 0), places(0, 0, 180, 0)},
		{"around the pole", -180, 60, 180, 90, places(0, 90, 77, 61, 180, 80), places(0, 59, 0, -90)},
		{"wide", 0, -10, 300, 10, places(150, 0, 1, 0, -61, 0), places(-30, 0)},
		{"everything", -180, -90, 180, 90, places(0, 0, 180, 90, 12, -90), nil},
		{"everything from Greenwich", 0, -90, 360, 90, places(0, 0, 180, 90, -12, -80), nil},
	} {
		t.Run(c.name, func(t *testing.T) {
			q := mustQuad(t, c.west, c.south, c.east, c.north)
			centre, rad := q.Cap()
			for _, p := range c.in {
				if !q.Contains(FromLonLat(p)) {
					t.Errorf("%v is not inside", p)
				}
				if d := Angle(centre, FromLonLat(p)); d > rad {
					t.Errorf("%v is not in the cap", p)
				}
			}
			for _, p := range c.out {
				if q.Contains(FromLonLat(p)) {
					t.Errorf("%v is inside", p)
				}
			}
		})
	}
}

func TestQuadRefusals(t *testing.T) {
	for _, c := range []struct {
		name                     string
		west, south, east, north float64
	}{
		{"no height", 1, 2, 3, 2}, {"upside down", 1, 3, 2, 2}, {"no width", 1, 2, 1, 3}, {"no width at ±180°", 180, 2, -180, 3},
		{"beyond the pole", 1, 2, 3, 91}, {"beyond the west", -181, 0, 1, 1}, {"NaN", math.NaN(), 0, 1, 1}, {"NaN south", 0, math.NaN(), 1, 1},
	} {
		if q, err := NewQuad(c.west, c.south, c.east, c.north); err == nil {
			t.Errorf("%s: a quad of %g km²", c.name, q.AreaKm2())
		}
	}
}

// TestCutsPartAnArcByTheOutline walks along random arcs in small steps: what lies
// inside must agree, part by part, with the cuts.
func TestCutsPartAnArcByTheOutline(t *testing.T) {
	r := seeded(t)
	met := 0
	for range fewer(1500) {
		s := anyShape(t, r)
		c, rad := s.Cap()
		arc, ok := NewArc(near(r, c, min(1.5, 2*rad)), near(r, c, min(1.5, 2*rad)))
		if r.IntN(5) == 0 {
			arc, ok = NewArc(anyVec(r), anyVec(r))
		}
		if !ok {
			continue
		}
		cuts := s.Cuts(&arc, nil)
		inside, parts := 0.0, 0
		for part := range arc.Between(slices.Clone(cuts)) {
			if parts++; s.Contains(part.Midpoint()) {
				inside += part.Length()
			}
		}
		if parts > 1 {
			met++
		}
		const steps = 2000
		walked := 0
		for i := range steps {
			if s.Contains(arc.At((float64(i) + 0.5) / steps)) {
				walked++
			}
		}
		got, want := inside/arc.Length(), float64(walked)/steps
		if math.Abs(got-want) > (1+float64(parts))*0.5/steps+1e-9 {
			t.Fatalf("%#v: arc %v to %v: %g of it inside by %d parts, %g by walking", s, arc.A.LonLat(), arc.B.LonLat(), got, parts, want)
		}
	}
	if met < fewer(300) {
		t.Errorf("only %d arcs met an outline", met)
	}
}

// TestCutsAtAVertexAndAlongAnEdge: the meetings that a test for crossings misses.
func TestCutsAtAVertexAndAlongAnEdge(t *testing.T) {
	p := mustPolygon(t, closed(places(0, 0, 10, 0, 10, 10, 0, 10)))
	for _, c := range []struct {
		name       string
		from, to   LonLat
		insideDegs float64
	}{
		{"in through a corner", LonLat{-5, -5}, LonLat{5, 5}, 7},
		{"along the lower side", LonLat{-5, 0}, LonLat{15, 0}, math.NaN()},
		{"from a corner to the other", LonLat{0, 0}, LonLat{10, 10}, 14},
		{"touching a corner", LonLat{-5, 5}, LonLat{5, -5}, 0},
		{"beside it", LonLat{-5, 20}, LonLat{15, 20}, 0},
	} {
		arc, _ := NewArc(FromLonLat(c.from), FromLonLat(c.to))
		sum, whole, parts := 0.0, 0.0, 0
		for part := range arc.Between(p.Cuts(&arc, nil)) {
			whole += part.Length() * degPerRad
			parts++
			if p.Contains(part.Midpoint()) {
				sum += part.Length() * degPerRad
			}
			for _, v := range [...]Vec{part.A, part.B} {
				if math.IsNaN(c.insideDegs) && v != arc.A && v != arc.B && !near2(p.flat(v), p.flat(FromLonLat(LonLat{0, 0}))) && !near2(p.flat(v), p.flat(FromLonLat(LonLat{10, 0}))) {
					t.Errorf("%s: cut at %v, not at an end of the side", c.name, v.LonLat())
				}
			}
		}
		if math.IsNaN(c.insideDegs) && parts != 3 {
			t.Errorf("%s: %d parts, want 3: before the side, along it and after", c.name, parts)
		}
		if math.Abs(whole-arc.Length()*degPerRad) > 1e-9 {
			t.Errorf("%s: parts of %g° in all, want %g°", c.name, whole, arc.Length()*degPerRad)
		}
		if !math.IsNaN(c.insideDegs) && math.Abs(sum-c.insideDegs) > 0.2 {
			t.Errorf("%s: %g° inside, want about %g°", c.name, sum, c.insideDegs)
		}
	}
}

// TestSampleIsEvenByArea: places lie inside, and any part of a shape has its
// share of their weight.
func TestSampleIsEvenByArea(t *testing.T) {
	r := seeded(t)
	const n = 2000
	worst, sumSq, count := 0.0, 0.0, 0
	for range fewer(150) {
		s := anyShape(t, r)
		samples := s.Sample(n, nil)
		if len(samples) != n {
			t.Fatalf("%d places, want %d", len(samples), n)
		}
		total := 0.0
		for _, x := range samples {
			if !s.Contains(x.At) {
				t.Fatalf("%#v: %v is not inside", s, x.At.LonLat())
			}
			total += x.Weight
		}
		// the part within a cap, by throwing dice
		c, rad := s.Cap()
		mid := near(r, c, rad/2)
		cos := math.Cos(rad * (0.2 + 0.6*r.Float64()))
		part := 0.0
		for _, x := range samples {
			if x.At.Dot(mid) > cos {
				part += x.Weight
			}
		}
		in, all := 0.0, 0.0
		for range fewer(40000) {
			v := inCap(r, c, rad)
			if s.Contains(v) {
				w := AreaDensity(v)
				all += w
				if v.Dot(mid) > cos {
					in += w
				}
			}
		}
		if all < float64(fewer(4000))*AreaDensity(c) { // too few of the dice fell inside
			continue
		}
		d := part/total - in/all
		worst, sumSq, count = max(worst, math.Abs(d)), sumSq+d*d, count+1
	}
	bound := 0.004 // mostly of the dice
	if testing.Short() {
		bound *= math.Sqrt(5)
	}
	if rms := math.Sqrt(sumSq / float64(count)); count < fewer(60) || rms > bound || worst > 4.5*bound {
		t.Errorf("%d shapes: shares off by %.4f rms, %.4f at most", count, rms, worst)
	} else {
		t.Logf("%d shapes: shares off by %.4f rms, %.4f at most", count, rms, worst)
	}
}

// inCap draws a place evenly from a cap.
func inCap(r *rand.Rand, c Vec, rad float64) Vec {
	z := 1 - r.Float64()*(1-math.Cos(rad))
	sin, cos := math.Sincos(2 * math.Pi * r.Float64())
	east, north := c.EastNorth()
	h := math.Sqrt(1 - z*z)
	return c.Scale(z).Add(east.Scale(h * cos)).Add(north.Scale(h * sin))
}

// TestSampleOfSlivers: a shape a thousand times longer than wide loses no place.
func TestSampleOfSlivers(t *testing.T) {
	for name, p := range map[string]*Polygon{
		"straight":  mustPolygon(t, closed(places(0, 40, 30, 40, 30, 40.02, 0, 40.02))),
		"bent":      mustPolygon(t, closed(places(0, 0, 20, 0, 20, 20, 19.99, 20, 19.99, 0.01, 0, 0.01))),
		"with hole": mustPolygon(t, closed(places(0, 0, 20, 0, 20, 20, 0, 20)), closed(places(0.01, 0.01, 19.99, 0.01, 19.99, 19.99, 0.01, 19.99))),
		"tiny":      mustPolygon(t, closed(places(-70, -30, -70+1e-4, -30, -70+1e-4, -30+1e-4, -70, -30+1e-4))),
	} {
		samples := p.Sample(500, nil)
		if len(samples) != 500 {
			t.Errorf("%s: %d places, want 500", name, len(samples))
		}
		for _, s := range samples {
			if !p.Contains(s.At) {
				t.Errorf("%s: %v is not inside", name, s.At.LonLat())
			}
		}
	}
}

// TestSampleWeightsAreWGS84 compares the share north of a parallel with that of
// the ellipsoid, which differs from the sphere's.
func TestSampleWeightsAreWGS84(t *testing.T) {
	q := mustQuad(t, 0, 0, 90, 90)
	north, all := 0.0, 0.0
	for _, s := range q.Sample(100000, nil) {
		all += s.Weight
		if s.At.Z > math.Sin(45*radPerDeg) {
			north += s.Weight
		}
	}
	want := mustQuad(t, 0, 45, 90, 90).AreaKm2() / q.AreaKm2()
	sphere := 1 - math.Sin(45*radPerDeg)
	if math.Abs(north/all-want) > 2e-5 || math.Abs(want-sphere) < 5e-4 {
		t.Errorf("%.6f of the area north of 45°, want %.6f (on a sphere %.6f)", north/all, want, sphere)
	}
}
