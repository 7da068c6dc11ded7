package boundary

import (
	"math"
	"math/rand/v2"
	"testing"

	"nearmargin/setting/sphere"
)

// anyArea draws a shape on a network: a star-shaped ring or a box.
func anyArea(tb testing.TB, r *rand.Rand, n *Network) sphere.Shape {
	tb.Helper()
	c := anyPlace(r, n).Vec
	if r.IntN(3) == 0 {
		at := c.LonLat()
		south := max(-90, at.Lat-1-30*r.Float64())
		q, err := sphere.NewQuad(at.Lon, south, sphere.WrapLon(at.Lon+1+60*r.Float64()), min(90, at.Lat+1))
		if err != nil {
			tb.Fatal(err)
		}
		return q
	}
	east, north := c.EastNorth()
	rad, k := math.Pow(10, -2.5*r.Float64()), 5+r.IntN(40)
	var ring []sphere.LonLat
	for i := range k {
		sin, cos := math.Sincos(2 * math.Pi * float64(i) / float64(k))
		d := rad * (0.4 + 0.6*r.Float64())
		ring = append(ring, c.Scale(math.Cos(d)).Add(east.Scale(math.Sin(d)*cos)).Add(north.Scale(math.Sin(d)*sin)).LonLat())
	}
	p, err := sphere.NewPolygon(append(ring, ring[0]))
	if err != nil {
		tb.Fatal(err)
	}
	return p
}

// TestInsideAgreesWithWalking walks along every boundary in small steps and adds
// up those inside.
func TestInsideAgreesWithWalking(t *testing.T) {
	r := seeded(t)
	n := mustNetwork(t, synthetic(r, 24))
	clipped, shapes := 0, 60
	if testing.Short() {
		shapes = 15
	}
	for range shapes {
		s := anyArea(t, r, n)
		got, want := map[string]float64{}, map[string]float64{}
		pieces := 0
		for p := range n.Inside(s) {
			got[p.Boundary.ID()] += p.LengthKm
			pieces++
		}
		const steps = 400
		for i := range n.legs {
			l := &n.legs[i]
			km, _ := sphere.Inverse(l.arc.A.LonLat(), l.arc.B.LonLat())
			for k := range steps {
				if s.Contains(l.arc.At((float64(k) + 0.5) / steps)) {
					want[n.boundaries[l.boundary].ID()] += km / steps
				}
			}
		}
		for id := range want {
			if _, ok := got[id]; !ok && want[id] > 5 {
				t.Errorf("%s: %.2f km by walking, none by clipping", id, want[id])
			}
		}
		for id, km := range got {
			// each end of a piece is off by half a step at the most, of legs up to 450 km
			if math.Abs(km-want[id]) > 0.6*float64(pieces)+0.003*km {
				t.Errorf("%s: %.3f km inside, %.3f by walking", id, km, want[id])
			}
			if km > 0 {
				clipped++
			}
		}
	}
	if clipped < shapes {
		t.Errorf("only %d boundaries were clipped", clipped)
	}
}

