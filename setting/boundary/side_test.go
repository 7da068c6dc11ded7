package boundary

import (
	"math"
	"testing"

	"github.com/golang/geo/s2"

	"nearmargin/setting/sphere"
)

// plateByS2 returns the plate whose ring contains p, by S2's exact predicates.
func plateByS2(t *testing.T, loops map[string]*s2.Loop, p sphere.LonLat) string {
	t.Helper()
	found := ""
	for code, loop := range loops {
		if loop.ContainsPoint(s2Point(p)) {
			if found != "" {
				t.Fatalf("%v lies in both %s and %s", p, found, code)
			}
			found = code
		}
	}
	if found == "" {
		t.Fatalf("%v lies in no plate", p)
	}
	return found
}

func plateLoops(t *testing.T, n *Network) map[string]*s2.Loop {
	loops := map[string]*s2.Loop{}
	for _, code := range n.Plates() {
		loops[code] = plateLoop(t, n, code)
	}
	return loops
}

// TestPlateAgainstS2 compares the side of the nearest line with the containment
// of the place in the rings of the plates, which knows nothing of nearness.
func TestPlateAgainstS2(t *testing.T) {
	r := seeded(t)
	n := mustNetwork(t, synthetic(r, 24))
	loops := plateLoops(t, n)
	places, atVertex, atNode := manyPlaces(), 0, 0
	for range places {
		p := anyPlace(r, n)
		f, _ := n.nearest(n.all, p.Vec, filter{}, reachOf(maxChordSq))
		if f.chordSq < 1e-24 { // 6 µm: on the line
			continue
		}
		if f.where != sphere.Inside {
			atVertex++
			if l := &n.legs[f.leg]; f.where == sphere.AtA && l.nodeA >= 0 || f.where == sphere.AtB && l.nodeB >= 0 {
				atNode++
			}
		}
		got, _ := n.Locate(p)
		if want := plateByS2(t, loops, p.LonLat); got != want {
			t.Fatalf("%v is on %s, by S2 on %s (nearest: part %d of leg %d at %g m)", p.LonLat, got, want, f.where, f.leg, math.Sqrt(f.chordSq)*6371008.8)
		}
	}
	t.Logf("%d places, nearest to a vertex %d times, to a node %d times", places, atVertex, atNode)
	if atVertex < places/20 || atNode < places/100 {
		t.Error("too few places nearest to a vertex or a node")
	}
}

// TestPlateAroundVertices goes around every vertex, node and tip at small
// distances.
func TestPlateAroundVertices(t *testing.T) {
	r := seeded(t)
	n := mustNetwork(t, synthetic(r, 24))
	loops := plateLoops(t, n)
	for i := range n.legs {
		v := n.legs[i].arc.A
		east, north := v.EastNorth()
		for range 24 {
			sin, cos := math.Sincos(2 * math.Pi * r.Float64())
			rad := math.Pow(10, -9+6*r.Float64()) // 6 mm to 6 km
			p := PlaceAt(v.Add(east.Scale(rad * sin)).Add(north.Scale(rad * cos)).Unit().LonLat())
			if f, _ := n.nearest(n.all, p.Vec, filter{}, reachOf(maxChordSq)); f.chordSq < 1e-24 {
				continue
			}
			got, _ := n.Locate(p)
			if want := plateByS2(t, loops, p.LonLat); got != want {
				t.Fatalf("%v, %g m from vertex %v, is on %s, by S2 on %s", p.LonLat, rad*6371008.8, v.LonLat(), got, want)
			}
		}
	}
}

// A sharp turn: where the vertex is the nearest point of both legs, the sign
// against one of them alone is wrong.
func TestPlateAtSharpTurn(t *testing.T) {
	for _, tt := range []struct {
		name string
		path []sphere.LonLat
	}{
		{"a spike to the east", []sphere.LonLat{at(0, 1), at(10, 0), at(0, -1)}},
		{"a spike over the antimeridian", []sphere.LonLat{at(175, 1), at(-175, 0), at(175, -1)}},
		{"a spike over the Pole", []sphere.LonLat{at(1, 80), at(180, 88), at(-1, 80)}},
	} {
		t.Run(tt.name, func(t *testing.T) {
			n := mustNetwork(t, []Spec{spec("spike", SpreadingRidge, "LEFT", "RIGHT", tt.path...)})
			tip := sphere.FromLonLat(tt.path[1])
			// away from the middle of the spike's foot, beyond the tip: outside
			foot := sphere.FromLonLat(tt.path[0]).Add(sphere.FromLonLat(tt.path[2])).Unit()
			ahead := tip.Sub(foot).Unit()
			across := tip.Cross(ahead).Unit()
			// the path turns clockwise around the foot where the foot is on its right
			a, _ := sphere.NewArc(sphere.FromLonLat(tt.path[0]), tip)
			want := "LEFT"
			if a.Side(foot) > 0 {
				want = "RIGHT"
			}
			for _, off := range []float64{-0.9, -0.5, -0.05, 0, 0.05, 0.5, 0.9} {
				for _, rad := range []float64{1e-6, 1e-4, 0.02} {
					p := PlaceAt(tip.Add(ahead.Scale(rad)).Add(across.Scale(rad * off)).Unit().LonLat())
					if got, _ := n.Locate(p); got != want {
						t.Errorf("%g ahead, %g across: %s, want %s", rad, off*rad, got, want)
					}
				}
			}
		})
	}
}

// A place on a line counts to the left plate, at a vertex as between two.
func TestPlateOnTheLineIsTheLeftOne(t *testing.T) {
	r := seeded(t)
	n := mustNetwork(t, synthetic(r, 24))
	for i := range n.legs {
		l := &n.legs[i]
		left := n.boundaries[l.boundary].Left()
		if l.nodeA < 0 {
			if got, h := n.Locate(PlaceAt(l.arc.A.LonLat())); got != left || h.DistanceKm > 1e-9 {
				t.Errorf("on a vertex of %s: plate %s at %g km, want %s at 0", h.Boundary.ID(), got, h.DistanceKm, left)
			}
		}
	}
}

// At a node itself the plate is that of the sector clockwise from north.
func TestPlateAtNode(t *testing.T) {
	r := seeded(t)
	n := mustNetwork(t, synthetic(r, 24))
	for i := range n.nodes {
		v := &n.nodes[i]
		got, h := n.Locate(PlaceAt(v.at))
		_, north := v.vec.EastNorth()
		want, _ := n.Locate(PlaceAt(v.vec.Add(north.Scale(1e-7)).Unit().LonLat()))
		if got != want {
			t.Errorf("at node %v: %s, but %s a little to the north of it", v.at, got, want)
		}
		if h.DistanceKm > 1e-9 || !math.IsNaN(h.AzimuthDeg) {
			t.Errorf("at node %v: %g km, azimuth %g; want 0 and NaN", v.at, h.DistanceKm, h.AzimuthDeg)
		}
	}
	// a line that leaves to the north exactly: the sector to the east of it
	n = mustNetwork(t, []Spec{
		spec("north", SpreadingRidge, "W", "E", at(0, 0), at(0, 5)),
		spec("south", SpreadingRidge, "W", "E", at(0, -5), at(0, 0)),
	})
	if got, _ := n.Locate(PlaceAt(at(0, 0))); got != "E" {
		t.Errorf("at a node with a line to the north: %s, want E, clockwise from north", got)
	}
}
