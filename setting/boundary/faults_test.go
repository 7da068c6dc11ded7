package boundary

import (
	"fmt"
	"math"
	"slices"
	"strings"
	"testing"

	"nearmargin/setting/sphere"
)

// kmBetween is the distance on the sphere.
func kmBetween(a, b sphere.LonLat) float64 {
	return sphere.RadToKm(sphere.Angle(sphere.FromLonLat(a), sphere.FromLonLat(b)))
}

func faultsOf(list []Fault, code string) []Fault {
	var out []Fault
	for _, f := range list {
		if f.Code == code {
			out = append(out, f)
		}
	}
	return out
}

func codesOf(list []Fault) []string {
	var out []string
	for _, f := range list {
		out = append(out, f.Code)
	}
	slices.Sort(out)
	return slices.Compact(out)
}

// hasFault checks that a fault of the code lies within 1 m of the place, and
// that its text names each of the words.
func hasFault(t *testing.T, list []Fault, code string, where sphere.LonLat, words ...string) {
	t.Helper()
	found := faultsOf(list, code)
	for _, f := range found {
		if kmBetween(f.At, where) > 0.001 {
			continue
		}
		for _, w := range words {
			if !strings.Contains(f.Detail, w) {
				t.Errorf("%s at %v: %q does not name %s", code, f.At, f.Detail, w)
			}
		}
		return
	}
	t.Errorf("no fault %s at %v; there are %v of it, and of all kinds %v", code, where, found, codesOf(list))
}

// broken returns a clean network's specifications, and the index of the boundary
// of that id.
func broken(t *testing.T, id string) ([]Spec, int) {
	t.Helper()
	specs := synthetic(seeded(t), 24)
	for i := range specs {
		specs[i].Path = slices.Clone(specs[i].Path)
	}
	i := slices.IndexFunc(specs, func(s Spec) bool { return s.ID == id })
	if i < 0 {
		t.Fatalf("no boundary %q", id)
	}
	return specs, i
}

func TestFaultOpenEnd(t *testing.T) {
	specs, i := broken(t, "e00-1")
	last := len(specs[i].Path) - 1
	node, end := specs[i].Path[last], specs[i].Path[last-1]
	specs[i].Path = specs[i].Path[:last]
	got := mustNetwork(t, specs).Faults()
	hasFault(t, got, FaultOpenEnd, end, `"e00-1"`)
	hasFault(t, got, FaultOpenEnd, node) // the line that it met stands alone now
	if len(got) != 2 {
		t.Errorf("faults %v, want the two open ends alone", got)
	}
}

func TestFaultPlates(t *testing.T) {
	specs, i := broken(t, "e00-1")
	s := &specs[i]
	if s.Left == "NA" {
		s.Left = "SB"
	} else {
		s.Right = "SB"
	}
	s.Type, s.Subducting = SpreadingRidge, ""
	got := mustNetwork(t, specs).Faults()
	for _, end := range []sphere.LonLat{s.Path[0], s.Path[len(s.Path)-1]} {
		hasFault(t, got, FaultPlates, end, `"e00-1"`, "NA", "SB", "azimuth")
	}
	if codes := codesOf(got); !slices.Equal(codes, []string{FaultPlates}) {
		t.Errorf("faults %v, want plates alone", codes)
	}
}

func TestFaultPlatesOneLineSwapped(t *testing.T) {
	specs, i := broken(t, "e00-1")
	specs[i].Left, specs[i].Right = specs[i].Right, specs[i].Left
	got := mustNetwork(t, specs).Faults()
	for _, end := range []sphere.LonLat{specs[i].Path[0], specs[i].Path[len(specs[i].Path)-1]} {
		hasFault(t, got, FaultPlates, end, `"e00-1"`)
	}
	if len(got) != 4 { // two sectors at each of two nodes
		t.Errorf("%d faults, want 4: %v", len(got), got)
	}
}

