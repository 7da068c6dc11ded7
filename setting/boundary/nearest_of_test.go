package boundary

import (
	"fmt"
	"math"
	"testing"
)

func TestNearestOfRoles(t *testing.T) {
	// three trenches north of the place, the nearest first
	n := mustNetwork(t, []Spec{
		{ID: "a", Name: "A", Type: Subduction, Left: "P", Right: "Q", Subducting: "P", SigmaKm: 5, Source: "made up", SourceStatus: FromMemory, Path: path(1)},
		{ID: "b", Name: "B", Type: Subduction, Left: "P", Right: "Q", Subducting: "Q", SigmaKm: 5, Source: "made up", SourceStatus: FromMemory, Path: path(2)},
		{ID: "c", Name: "C", Type: Subduction, Left: "Q", Right: "R", Subducting: "R", SigmaKm: 5, Source: "made up", SourceStatus: FromMemory, Path: path(3)},
		{ID: "d", Name: "D", Type: OceanicConvergent, Left: "P", Right: "Q", SigmaKm: 5, Source: "made up", SourceStatus: FromMemory, Path: path(4)},
		{ID: "e", Name: "E", Type: OceanicConvergent, Left: "Q", Right: "P", Subducting: "P", SigmaKm: 5, Source: "made up", SourceStatus: FromMemory, Path: path(5)},
	})
	tests := []struct {
		typ   Type
		plate string
		role  Role
		maxKm float64
		want  string // "" for none
	}{
		{Subduction, "", AnyRole, 1000, "a"},
		{Subduction, "nobody", AnyRole, 1000, "a"},
		{Subduction, "P", Bounding, 1000, "a"},
		{Subduction, "R", Bounding, 1000, "c"},
		{Subduction, "P", Subducting, 1000, "a"},
		{Subduction, "Q", Subducting, 1000, "b"},
		{Subduction, "R", Subducting, 1000, "c"},
		{Subduction, "Q", Overriding, 1000, "a"},
		{Subduction, "P", Overriding, 1000, "b"},
		{Subduction, "R", Overriding, 1000, ""},
		{Subduction, "nobody", Bounding, 1000, ""},
		{OceanicConvergent, "P", Overriding, 1000, ""}, // nothing is known to go down at d
		{OceanicConvergent, "Q", Overriding, 1000, "e"},
		{OceanicConvergent, "P", Subducting, 1000, "e"},
		{OceanicConvergent, "P", Bounding, 1000, "d"},
		{SpreadingRidge, "", AnyRole, math.Inf(1), ""},
		{Unknown, "", AnyRole, math.Inf(1), ""},
		{Subduction, "", AnyRole, 110.57, ""}, // a degree from the equator is 110.574 km
		{Subduction, "", AnyRole, 110.6, "a"},
		{Subduction, "Q", Subducting, 221.14, ""},
		{Subduction, "Q", Subducting, 221.2, "b"},
		{Subduction, "", AnyRole, 0, ""},
		{Subduction, "", AnyRole, -5, ""},
		{Subduction, "R", Bounding, math.Inf(1), "c"},
	}
	for _, tt := range tests {
		t.Run(fmt.Sprintf("%v of %s, role %d, %g km", tt.typ, tt.plate, tt.role, tt.maxKm), func(t *testing.T) {
			h, ok := n.NearestOf(PlaceAt(at(0, 0)), tt.typ, tt.plate, tt.role, tt.maxKm)
			if ok != (tt.want != "") {
				t.Fatalf("found = %v (%+v), want %q", ok, h, tt.want)
			}
			if ok && h.Boundary.ID() != tt.want {
				t.Errorf("boundary %s, want %s", h.Boundary.ID(), tt.want)
			}
			if !ok && h != (Hit{}) {
				t.Errorf("nothing found, but the answer is %+v", h)
			}
		})
	}
}

func TestNearestOfAgainstTwin(t *testing.T) {
	r := seeded(t)
	n := mustNetwork(t, synthetic(r, 24))
	w := newTwin(n)
	plates := n.Plates()
	found := map[Role]int{}
	places := manyPlaces() / 5
	for range places {
		p := anyPlace(r, n)
		typ := AllTypes[r.IntN(len(AllTypes))]
		plate := plates[r.IntN(len(plates))]
		role := []Role{AnyRole, Bounding, Overriding, Subducting}[r.IntN(4)]
		maxKm := []float64{100, 1000, 5000, 25000}[r.IntN(4)]
		keep := func(b *Boundary) bool {
			if b.Type() != typ {
				return false
			}
			across, bounds := b.Opposite(plate)
			switch role {
			case AnyRole:
				return true
			case Bounding:
				return bounds
			case Overriding:
				return bounds && b.Subducting() == across
			default:
				return bounds && b.Subducting() == plate
			}
		}
		list, leastKm := w.contenders(p, keep)
		h, ok := n.NearestOf(p, typ, plate, role, maxKm)
		if math.Abs(leastKm-maxKm) < 1e-6 {
			continue
		}
		if ok != (leastKm <= maxKm) {
			t.Fatalf("%v of %s, role %d, within %g km of %v: found = %v, the least is %g km", typ, plate, role, maxKm, p.LonLat, ok, leastKm)
		}
		if !ok {
			continue
		}
		found[role]++
		if !keep(h.Boundary) || math.Abs(h.DistanceKm-leastKm) > 2e-9 {
			t.Fatalf("%v of %s, role %d at %v: %s at %.10f km, the least is %.10f", typ, plate, role, p.LonLat, h.Boundary.ID(), h.DistanceKm, leastKm)
		}
		checkHit(t, p, h)
		if leastKm < 1e-4 {
			continue
		}
		if want := expect(list, leastKm); want != nil && want != h.Boundary {
			t.Fatalf("%v of %s, role %d at %v: %s, by the rule %s", typ, plate, role, p.LonLat, h.Boundary.ID(), want.ID())
		}
	}
	t.Logf("%d places, found by role: %v", places, found)
	for _, role := range []Role{AnyRole, Bounding, Overriding, Subducting} {
		if found[role] < places/200 {
			t.Errorf("role %d was found %d times only", role, found[role])
		}
	}
}

// The nearest boundary of all is the nearest of its type.
func TestNearestOfAgreesWithLocate(t *testing.T) {
	r := seeded(t)
	n := mustNetwork(t, synthetic(r, 24))
	for range manyPlaces() / 5 {
		p := anyPlace(r, n)
		plate, h := n.Locate(p)
		got, ok := n.NearestOf(p, h.Boundary.Type(), plate, Bounding, math.Inf(1))
		if !ok || got.DistanceKm > h.DistanceKm+1e-9 || got.DistanceKm < h.DistanceKm-1e-9 {
			t.Fatalf("at %v: %s at %g km, of its type %s at %g", p.LonLat, h.Boundary.ID(), h.DistanceKm, got.Boundary.ID(), got.DistanceKm)
		}
	}
}
