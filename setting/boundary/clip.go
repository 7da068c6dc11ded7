package boundary

import (
	"iter"
	"math"

	"nearmargin/setting/sphere"
)

// Piece is a part of a boundary's leg that lies inside a shape.
type Piece struct {
	Boundary *Boundary
	Arc      sphere.Arc // in the direction of the path
	LengthKm float64    // along WGS84
}

// Inside gives each part of the network's legs that lies inside a shape, in the
// order of the boundaries' ids and along their paths.
//
// Method: the legs that reach into the cap around the shape are cut where they
// may meet its outline; each part is inside or not as its middle is.
//
// Special cases: a part that runs along the outline, within rounding, may count
// either way.
//
// Accuracy: the cuts are good to 1 mm; lengths are those of geodesics between the
// ends of each part, as in [Boundary.LengthKm].
func (n *Network) Inside(s sphere.Shape) iter.Seq[Piece] {
	return func(yield func(Piece) bool) {
		centre, rad := s.Cap()
		var cuts []float64
		for _, i := range n.legsWithin(centre, rad) {
			l := &n.legs[i]
			cuts = s.Cuts(&l.arc, cuts[:0])
			for part := range l.arc.Between(cuts) {
				if !s.Contains(part.Midpoint()) {
					continue
				}
				km, _ := sphere.Inverse(part.A.LonLat(), part.B.LonLat())
				if !yield(Piece{n.boundaries[l.boundary], *part, km}) {
					return
				}
			}
		}
	}
}

// legsWithin returns the legs that may reach into a cap, in their order.
func (n *Network) legsWithin(centre sphere.Vec, rad float64) []int32 {
	within, q := reachOfRad(rad), round32(centre)
	in := make([]bool, len(n.legs))
	n.each(n.all, filter{}, func(c *capsule) bool { return c.beyond(c.axisSq(&q), within.chord) }, func(i int32) {
		if d, _ := n.legs[i].chordSq(centre); d <= within.chordSq {
			in[i] = true
		}
	})
	var out []int32
	for i := range in {
		if in[i] {
			out = append(out, int32(i))
		}
	}
	return out
}

// PlateAt returns the plate under a unit vector, as [Network.Locate] does, and the
// angle in radians to the nearest boundary, within which no other plate begins.
func (n *Network) PlateAt(p sphere.Vec) (plate string, clearRad float64) {
	first, _ := n.nearest(n.all, p, filter{}, reachOf(maxChordSq))
	return n.plates[n.side(p, first)], 2 * math.Asin(math.Min(1, math.Sqrt(first.chordSq)/2))
}

// NearestToOutline returns the place on an outline, a set of closed rings, that
// is nearest to the network, and the distance in radians. It is meant for
// outlines that no boundary crosses.
//
// Method: where two lines do not cross, they are nearest at a vertex of one of
// them. The vertices of the outline are looked up in the network; then those of
// the network that may be nearer still, against every edge of the outline.
func (n *Network) NearestToOutline(s sphere.Shape) (sphere.Vec, float64) {
	var best sphere.Vec
	var edges []sphere.Arc
	within := reachOf(maxChordSq)
	for _, ring := range s.Outline() {
		for i, v := range ring {
			if got, ok := n.nearest(n.all, v, filter{}, within); ok {
				best, within = v, reachOf(got.chordSq)
			}
			if i > 0 {
				if arc, ok := sphere.NewArc(ring[i-1], v); ok {
					edges = append(edges, arc)
				}
			}
		}
	}
	rad := 2 * math.Asin(math.Min(1, math.Sqrt(within.chordSq)/2))
	centre, capRad := s.Cap()
	for _, i := range n.legsWithin(centre, min(math.Pi, capRad+rad)) {
		l := &n.legs[i]
		for _, v := range [...]sphere.Vec{l.arc.A, l.arc.B} {
			if sphere.Angle(centre, v) < capRad+rad {
				best, rad = nearestEdge(edges, v, best, rad)
			}
		}
	}
	return best, rad
}

// nearestEdge returns the point of the edges that is nearest to v, where it is
// nearer than rad, else best and rad.
func nearestEdge(edges []sphere.Arc, v, best sphere.Vec, rad float64) (sphere.Vec, float64) {
	sin := math.Sin(min(rad, math.Pi/2))
	for i := range edges {
		if math.Abs(edges[i].N.Dot(v)) > sin { // the great circle is farther away
			continue
		}
		if q, _ := edges[i].Nearest(v); sphere.Angle(q, v) < rad {
			best, rad = q, sphere.Angle(q, v)
			sin = math.Sin(min(rad, math.Pi/2))
		}
	}
	return best, rad
}