func TestFaultCrossing(t *testing.T) {
	specs, i := broken(t, "e00-3") // the equator's last part before 90° east
	s := &specs[i]
	k := len(s.Path) / 2
	s.Path[k] = at(95, 12) // over the line along 90° east
	n := mustNetwork(t, specs)
	got := faultsOf(n.Faults(), FaultCrossing)
	if len(got) != 2 {
		t.Fatalf("%d crossings, want one on the way there and one on the way back: %v", len(got), n.Faults())
	}
	for _, f := range got {
		if !strings.Contains(f.Detail, `"e00-3"`) {
			t.Errorf("%q does not name the line", f.Detail)
		}
		// the place lies on both of the lines that the text names
		for _, b := range n.Boundaries() {
			if strings.Contains(f.Detail, fmt.Sprintf("%q", b.ID())) {
				if d := pathDistanceKm(b.Path(), f.At); d > 1e-6 {
					t.Errorf("the crossing at %v is %g km off %q", f.At, d, b.ID())
				}
			}
		}
	}
}

// pathDistanceKm is the distance on the sphere from a place to a path, leg by leg.
func pathDistanceKm(path []sphere.LonLat, p sphere.LonLat) float64 {
	v, best := sphere.FromLonLat(p), math.Inf(1)
	for i := 1; i < len(path); i++ {
		s, _ := sphere.NewArc(sphere.FromLonLat(path[i-1]), sphere.FromLonLat(path[i]))
		q, _ := s.Nearest(v)
		best = min(best, sphere.RadToKm(sphere.Angle(v, q)))
	}
	return best
}

func TestFaultTouch(t *testing.T) {
	specs, i := broken(t, "e00-3")
	j := slices.IndexFunc(specs, func(s Spec) bool { return slices.Contains(s.Path, at(90, 0)) && s.ID[:3] == "e05" })
	if j < 0 {
		t.Fatal("no line north from 90° east")
	}
	// put a vertex of the equator's line on the middle of a leg of the other
	other := specs[j].Path
	a, _ := sphere.NewArc(sphere.FromLonLat(other[2]), sphere.FromLonLat(other[3]))
	s := &specs[i]
	k := len(s.Path) / 2
	s.Path[k] = a.Midpoint().LonLat()
	got := mustNetwork(t, specs).Faults()
	hasFault(t, got, FaultTouch, s.Path[k], `"e00-3"`, fmt.Sprintf("%q", specs[j].ID))
}

// Lines that come within 10 m touch, wherever on the globe; at 12 m they do not.
func TestFaultTouchEverywhere(t *testing.T) {
	m := 1 / 111195. // a metre in degrees of a great circle
	tests := []struct {
		name string
		line [2]sphere.LonLat
		foot sphere.LonLat // on the line
		az   float64       // away from it
	}{
		{"on the equator", [2]sphere.LonLat{at(10, 0), at(12, 0)}, at(11, 0), 0},
		{"across the antimeridian, line on it", [2]sphere.LonLat{at(180, -1), at(180, 1)}, at(180, 0), 90},
		{"across the antimeridian, line west of it", [2]sphere.LonLat{at(180-4*m, -1), at(180-4*m, 1)}, at(180-4*m, 0), 90},
		{"across the antimeridian, line east of it", [2]sphere.LonLat{at(-180+4*m, -1), at(-180+4*m, 1)}, at(-180+4*m, 0), 270},
		{"200 m from the North Pole", [2]sphere.LonLat{at(30, 88), at(30, 89.9982)}, at(30, 89.998), 90},
		{"over the South Pole", [2]sphere.LonLat{at(30, -89), at(-150, -89)}, at(0, -90), 120},
		{"at 84° north", [2]sphere.LonLat{at(0, 83), at(0, 85)}, at(0, 84), 270},
	}
	for _, tt := range tests {
		for _, metres := range []float64{8, 12} {
			t.Run(fmt.Sprintf("%s, %g m", tt.name, metres), func(t *testing.T) {
				v := sphere.FromLonLat(tt.foot)
				east, north := v.EastNorth()
				sin, cos := math.Sincos(tt.az * math.Pi / 180)
				away := east.Scale(sin).Add(north.Scale(cos))
				p := v.Add(away.Scale(metres / 6371008.8)).Unit().LonLat()
				far := v.Add(away.Scale(0.01)).Unit().LonLat()
				n := mustNetwork(t, []Spec{
					spec("line", SpreadingRidge, "A", "B", tt.line[0], tt.line[1]),
					spec("toucher", SpreadingRidge, "A", "B", p, far),
				})
				got := n.Faults()
				if metres > 10 {
					if touch := faultsOf(got, FaultTouch); len(touch) != 0 {
						t.Errorf("touch at %g m: %v", metres, touch)
					}
					return
				}
				hasFault(t, got, FaultTouch, p, `"line"`, `"toucher"`)
			})
		}
	}
}

