package boundary

import (
	"math"
	"testing"

	"github.com/golang/geo/s2"

	"nearmargin/setting/sphere"
)

// mmRad is a millimetre as an angle.
const mmRad = 1e-3 / 6371008.8

// TestNearestAgainstTwinAndS2 compares the distance on the sphere with that to
// every leg and with S2's closest edge.
func TestNearestAgainstTwinAndS2(t *testing.T) {
	r := seeded(t)
	n := mustNetwork(t, synthetic(r, 24))
	w, x := newTwin(n), newS2Index(n)
	places := manyPlaces()
	for range places {
		p := anyPlace(r, n)
		f, ok := n.nearest(n.all, p.Vec, filter{}, reachOf(maxChordSq))
		if !ok {
			t.Fatalf("nothing near %v", p.LonLat)
		}
		got := sphere.Angle(p.Vec, n.legs[f.leg].foot(p.Vec, f.where))
		if chord := 2 * math.Asin(math.Sqrt(f.chordSq)/2); math.Abs(chord-got) > mmRad {
			t.Fatalf("at %v: by chord %g rad, by foot %g", p.LonLat, chord, got)
		}
		if want := w.nearestRad(p.Vec, always); math.Abs(got-want) > mmRad {
			t.Fatalf("at %v: %.3f m, by the twin %.3f", p.LonLat, got*6371008.8, want*6371008.8)
		}
		// S2 chooses by squared chords, which are good to 1e-15: 0.2 m. The edge it
		// chose is measured again.
		e := x.nearest(s2Point(p.LonLat))
		arc, _ := sphere.NewArc(sphere.Vec(e.V0.Vector), sphere.Vec(e.V1.Vector))
		q, _ := arc.Nearest(p.Vec)
		if want := sphere.Angle(p.Vec, q); math.Abs(got-want) > mmRad {
			t.Fatalf("at %v: %.4f m, by S2 %.4f", p.LonLat, got*6371008.8, want*6371008.8)
		}
	}
	t.Logf("%d places", places)
}

// TestNearestWithLongLegs searches lines of a few legs of any length, whose caps
// may be larger than a hemisphere; there an arc may leave the cap of its ends.
func TestNearestWithLongLegs(t *testing.T) {
	r := seeded(t)
	for range 300 {
		var specs []Spec
		for len(specs) < 5+r.IntN(20) {
			a, b := anyVec(r), anyVec(r)
			if sphere.Angle(a, b) < 3.1 {
				specs = append(specs, spec(string(rune('a'+len(specs))), SpreadingRidge, "L", "R", a.LonLat(), b.LonLat()))
			}
		}
		n := mustNetwork(t, specs)
		w := newTwin(n)
		for range 50 {
			p := anyVec(r)
			f, _ := n.nearest(n.all, p, filter{}, reachOf(maxChordSq))
			got := 2 * math.Asin(math.Sqrt(f.chordSq)/2)
			if want := w.nearestRad(p, always); math.Abs(got-want) > mmRad {
				t.Fatalf("at %v: %g rad, by the twin %g, in %v", p.LonLat(), got, want, specs)
			}
		}
	}
}

