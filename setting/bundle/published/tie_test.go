package published

import (
	"fmt"
	"slices"
	"testing"

	"nearmargin/setting/boundary"
	"nearmargin/setting/slab"
	"nearmargin/setting/sphere"
)

// meridian is a line along a meridian from 5° S to 5° N, so that its left is the
// west.
func meridian(t *testing.T, id string, lon float64, kind boundary.Type, west, east, sinks string) *boundary.Boundary {
	t.Helper()
	b, err := boundary.New(boundary.Spec{
		ID: id, Name: id, Type: kind, Left: west, Right: east, Subducting: sinks, SigmaKm: 1, Source: "made up", SourceStatus: boundary.FromMemory,
		Path: []sphere.LonLat{{Lon: lon, Lat: -5}, {Lon: lon, Lat: 5}},
	})
	if err != nil {
		t.Fatal(err)
	}
	return b
}

// eastward is a slab that dips to the east from a meridian, westward one to the
// west.
func eastward(t *testing.T, lon float64) slab.Surface { return dippingSlab(t, lon, lon+1, -1, 1) }
func westward(t *testing.T, lon float64) slab.Surface { return dippingSlab(t, lon, lon-1, 1, -1) }

// dippingSlab has its upper contour at one meridian and its lower at another; the
// slab deepens to the right of a contour.
func dippingSlab(t *testing.T, upper, lower, fromLat, toLat float64) slab.Surface {
	t.Helper()
	var cs []slab.Contour
	for i, lon := range []float64{upper, lower} {
		a, b := sphere.LonLat{Lon: lon, Lat: fromLat}, sphere.LonLat{Lon: lon, Lat: toLat}
		cs = append(cs, slab.Contour{DepthKm: 20 + 60*float64(i), SigmaKm: 1, Path: []sphere.LonLat{a, b}})
	}
	s, err := slab.NewContours(cs)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

func TestTies(t *testing.T) {
	sub, ccb := boundary.Subduction, boundary.ContinentalConvergent
	line := func(id string, lon float64, kind boundary.Type, west, east, sinks string) *boundary.Boundary {
		return meridian(t, id, lon, kind, west, east, sinks)
	}
	for _, c := range []struct {
		name    string
		lines   []*boundary.Boundary
		surface slab.Surface
		kind    slab.Kind
		known   Tie
		want    Tie
	}{
		{"from its trench", []*boundary.Boundary{line("a", 0, sub, "WW", "EE", "WW")}, eastward(t, 0.5), slab.Subduction, Tie{}, Tie{[]string{"a"}, "WW", "EE"}},
		{"the other way", []*boundary.Boundary{line("a", 0, sub, "WW", "EE", "EE")}, westward(t, -0.5), slab.Subduction, Tie{}, Tie{[]string{"a"}, "EE", "WW"}},
		{"a trench that dips the other way is no tie, though nearer", []*boundary.Boundary{line("a", 0, sub, "WW", "CC", "WW"), line("b", 0.4, sub, "CC", "EE", "EE")}, eastward(t, 0.5), slab.Subduction, Tie{}, Tie{[]string{"a"}, "WW", "CC"}},
		{"20 km seaward of the trench", []*boundary.Boundary{line("a", 0, sub, "WW", "EE", "WW")}, eastward(t, -0.18), slab.Subduction, Tie{}, Tie{[]string{"a"}, "WW", "EE"}},
		{"50 km seaward of the trench", []*boundary.Boundary{line("a", 0, sub, "WW", "EE", "WW")}, eastward(t, -0.45), slab.Subduction, Tie{}, Tie{nil, "EE", "EE"}},
		{"too far", []*boundary.Boundary{line("a", 0, sub, "WW", "EE", "WW")}, eastward(t, 1), slab.Subduction, Tie{}, Tie{nil, "EE", "EE"}},
		{"a ridge is no tie", []*boundary.Boundary{line("a", 0, boundary.SpreadingRidge, "WW", "EE", "")}, eastward(t, 0.5), slab.Subduction, Tie{}, Tie{nil, "EE", "EE"}},
		{"convergence where there is no trench", []*boundary.Boundary{line("a", 0, ccb, "WW", "EE", "")}, eastward(t, 0.5), slab.Subduction, Tie{}, Tie{[]string{"a"}, "WW", "EE"}},
		{"not where there is one", []*boundary.Boundary{line("a", 0, sub, "WW", "CC", "WW"), line("b", 0.3, ccb, "CC", "EE", "")}, eastward(t, 0.5), slab.Subduction, Tie{}, Tie{[]string{"a"}, "WW", "CC"}},
		{"but for a collision", []*boundary.Boundary{line("a", 0, sub, "WW", "CC", "WW"), line("b", 0.3, ccb, "CC", "EE", "")}, eastward(t, 0.5), slab.Collision, Tie{}, Tie{[]string{"b"}, "CC", "EE"}},
		{"known plates agree", []*boundary.Boundary{line("a", 0, ccb, "WW", "EE", "")}, eastward(t, 0.5), slab.Subduction, Tie{nil, "WW", "EE"}, Tie{[]string{"a"}, "WW", "EE"}},
		{"known plates would be exchanged", []*boundary.Boundary{line("a", 0, ccb, "WW", "EE", "")}, eastward(t, 0.5), slab.Subduction, Tie{nil, "EE", "WW"}, Tie{nil, "EE", "EE"}},
	} {
		n, err := boundary.NewNetwork(c.lines)
		if err != nil {
			t.Fatal(err)
		}
		got := Ties{n}.Of(c.surface, c.kind, c.known)
		if !slices.Equal(got.BoundaryIDs, c.want.BoundaryIDs) || got.Subducting != c.want.Subducting || got.Overriding != c.want.Overriding {
			t.Errorf("%s: %s, want %s", c.name, fmt.Sprint(got), fmt.Sprint(c.want))
		}
	}
}