func TestFaultDisconnected(t *testing.T) {
	specs, _ := broken(t, "e00-1")
	// a ring of its own, in the middle of North A
	ring := spec("island", SpreadingRidge, "IS", "NA", at(40, 40), at(45, 40), at(45, 45), at(40, 40))
	got := mustNetwork(t, append(specs, ring)).Faults()
	hasFault(t, got, FaultDisconnected, at(40, 40), `"island"`, "1 in all")
	if len(got) != 1 {
		t.Errorf("faults %v, want one", got)
	}
}

func TestFaultAreas(t *testing.T) {
	specs, _ := broken(t, "e00-1")
	for i := range specs {
		specs[i].Left, specs[i].Right = specs[i].Right, specs[i].Left
	}
	n := mustNetwork(t, specs)
	got := n.Faults()
	// the plates around every junction disagree as well; what explains it comes first
	if codes := codesOf(got); !slices.Equal(codes, []string{FaultAreas, FaultPlates}) || got[0].Code != FaultAreas {
		t.Fatalf("faults %v, want areas, then plates", codes)
	}
	hasFault(t, got, FaultAreas, n.Boundaries()[0].Path()[0], "8.0000 times", "left and right are exchanged")
}

func TestFaultCoincident(t *testing.T) {
	specs, i := broken(t, "e00-1")
	for _, way := range []string{"same way", "other way"} {
		t.Run(way, func(t *testing.T) {
			twin := specs[i]
			twin.ID = "twin"
			twin.Path = slices.Clone(twin.Path)
			if way == "other way" {
				slices.Reverse(twin.Path)
				twin.Left, twin.Right = twin.Right, twin.Left
			}
			got := mustNetwork(t, append(slices.Clone(specs), twin)).Faults()
			if n := len(faultsOf(got, FaultCoincident)); n != len(twin.Path)-1 {
				t.Errorf("%d coincident legs, want %d", n, len(twin.Path)-1)
			}
			a, _ := sphere.NewArc(sphere.FromLonLat(twin.Path[0]), sphere.FromLonLat(twin.Path[1]))
			hasFault(t, got, FaultCoincident, a.Midpoint().LonLat(), `"twin"`, `"e00-1"`)
		})
	}
}

func TestFaultsAreBounded(t *testing.T) {
	specs, _ := broken(t, "e00-1")
	for _, s := range slices.Clone(specs) {
		s.ID += "-twin"
		specs = append(specs, s)
	}
	n := mustNetwork(t, specs)
	got := len(faultsOf(n.Faults(), FaultCoincident))
	if got <= maxFaultsOfAKind || got >= n.NumLegs()/2 {
		t.Errorf("%d faults of a kind of %d; want a little more than %d", got, n.NumLegs()/2, maxFaultsOfAKind)
	}
}

