package boundary

import (
	"fmt"
	"math"
	"reflect"
	"slices"
	"strings"
	"testing"
)

func TestNewNetworkErrors(t *testing.T) {
	mk := func(id, left, right string) *Boundary {
		b, err := New(spec(id, SpreadingRidge, left, right, at(0, 0), at(1, 1)))
		if err != nil {
			t.Fatal(err)
		}
		return b
	}
	var crowd []*Boundary
	for i := range 126 {
		crowd = append(crowd, mk(fmt.Sprintf("b%03d", i), fmt.Sprintf("L%03d", i), fmt.Sprintf("R%03d", i)))
	}
	tests := []struct {
		name string
		list []*Boundary
		want string
	}{
		{"empty", nil, "no boundaries"},
		{"an id twice", []*Boundary{mk("a", "X", "Y"), mk("b", "X", "Y"), mk("a", "Y", "Z")}, `boundary "a": the id stands twice`},
		{"251 plates", append(crowd[:125:125], mk("x", "L000", "X")), "251 plates; 250 are the limit"},
		{"252 plates", crowd, "252 plates; 250 are the limit"},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			n, err := NewNetwork(tt.list)
			if err == nil || !strings.Contains(err.Error(), tt.want) {
				t.Fatalf("error %v, want one with %q", err, tt.want)
			}
			if n != nil {
				t.Error("a network comes with the error")
			}
		})
	}
	n, err := NewNetwork(crowd[:125])
	if err != nil {
		t.Fatalf("250 plates: %v", err)
	}
	for _, p := range []string{"L000", "R124"} {
		if got := n.plates[n.plateIndex(p)]; got != p {
			t.Errorf("with 250 plates %s has the index of %s", p, got)
		}
	}
}

func TestNetworkAccessors(t *testing.T) {
	specs := []Spec{
		spec("c", Subduction, "P", "Q", at(0, 0), at(1, 0), at(2, 0)),
		spec("a", SpreadingRidge, "R", "Q", at(2, 0), at(3, 0)),
		spec("b", OceanicTransform, "R", "P", at(5, 5), at(5, 6), at(5, 7), at(5, 8)),
	}
	n := mustNetwork(t, specs)
	var ids []string
	for _, b := range n.Boundaries() {
		ids = append(ids, b.ID())
	}
	if !slices.Equal(ids, []string{"a", "b", "c"}) {
		t.Errorf("boundaries %v, want them sorted by id", ids)
	}
	if got := n.Plates(); !slices.Equal(got, []string{"P", "Q", "R"}) {
		t.Errorf("plates %v, want P, Q, R", got)
	}
	if got := n.NumLegs(); got != 6 {
		t.Errorf("%d legs, want 6", got)
	}
	n.Boundaries()[0] = nil
	n.Plates()[0] = "X"
	if n.Boundaries()[0] == nil || n.Plates()[0] != "P" {
		t.Error("the network shares its lists with the caller")
	}
	if b, ok := n.Boundary("b"); !ok || b.ID() != "b" {
		t.Errorf("Boundary(b) = %v, %v", b, ok)
	}
	if b, ok := n.Boundary("z"); ok || b != nil {
		t.Errorf("Boundary(z) = %v, %v; there is none", b, ok)
	}
}

// TestOrderIndependence builds one network from shuffled lists: every answer is
// the same, bit for bit.
func TestOrderIndependence(t *testing.T) {
	r := seeded(t)
	specs := synthetic(r, 24)
	first := mustNetwork(t, specs)
	places := make([]Place, 2000)
	for i := range places {
		places[i] = anyPlace(r, first)
	}
	places = append(places, PlaceAt(at(0, 90)), PlaceAt(at(180, 0)), PlaceAt(at(0, 0)))
	for range 3 {
		r.Shuffle(len(specs), func(i, j int) { specs[i], specs[j] = specs[j], specs[i] })
		other := mustNetwork(t, specs)
		for _, p := range places {
			plate1, h1 := first.Locate(p)
			plate2, h2 := other.Locate(p)
			if plate1 != plate2 || !sameHit(h1, h2) {
				t.Fatalf("at %v: %s and %+v, shuffled %s and %+v", p.LonLat, plate1, h1, plate2, h2)
			}
			h1, ok1 := first.NearestOf(p, SpreadingRidge, "", AnyRole, 5000)
			h2, ok2 := other.NearestOf(p, SpreadingRidge, "", AnyRole, 5000)
			if ok1 != ok2 || ok1 && !sameHit(h1, h2) {
				t.Fatalf("nearest ridge at %v: %+v, shuffled %+v", p.LonLat, h1, h2)
			}
		}
		if !reflect.DeepEqual(first.Junctions(), other.Junctions()) {
			t.Error("junctions differ")
		}
		if a, b := first.PlateAreasKm2(), other.PlateAreasKm2(); !reflect.DeepEqual(a, b) {
			t.Errorf("areas %v, shuffled %v", a, b)
		}
	}
}

func sameHit(a, b Hit) bool {
	azimuths := a.AzimuthDeg == b.AzimuthDeg || math.IsNaN(a.AzimuthDeg) && math.IsNaN(b.AzimuthDeg)
	return azimuths && a.Boundary.ID() == b.Boundary.ID() && a.DistanceKm == b.DistanceKm && a.Nearest == b.Nearest &&
		a.PathAzimuthDeg == b.PathAzimuthDeg && a.NearestVec == b.NearestVec && a.Along == b.Along
}