// TestLocateAgainstTwin compares the whole answer: plate, distance on the
// ellipsoid, and which boundary wins a tie.
func TestLocateAgainstTwin(t *testing.T) {
	r := seeded(t)
	n := mustNetwork(t, synthetic(r, 24))
	w := newTwin(n)
	vertexTies, nearTies, told := 0, 0, 0
	places := manyPlaces() / 2
	for range places {
		p := anyPlace(r, n)
		plate, h := n.Locate(p)
		bounds := func(b *Boundary) bool { return b.Left() == plate || b.Right() == plate }
		if !bounds(h.Boundary) {
			t.Fatalf("at %v: %s does not bound %s", p.LonLat, h.Boundary.ID(), plate)
		}
		list, leastKm := w.contenders(p, bounds)
		if math.Abs(h.DistanceKm-leastKm) > 2e-9 {
			t.Fatalf("at %v: %.10f km to %s, the least is %.10f", p.LonLat, h.DistanceKm, h.Boundary.ID(), leastKm)
		}
		checkHit(t, p, h)
		if len(list) > 1 {
			nearTies++
		}
		if leastKm < 1e-4 { // a vertex under foot: no line of sight
			continue
		}
		if want := expect(list, leastKm); want != nil {
			told++
			if h.Boundary != want {
				t.Fatalf("at %v: %s, by the rule %s; contenders %+v", p.LonLat, h.Boundary.ID(), want.ID(), list)
			}
			for _, c := range list {
				if c.b != want && c.km < leastKm+1e-9 {
					vertexTies++
					break
				}
			}
		}
	}
	t.Logf("%d places, %d with several contenders, %d told apart, %d of them ties between boundaries", places, nearTies, told, vertexTies)
	if vertexTies < places/100 || nearTies < places/10 || told < places/2 {
		t.Error("too few ties to say anything")
	}
}

// checkHit checks what must agree within one answer.
func checkHit(t *testing.T, p Place, h Hit) {
	t.Helper()
	if d := pathDistanceKm(h.Boundary.Path(), h.Nearest); d > 1e-6 {
		t.Fatalf("at %v: the nearest point %v is %g km off %s", p.LonLat, h.Nearest, d, h.Boundary.ID())
	}
	km, az := sphere.Inverse(p.LonLat, h.Nearest)
	if math.Abs(km-h.DistanceKm) > 1e-9 {
		t.Fatalf("at %v: distance %.12f, to the nearest point %.12f", p.LonLat, h.DistanceKm, km)
	}
	if math.IsNaN(h.AzimuthDeg) != (h.DistanceKm < 1e-6) {
		t.Fatalf("at %v: azimuth %g at %g km", p.LonLat, h.AzimuthDeg, h.DistanceKm)
	}
	if !math.IsNaN(h.AzimuthDeg) && (az != h.AzimuthDeg || az < 0 || az >= 360) {
		t.Fatalf("at %v: azimuth %g, by the nearest point %g", p.LonLat, h.AzimuthDeg, az)
	}
	if h.NearestVec.LonLat() != h.Nearest || math.Abs(h.Along.Norm()-1) > 1e-12 || math.Abs(h.Along.Dot(h.NearestVec)) > 1e-12 {
		t.Fatalf("at %v: vectors %v, %v do not go with %v", p.LonLat, h.NearestVec, h.Along, h.Nearest)
	}
	if got := h.NearestVec.Azimuth(h.Along); got != h.PathAzimuthDeg || got < 0 || got >= 360 {
		t.Fatalf("at %v: path azimuth %g, by the vector %g", p.LonLat, h.PathAzimuthDeg, got)
	}
	if line := h.BoundaryAzimuthDeg(); line < 0 || line >= 180 || math.Abs(math.Sin((line-h.PathAzimuthDeg)*math.Pi/180)) > 1e-12 {
		t.Fatalf("at %v: boundary azimuth %g does not go with path azimuth %g", p.LonLat, line, h.PathAzimuthDeg)
	}
}