// A single closed ring is a network: an island plate in a sea plate.
func TestClosedRingHasNoFaults(t *testing.T) {
	n := mustNetwork(t, []Spec{spec("ring", Subduction, "IS", "SEA", at(175, -5), at(-175, -5), at(-175, 5), at(175, 5), at(175, -5))})
	if got := n.Faults(); got != nil {
		t.Errorf("faults %v, want none", got)
	}
	for _, tt := range []struct {
		p    sphere.LonLat
		want string
	}{{at(180, 0), "IS"}, {at(0, 0), "SEA"}, {at(174, -6), "SEA"}, {at(175.1, -4.9), "IS"}, {at(180, -5.1), "SEA"}, {at(-176, 4), "IS"}} {
		if got, _ := n.Locate(PlaceAt(tt.p)); got != tt.want {
			t.Errorf("%v is on %s, want %s", tt.p, got, tt.want)
		}
	}
}

// A pole is one place, whatever longitudes the lines that meet there give it.
func TestPoleIsOneNode(t *testing.T) {
	n := mustNetwork(t, []Spec{
		spec("a", SpreadingRidge, "C", "A", at(0, 60), at(0, 90)),
		spec("b", SpreadingRidge, "A", "B", at(120, 60), at(120, 90)),
		spec("c", SpreadingRidge, "B", "C", at(-120, 60), at(-120, 90)),
		spec("d", SpreadingRidge, "A", "S", at(0, 60), at(120, 60)),
		spec("e", SpreadingRidge, "B", "S", at(120, 60), at(-120, 60)),
		spec("f", SpreadingRidge, "C", "S", at(-120, 60), at(0, 60)),
	})
	for _, f := range n.Faults() {
		t.Errorf("%s at %v: %s", f.Code, f.At, f.Detail)
	}
	for _, tt := range []struct {
		lon  float64
		want string
	}{{60, "A"}, {180, "B"}, {-60, "C"}, {1, "A"}, {-1, "C"}, {119, "A"}, {121, "B"}} {
		if got, _ := n.Locate(PlaceAt(at(tt.lon, 89.9999))); got != tt.want {
			t.Errorf("11 m from the Pole on %g°: %s, want %s", tt.lon, got, tt.want)
		}
	}
}

func TestPlateAreas(t *testing.T) {
	n := mustNetwork(t, synthetic(seeded(t), 60))
	areas := n.PlateAreasKm2()
	sum := 0.0
	for code, km2 := range areas {
		sum += km2
		want := 4 * math.Pi * 6371.0072 * 6371.0072 * plateLoop(t, n, code).Area() / (4 * math.Pi)
		if math.Abs(km2/want-1) > 1e-9 {
			t.Errorf("plate %s has %.3f km², by S2 %.3f", code, km2, want)
		}
	}
	if len(areas) != 9 {
		t.Errorf("%d areas, want 9", len(areas))
	}
	// WGS84's surface is 510,065,622 km² (NIMA TR8350.2, from memory)
	if math.Abs(sum-510065622) > 50 {
		t.Errorf("the plates cover %.0f km², the Earth has 510,065,622", sum)
	}
}

func TestJunctions(t *testing.T) {
	n := mustNetwork(t, synthetic(seeded(t), 24))
	want := map[sphere.LonLat]string{
		at(0, 90):  "NA NB NC ND",
		at(0, -90): "SA SB SC SD",
		at(0, 0):   "NA ND SA SD",
		at(90, 0):  "NA NB SA SB",
		at(180, 0): "NB NC SB SC",
		at(-90, 0): "NC ND SC SD",
	}
	triple := 0
	for _, j := range n.Junctions() {
		plates := strings.Join(j.Plates, " ")
		if w, ok := want[j.At]; ok {
			if plates != w {
				t.Errorf("at %v meet %s, want %s", j.At, plates, w)
			}
			delete(want, j.At)
			continue
		}
		// the tips of the lens, on the antimeridian at 30° and 60° north, or so
		if plates != "MI NB NC" || math.Abs(sphere.WrapLon(j.At.Lon-180)) > 8 || min(math.Abs(j.At.Lat-30), math.Abs(j.At.Lat-60)) > 1 {
			t.Errorf("an unexpected junction at %v of %s", j.At, plates)
		}
		triple++
	}
	if triple != 2 || len(want) != 0 {
		t.Errorf("%d tips of the lens, want 2; missing %v", triple, want)
	}
}
