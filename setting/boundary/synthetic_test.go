package boundary

import (
	"flag"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"testing"
	"time"

	"nearmargin/setting/sphere"
)

var seedFlag = flag.Uint64("seed", 20030314, "seed of the random tests; 0 takes one from the clock")

// seeded returns a random source for one test and logs the seed that repeats it.
func seeded(tb testing.TB) *rand.Rand {
	tb.Helper()
	seed := *seedFlag
	if seed == 0 {
		seed = uint64(time.Now().UnixNano())
	}
	tb.Logf("random test: repeat with -seed %d", seed)
	return rand.New(rand.NewPCG(seed, 2))
}

func at(lon, lat float64) sphere.LonLat { return sphere.LonLat{Lon: lon, Lat: lat} }

// spec returns a valid specification to be varied.
func spec(id string, t Type, left, right string, path ...sphere.LonLat) Spec {
	s := Spec{ID: id, Name: "Line " + id, Type: t, Left: left, Right: right, SigmaKm: 5, Source: "made up", SourceStatus: FromMemory, Path: path}
	if t == Subduction {
		s.Subducting = right
	}
	return s
}

func mustNetwork(tb testing.TB, specs []Spec) *Network {
	tb.Helper()
	var list []*Boundary
	for _, s := range specs {
		b, err := New(s)
		if err != nil {
			tb.Fatal(err)
		}
		list = append(list, b)
	}
	n, err := NewNetwork(list)
	if err != nil {
		tb.Fatal(err)
	}
	return n
}

// synthetic is a closed network of nine plates: the octants of the globe, NA to
// ND and SA to SD from Greenwich eastward, divided by wavy and jittered lines,
// and the microplate MI, a lens on the antimeridian between 30° and 60° north.
// Four lines meet at each pole and at four places on the equator, three at each
// tip of the lens; the lines along 180° cross it many times over. Every line is
// cut into several boundaries of random types and directions.
func synthetic(r *rand.Rand, legsPerEdge int) []Spec {
	y := &synthesis{r: r, legs: legsPerEdge}
	corner := []sphere.LonLat{at(0, 0), at(90, 0), at(180, 0), at(-90, 0)}
	quarter := "ABCD"
	for i, from := range corner {
		east := quarter[i : i+1]
		west := quarter[(i+3)%4 : (i+3)%4+1]
		y.edge(from, corner[(i+1)%4], 0, 1, 0, "N"+east, "S"+east)
		y.edge(from, at(0, -90), 0, 1, 0, "S"+east, "S"+west)
		if i != 2 {
			y.edge(from, at(0, 90), 0, 1, 0, "N"+west, "N"+east)
			continue
		}
		y.edge(from, at(0, 90), 0, 1./3, 0, "N"+west, "N"+east)
		y.edge(from, at(0, 90), 1./3, 2./3, 0.12, "N"+west, "MI")
		y.edge(from, at(0, 90), 1./3, 2./3, -0.12, "MI", "N"+east)
		y.edge(from, at(0, 90), 2./3, 1, 0, "N"+west, "N"+east)
	}
	return y.specs
}

type synthesis struct {
	r     *rand.Rand
	legs  int // on a quarter of a great circle
	edges int
	specs []Spec
}

// edge adds the part between the fractions t0 and t1 of a quarter of a great
// circle from a to b, bulging to the left by the given angle in radians.
func (y *synthesis) edge(a, b sphere.LonLat, t0, t1, bulge float64, left, right string) {
	u, w := sphere.FromLonLat(a), sphere.FromLonLat(b)
	n := u.Cross(w)
	steps := max(6, int(math.Round(float64(y.legs)*(t1-t0))))
	step := (t1 - t0) * math.Pi / 2 / float64(steps)
	// parts of one quarter must bend alike
	phase := a.Lon + b.Lat
	path := make([]sphere.LonLat, steps+1)
	for i := range path {
		s := float64(i) / float64(steps)
		t := t0 + s*(t1-t0)
		envelope := math.Pow(math.Sin(math.Pi*t), 2)
		off := 0.06*envelope*math.Sin(9*t+phase) + bulge*math.Sin(math.Pi*s)
		along := t * math.Pi / 2
		if i > 0 && i < steps {
			off += 0.2 * step * (2*y.r.Float64() - 1)
			along += 0.2 * step * (2*y.r.Float64() - 1)
		}
		v := u.Scale(math.Cos(along)).Add(w.Scale(math.Sin(along)))
		p := v.Scale(math.Cos(off)).Add(n.Scale(math.Sin(off))).LonLat()
		path[i] = at(math.Round(p.Lon*1e6)/1e6, math.Round(p.Lat*1e6)/1e6)
	}
	if t0 == 0 { // the corners exactly
		path[0] = a
	}
	if t1 == 1 {
		path[steps] = b
	}
	runs := min(4, steps/2)
	for i := range runs {
		y.run(fmt.Sprintf("e%02d-%d", y.edges, i), path[i*steps/runs:(i+1)*steps/runs+1], left, right)
	}
	y.edges++
}