// Directions read aloud.
func TestLocateReadAloud(t *testing.T) {
	n := mustNetwork(t, []Spec{spec("ridge", SpreadingRidge, "WEST", "EAST", at(-20, -10), at(-20, 0), at(-20, 10))})
	plate, h := n.Locate(PlaceAt(at(-18, 0)))
	if plate != "EAST" {
		t.Errorf("two degrees east of a line that runs north is on its right hand: EAST, not %s", plate)
	}
	if math.Abs(h.AzimuthDeg-270) > 1e-9 {
		t.Errorf("the line lies to the west of the place: azimuth 270, not %g", h.AzimuthDeg)
	}
	if kmBetween(h.Nearest, at(-20, 0)) > 1e-9 || h.PathAzimuthDeg != 0 || h.BoundaryAzimuthDeg() != 0 {
		t.Errorf("nearest %v, path azimuth %g; want -20, 0 and north", h.Nearest, h.PathAzimuthDeg)
	}
	if want := 6378.137 * 2 * math.Pi / 180; math.Abs(h.DistanceKm-want) > 1e-9 {
		t.Errorf("2° of the equator are %.6f km, want %.6f", h.DistanceKm, want)
	}
	if plate, _ := n.Locate(PlaceAt(at(-22, 3))); plate != "WEST" {
		t.Errorf("two degrees west of it is WEST, not %s", plate)
	}
	south := mustNetwork(t, []Spec{spec("ridge", SpreadingRidge, "EAST", "WEST", at(-20, 10), at(-20, 0), at(-20, -10))})
	plate, h = south.Locate(PlaceAt(at(-18, 0)))
	if plate != "EAST" || h.PathAzimuthDeg != 180 || h.BoundaryAzimuthDeg() != 0 {
		t.Errorf("the line written southward: %s, path azimuth %g, line %g; want EAST, 180, 0", plate, h.PathAzimuthDeg, h.BoundaryAzimuthDeg())
	}
}

// corner is a node on the equator at which one line arrives from the west and
// another leaves to the north-east. Seen from azimuths between 135 and 180 the
// node is the nearest point of both.
func corner(t *testing.T, idWest, idNorthEast string) *Network {
	return mustNetwork(t, []Spec{
		spec(idWest, SpreadingRidge, "N", "S", at(-5, 0), at(0, 0)),
		spec(idNorthEast, SpreadingRidge, "N", "S", at(0, 0), at(5, 5)),
	})
}

func TestTieAtSharedVertex(t *testing.T) {
	// the azimuth at the node of the line to the north-east
	ne, _ := sphere.NewArc(sphere.FromLonLat(at(0, 0)), sphere.FromLonLat(at(5, 5)))
	neDeg := ne.A.Azimuth(ne.Tangent(ne.A))
	bisectorDeg := (neDeg + 90 + 180) / 2
	tests := []struct {
		name string
		az   float64 // from the node to the place
		want string
	}{
		{"square to the line to the north-east", neDeg + 91, "north-east"},
		{"more squarely to the line to the north-east", bisectorDeg - 1, "north-east"},
		{"more squarely to the line to the west", bisectorDeg + 1, "west"},
		{"square to the line to the west", 179, "west"},
		{"equally: the lower id", bisectorDeg, "lower id"},
	}
	for _, ids := range [][2]string{{"a", "b"}, {"b", "a"}} {
		n := corner(t, ids[0], ids[1])
		want := map[string]string{"west": ids[0], "north-east": ids[1], "lower id": "a"}
		for _, tt := range tests {
			for _, km := range []float64{0.1, 1, 50, 400} {
				sin, cos := math.Sincos(tt.az * math.Pi / 180)
				off := math.Tan(sphere.KmToRad(km))
				p := PlaceAt(sphere.Vec{X: 1, Y: off * sin, Z: off * cos}.Unit().LonLat())
				plate, h := n.Locate(p)
				if got := h.Boundary.ID(); got != want[tt.want] {
					t.Errorf("west is %q: %s, %g km: %q, want %q", ids[0], tt.name, km, got, want[tt.want])
				}
				if plate != "S" || h.Nearest != at(0, 0) {
					t.Errorf("%s, %g km: plate %s, nearest %v; want S and the node", tt.name, km, plate, h.Nearest)
				}
				h, _ = n.NearestOf(p, SpreadingRidge, "", AnyRole, 1000)
				if got := h.Boundary.ID(); got != want[tt.want] {
					t.Errorf("NearestOf, west is %q: %s, %g km: %q, want %q", ids[0], tt.name, km, got, want[tt.want])
				}
			}
		}
	}
}