// TestInsideKnownLengths clips a meridian and the equator by boxes.
func TestInsideKnownLengths(t *testing.T) {
	n := mustNetwork(t, []Spec{
		spec("meridian", SpreadingRidge, "AA", "BB", at(10, -60), at(10, 0), at(10, 60)),
		spec("equator", SpreadingRidge, "BB", "CC", at(170, 0), at(-170, 0), at(-100, 0)),
	})
	box := func(w, s, e, north float64) sphere.Shape {
		q, err := sphere.NewQuad(w, s, e, north)
		if err != nil {
			t.Fatal(err)
		}
		return q
	}
	ring := func(path ...sphere.LonLat) sphere.Shape {
		p, err := sphere.NewPolygon(append(path, path[0]))
		if err != nil {
			t.Fatal(err)
		}
		return p
	}
	between := func(a, b sphere.LonLat) float64 {
		km, _ := sphere.Inverse(a, b)
		return km
	}
	for _, c := range []struct {
		name  string
		shape sphere.Shape
		want  map[string]float64
	}{
		{"across", box(5, 20, 15, 30), map[string]float64{"meridian": between(at(10, 20), at(10, 30))}},
		{"over a vertex", box(5, -20, 15, 30), map[string]float64{"meridian": between(at(10, -20), at(10, 30))}},
		{"to the end", box(5, 50, 15, 70), map[string]float64{"meridian": between(at(10, 50), at(10, 60))}},
		{"across ±180°", box(175, -5, -175, 5), map[string]float64{"equator": between(at(175, 0), at(-175, 0))}},
		{"twice in and out", ring(at(175, 5), at(-175, 5), at(-175, -5), at(-178, -5), at(-178, 2), at(178, 2), at(178, -5), at(175, -5)),
			map[string]float64{"equator": between(at(175, 0), at(178, 0)) + between(at(-178, 0), at(-175, 0))}},
		{"all of it", box(-180, -90, 180, 90), map[string]float64{"meridian": between(at(10, -60), at(10, 60)), "equator": between(at(170, 0), at(-170, 0)) + between(at(-170, 0), at(-100, 0))}},
		{"beside", box(11, 20, 15, 30), map[string]float64{}},
		{"in through a corner", ring(at(10, 20), at(11, 25), at(10, 30), at(9, 25)), map[string]float64{"meridian": between(at(10, 20), at(10, 30))}},
	} {
		got := map[string]float64{}
		for p := range n.Inside(c.shape) {
			got[p.Boundary.ID()] += p.LengthKm
		}
		for _, id := range []string{"meridian", "equator"} {
			if math.Abs(got[id]-c.want[id]) > 1e-6 {
				t.Errorf("%s: %.9f km of %s inside, want %.9f", c.name, got[id], id, c.want[id])
			}
		}
	}
}

func TestPlateAtIsThatOfLocate(t *testing.T) {
	r := seeded(t)
	n := mustNetwork(t, synthetic(r, 24))
	for range 5000 {
		p := anyPlace(r, n)
		want, hit := n.Locate(p)
		got, rad := n.PlateAt(p.Vec)
		if got != want {
			t.Fatalf("%v: plate %s, want %s", p.LonLat, got, want)
		}
		if d := sphere.RadToKm(rad); math.Abs(d-hit.DistanceKm) > 0.006*d+1e-6 {
			t.Fatalf("%v: %g km to the nearest boundary, want about %g", p.LonLat, d, hit.DistanceKm)
		}
	}
}

// TestNearestToOutline compares with a look-up from many places of the outline.
func TestNearestToOutline(t *testing.T) {
	r := seeded(t)
	n := mustNetwork(t, synthetic(r, 24))
	tried, onEdge := 0, 0
	for range 400 {
		s := anyArea(t, r, n)
		crossed := false
		for range n.Inside(s) {
			crossed = true
			break
		}
		if crossed {
			continue
		}
		tried++
		v, rad := n.NearestToOutline(s)
		want, atVertex := math.Inf(1), math.Inf(1)
		for _, ring := range s.Outline() {
			for i := 1; i < len(ring); i++ {
				arc, ok := sphere.NewArc(ring[i-1], ring[i])
				if !ok {
					continue
				}
				for k := range 30 {
					got, _ := n.nearest(n.all, arc.At(float64(k)/30), filter{}, reachOf(maxChordSq))
					d := 2 * math.Asin(math.Sqrt(got.chordSq)/2)
					if want = min(want, d); k == 0 {
						atVertex = min(atVertex, d)
					}
				}
			}
		}
		if rad > want+1e-12 || rad < want*0.9-1e-3 {
			t.Errorf("%.9f rad away, %.9f by walking", rad, want)
		}
		if rad < atVertex-1e-9 {
			onEdge++
		}
		got, _ := n.nearest(n.all, v, filter{}, reachOf(maxChordSq))
		if d := 2 * math.Asin(math.Sqrt(got.chordSq)/2); math.Abs(d-rad) > 1e-9 {
			t.Errorf("the place returned is %.9f rad away, not %.9f", d, rad)
		}
	}
	if tried < 40 || onEdge < 5 {
		t.Errorf("%d outlines tried, of which %d were nearest between positions", tried, onEdge)
	}
}