func (y *synthesis) run(id string, path []sphere.LonLat, left, right string) {
	path = slices.Clone(path)
	if y.r.IntN(2) == 0 {
		slices.Reverse(path)
		left, right = right, left
	}
	s := spec(id, AllTypes[y.r.IntN(len(AllTypes))], left, right, path...)
	if s.Type == Subduction || s.Type == OceanicConvergent && y.r.IntN(2) == 0 {
		s.Subducting = []string{left, right}[y.r.IntN(2)]
	}
	y.specs = append(y.specs, s)
}

// anyVec returns a unit vector, evenly spread over the sphere.
func anyVec(r *rand.Rand) sphere.Vec {
	z := 2*r.Float64() - 1
	sin, cos := math.Sincos(2 * math.Pi * r.Float64())
	h := math.Sqrt(1 - z*z)
	return sphere.Vec{X: h * cos, Y: h * sin, Z: z}
}

// nearby returns a place up to rad from v; half of them much nearer.
func nearby(r *rand.Rand, v sphere.Vec, rad float64) sphere.Vec {
	if r.IntN(2) == 0 {
		rad *= math.Pow(10, -7*r.Float64())
	}
	return v.Add(anyVec(r).Scale(math.Tan(rad) * r.Float64())).Unit()
}

// anyPlace draws places of every kind: near lines, vertices, poles and the
// antimeridian, on vertices, and anywhere.
func anyPlace(r *rand.Rand, n *Network) Place {
	l := &n.legs[r.IntN(len(n.legs))]
	var v sphere.Vec
	switch r.IntN(8) {
	case 0, 1: // within 300 km of a line
		v = nearby(r, l.arc.At(r.Float64()), 0.047)
	case 2: // near a vertex
		v = nearby(r, l.arc.A, 0.01)
	case 3: // near a node
		v = nearby(r, n.nodes[r.IntN(len(n.nodes))].vec, 0.02)
	case 4: // near a pole
		v = nearby(r, sphere.Vec{Z: float64(2*r.IntN(2) - 1)}, 0.1)
	case 5: // near the antimeridian
		return PlaceAt(at(180+math.Pow(10, 1-9*r.Float64())*float64(2*r.IntN(2)-1), 180*r.Float64()-90))
	default:
		v = anyVec(r)
	}
	return PlaceAt(v.LonLat())
}

// manyPlaces is how many random places a comparison takes.
func manyPlaces() int {
	if testing.Short() {
		return 3000
	}
	return 50000
}

func TestSyntheticNetworkIsClosed(t *testing.T) {
	r := seeded(t)
	for _, legs := range []int{12, 24, 100} {
		n := mustNetwork(t, synthetic(r, legs))
		for _, f := range n.Faults() {
			t.Errorf("%d legs an edge: %s at %v: %s", legs, f.Code, f.At, f.Detail)
		}
		if got := len(n.Plates()); got != 9 {
			t.Errorf("%d legs an edge: %d plates, want 9", legs, got)
		}
		crossings, polar := 0, 0
		for i := range n.legs {
			a, b := n.legs[i].arc.A.LonLat(), n.legs[i].arc.B.LonLat()
			if math.Abs(a.Lon-b.Lon) > 180 {
				crossings++
			}
			if math.Abs(a.Lat) == 90 || math.Abs(b.Lat) == 90 {
				polar++
			}
		}
		if crossings < 3 || polar != 8 {
			t.Errorf("%d legs an edge: %d legs cross ±180° and %d end at a pole; the tests need both", legs, crossings, polar)
		}
	}
}

// path is a line from west to east across Greenwich with a vertex at that
// latitude.
func path(lat float64) []sphere.LonLat {
	return []sphere.LonLat{at(-1, lat), at(0, lat), at(1, lat)}
}