// Two boundaries that meet on one great circle, seen from a place square to it
// at the node: rounding may say anything, the lower id must win.
func TestTieOnStraightLine(t *testing.T) {
	r := seeded(t)
	for range 2000 {
		v, d := anyVec(r), anyVec(r)
		side := v.Cross(d).Unit()
		dir := side.Cross(v)
		before, after := v.Sub(dir.Scale(0.1)).Unit(), v.Add(dir.Scale(0.2)).Unit()
		n := mustNetwork(t, []Spec{
			spec("b", SpreadingRidge, "L", "R", before.LonLat(), v.LonLat()),
			spec("a", SpreadingRidge, "L", "R", v.LonLat(), after.LonLat()),
		})
		p := PlaceAt(v.Add(side.Scale(0.05 * math.Pow(10, -2*r.Float64()))).Unit().LonLat())
		if _, h := n.Locate(p); h.Boundary.ID() != "a" {
			t.Fatalf("node %v seen from %v: boundary %s, want a", v.LonLat(), p.LonLat, h.Boundary.ID())
		}
	}
}

// In nearTieNetwork the place 0, 0 lies on the equator between a line to the north, which the
// sphere takes for the farther one, and a line to the east. On the ellipsoid a
// degree of latitude is shorter there than one of longitude, by 0.67 %.
func nearTieNetwork(t *testing.T, typ Type) *Network {
	return mustNetwork(t, []Spec{
		spec("north", typ, "Q", "P", at(-0.5, 1), at(0, 1), at(0.5, 1)),
		spec("east", typ, "R", "P", at(0.997, 0.5), at(0.997, -0.5)),
	})
}

func TestNearTieIsComparedOnTheEllipsoid(t *testing.T) {
	n := nearTieNetwork(t, SpreadingRidge)
	p := PlaceAt(at(0, 0))
	f, _ := n.nearest(n.all, p.Vec, filter{}, reachOf(maxChordSq))
	if got := n.idOf(f.leg); got != "east" {
		t.Fatalf("nearest on the sphere is %s; the case needs it to be east", got)
	}
	check := func(how string, h Hit) {
		t.Helper()
		// a degree of the meridian from the equator: 110.574 km; 0.997° of the equator: 110.985 km
		if h.Boundary.ID() != "north" || math.Abs(h.DistanceKm-110.574) > 0.001 {
			t.Errorf("%s: %s at %.3f km, want north at 110.574", how, h.Boundary.ID(), h.DistanceKm)
		}
		if h.AzimuthDeg != 0 || h.Nearest != at(0, 1) {
			t.Errorf("%s: azimuth %g to %v, want 0 to 0, 1", how, h.AzimuthDeg, h.Nearest)
		}
	}
	_, h := n.Locate(p)
	check("Locate", h)
	h, ok := n.NearestOf(p, SpreadingRidge, "", AnyRole, 500)
	if !ok {
		t.Fatal("NearestOf finds nothing")
	}
	check("NearestOf", h)
	// within a limit that only the line to the north keeps
	h, ok = n.NearestOf(p, SpreadingRidge, "P", Bounding, 110.7)
	if !ok {
		t.Fatal("NearestOf finds nothing within 110.7 km")
	}
	check("NearestOf within 110.7 km", h)
	if h, ok := n.NearestOf(p, SpreadingRidge, "R", Bounding, 500); !ok || h.Boundary.ID() != "east" {
		t.Errorf("the nearest that bounds R is %v, %v; want east", h.Boundary, ok)
	}
}

// A line that does not bound the plate under the place cannot be the nearest,
// however the ellipsoid compares.
func TestNearTieKeepsToThePlate(t *testing.T) {
	n := mustNetwork(t, []Spec{
		spec("north", SpreadingRidge, "X", "Q", at(-0.5, 1), at(0, 1), at(0.5, 1)),
		spec("east", SpreadingRidge, "R", "P", at(0.997, 0.5), at(0.997, -0.5)),
	})
	plate, h := n.Locate(PlaceAt(at(0, 0)))
	if plate != "P" || h.Boundary.ID() != "east" {
		t.Errorf("plate %s, boundary %s; want P and east", plate, h.Boundary.ID())
	}
}

