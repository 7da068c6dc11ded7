package boundary

import (
	"math"
	"testing"

	"nearmargin/setting/sphere"
)

// plainRefine is refine without bounds, without the tree and without what has been
// measured before: it computes the geodesic to every rival among all legs.
func plainRefine(n *Network, p Place, passes func(*leg) bool, first found) (*Boundary, float64) {
	within := reachOfRad(chordAngle(first.chordSq)*(1+nearTie) + 1e-12)
	best, bestKm := first, math.Inf(1)
	for i := range n.legs {
		d, w := n.legs[i].chordSq(p.Vec)
		if d > within.chordSq || !passes(&n.legs[i]) {
			continue
		}
		other := found{int32(i), w, d}
		km, _ := sphere.Inverse(p.LonLat, n.legs[other.leg].foot(p.Vec, other.where).LonLat())
		if km < bestKm-coincideKm || km <= bestKm+coincideKm && n.squarer(p.Vec, other, best) {
			best, bestKm = other, km
		}
	}
	return n.boundaries[n.legs[best.leg].boundary], bestKm
}

// TestScreenChangesNothing compares boundaries found with and without screening,
// by the tree and by a look at every leg, with one set of sights for all
// questions about a place.
func TestScreenChangesNothing(t *testing.T) {
	r := seeded(t)
	n := mustNetwork(t, synthetic(r, 60))
	var s Sights
	within := 0
	for range 5000 {
		p := anyPlace(r, n)
		code, h := n.LocateWith(p, &s)
		side := n.plateIndex(code)
		first, _ := n.nearest(n.all, p.Vec, filter{}, reachOf(maxChordSq))
		bounding := filter{side, Bounding}
		b, km := plainRefine(n, p, bounding.passes, first)
		if h.Boundary != b || math.Abs(h.DistanceKm-km) > 2*coincideKm {
			t.Fatalf("at %v: %s at %.9f km, plainly %s at %.9f", p.LonLat, h.Boundary.ID(), h.DistanceKm, b.ID(), km)
		}
		for _, kind := range AllTypes {
			const maxKm = 1000
			got, ok := n.NearestOfWith(p, kind, code, Bounding, maxKm, &s)
			first, found := n.nearest(n.byType[kind], p.Vec, bounding, reachOf(maxChordSq))
			if !found {
				if ok {
					t.Fatalf("at %v: %s %s, plainly none", p.LonLat, kind, got.Boundary.ID())
				}
				continue
			}
			b, km := plainRefine(n, p, func(l *leg) bool { return l.kind == kind && bounding.passes(l) }, first)
			if ok != (km <= maxKm) || ok && (got.Boundary != b || math.Abs(got.DistanceKm-km) > 2*coincideKm) {
				t.Fatalf("at %v: %t, %s at %.9f km, plainly %s at %.9f", p.LonLat, ok, kind, got.DistanceKm, b.ID(), km)
			}
			if ok {
				within++
			}
			if h.Answers(kind, code, Bounding) && ok && got.Boundary != h.Boundary {
				t.Fatalf("at %v: the nearest %s is %s, and of all lines %s", p.LonLat, kind, got.Boundary.ID(), h.Boundary.ID())
			}
		}
	}
	if within < 1000 {
		t.Errorf("only %d boundaries within reach", within)
	}
}