func TestDistanceZero(t *testing.T) {
	r := seeded(t)
	n := mustNetwork(t, synthetic(r, 24))
	for range 3000 {
		l := &n.legs[r.IntN(len(n.legs))]
		b := n.boundaries[l.boundary]
		p := PlaceAt(l.arc.At(0.01 + 0.98*r.Float64()).LonLat())
		plate, h := n.Locate(p)
		if h.Boundary != b || h.DistanceKm > 1e-8 || !math.IsNaN(h.AzimuthDeg) {
			t.Fatalf("on %s at %v: %s, %g km, azimuth %g; want the line itself, 0 and NaN", b.ID(), p.LonLat, h.Boundary.ID(), h.DistanceKm, h.AzimuthDeg)
		}
		if plate != b.Left() && plate != b.Right() {
			t.Fatalf("on %s: plate %s is not one of its two", b.ID(), plate)
		}
		if math.IsNaN(h.PathAzimuthDeg) {
			t.Fatalf("on %s: the line has no azimuth", b.ID())
		}
	}
}

// Whatever the seam, one place has one answer.
func TestLocateSameForEveryLongitudeSpelling(t *testing.T) {
	r := seeded(t)
	n := mustNetwork(t, synthetic(r, 24))
	for range 500 {
		lat := 180*r.Float64() - 90
		plate, h := n.Locate(PlaceAt(at(180, lat)))
		for _, p := range []sphere.LonLat{at(-180, lat), at(540, lat)} {
			if plate2, h2 := n.Locate(PlaceAt(p)); plate2 != plate || !sameHit(h, h2) {
				t.Fatalf("%v gives %s and %+v, longitude 180 %s and %+v", p, plate2, h2, plate, h)
			}
		}
		pole := 90 * float64(2*r.IntN(2)-1)
		plate, h = n.Locate(PlaceAt(at(0, pole)))
		if plate2, h2 := n.Locate(PlaceAt(at(360*r.Float64()-180, pole))); plate2 != plate || h2.Boundary != h.Boundary || h2.DistanceKm != h.DistanceKm {
			t.Fatalf("a pole gives %s, with another longitude %s", plate, plate2)
		}
	}
}

func TestSearchDoesNotAllocate(t *testing.T) {
	r := seeded(t)
	n := mustNetwork(t, synthetic(r, 100))
	places := make([]Place, 256)
	for i := range places {
		places[i] = anyPlace(r, n)
	}
	i := 0
	next := func() Place { i++; return places[i%len(places)] }
	if got := testing.AllocsPerRun(1000, func() { n.Locate(next()) }); got != 0 {
		t.Errorf("Locate allocates %g times", got)
	}
	if got := testing.AllocsPerRun(1000, func() { n.NearestOf(next(), Subduction, "NA", Overriding, 5000) }); got != 0 {
		t.Errorf("NearestOf allocates %g times", got)
	}
}

// The twin's S2 half must itself be right: its closest edge by its own distance.
func TestS2TwinAgreesWithItself(t *testing.T) {
	r := seeded(t)
	n := mustNetwork(t, synthetic(r, 12))
	x := newS2Index(n)
	for range 200 {
		p := s2Point(anyPlace(r, n).LonLat)
		got := s2.DistanceFromSegment(p, x.nearest(p).V0, x.nearest(p).V1)
		for _, line := range x.lines {
			for i := range line.NumEdges() {
				if e := line.Edge(i); s2.DistanceFromSegment(p, e.V0, e.V1) < got-1e-7 {
					t.Fatalf("edge %v is nearer than S2's closest", e)
				}
			}
		}
	}
}
