package boundary

import (
	"math"
	"testing"

	"github.com/golang/geo/s2"

	"nearmargin/setting/sphere"
)

// This file holds the slow and the foreign ways to the answers that the tests
// compare with.

// twinLeg is a leg as the twin sees it.
type twinLeg struct {
	arc sphere.Arc
	b   *Boundary
}

// twin answers by looking at every leg of every boundary.
type twin struct{ legs []twinLeg }

func newTwin(n *Network) *twin {
	w := &twin{}
	for _, b := range n.Boundaries() {
		path := b.Path()
		for i := 1; i < len(path); i++ {
			arc, _ := sphere.NewArc(sphere.FromLonLat(path[i-1]), sphere.FromLonLat(path[i]))
			w.legs = append(w.legs, twinLeg{arc, b})
		}
	}
	return w
}

// nearestRad returns the least angle from p to the legs that the filter keeps.
func (w *twin) nearestRad(p sphere.Vec, keep func(*Boundary) bool) float64 {
	best := math.Inf(1)
	for i := range w.legs {
		if l := &w.legs[i]; keep(l.b) {
			q, _ := l.arc.Nearest(p)
			best = min(best, sphere.Angle(p, q))
		}
	}
	return best
}

// contender is a boundary that may be the answer.
type contender struct {
	b      *Boundary
	km     float64 // along WGS84
	square float64 // the sine of the angle between the line and the line of sight
}

// contenders returns every leg that is kept and at most 1 % farther than the
// nearest on the sphere, with its distance on the ellipsoid.
func (w *twin) contenders(p Place, keep func(*Boundary) bool) (out []contender, leastKm float64) {
	limit := w.nearestRad(p.Vec, keep) * 1.01
	leastKm = math.Inf(1)
	for i := range w.legs {
		l := &w.legs[i]
		if !keep(l.b) {
			continue
		}
		q, _ := l.arc.Nearest(p.Vec)
		if sphere.Angle(p.Vec, q) > limit {
			continue
		}
		km, _ := sphere.Inverse(p.LonLat, q.LonLat())
		sight := q.Azimuth(p.Vec.Sub(q)) - q.Azimuth(l.arc.Tangent(q))
		out = append(out, contender{l.b, km, math.Abs(math.Sin(sight * math.Pi / 180))})
		leastKm = min(leastKm, km)
	}
	return out, leastKm
}

// expect returns the boundary that the stated rule gives: the least distance on
// the ellipsoid; among equals the most squarely met; then the lowest id. It is
// nil where the twin's rounding cannot tell.
func expect(list []contender, leastKm float64) *Boundary {
	const tie, surelyKm, surelySquare = 1e-9, 1e-8, 1e-7
	var best *contender
	for i := range list {
		c := &list[i]
		if c.km > leastKm+tie {
			if c.km < leastKm+surelyKm {
				return nil
			}
			continue
		}
		if best == nil {
			best = c
			continue
		}
		switch d := c.square - best.square; {
		case math.Abs(d) < 1e-11:
			if c.b.ID() < best.b.ID() {
				best = c
			}
		case c.b != best.b && math.Abs(d) < surelySquare:
			return nil
		case d > 0:
			best = c
		}
	}
	return best.b
}

func always(*Boundary) bool { return true }

// s2Index holds a network's lines for S2, github.com/golang/geo.
type s2Index struct {
	index *s2.ShapeIndex
	lines []*s2.Polyline
	query *s2.EdgeQuery
}

func s2Point(p sphere.LonLat) s2.Point {
	return s2.PointFromLatLng(s2.LatLngFromDegrees(p.Lat, p.Lon))
}

func newS2Index(n *Network) *s2Index {
	x := &s2Index{index: s2.NewShapeIndex()}
	for _, b := range n.Boundaries() {
		var line s2.Polyline
		for _, p := range b.Path() {
			line = append(line, s2Point(p))
		}
		x.lines = append(x.lines, &line)
		x.index.Add(&line)
	}
	x.index.Build()
	x.query = s2.NewClosestEdgeQuery(x.index, s2.NewClosestEdgeQueryOptions().MaxResults(1))
	return x
}

// nearest returns the edge that S2 finds nearest.
func (x *s2Index) nearest(p s2.Point) s2.Edge {
	r := x.query.FindEdges(s2.NewMinDistanceToPointTarget(p))
	return x.lines[r[0].ShapeID()].Edge(int(r[0].EdgeID()))
}

// plateLoop joins the boundaries of a plate to the ring around it, the plate on
// the left, as S2 wants its loops.
func plateLoop(tb testing.TB, n *Network, plate string) *s2.Loop {
	tb.Helper()
	next := map[sphere.LonLat][]sphere.LonLat{}
	var start sphere.LonLat
	for _, b := range n.Boundaries() {
		path := b.Path()
		switch plate {
		case b.Left():
		case b.Right():
			for i, j := 0, len(path)-1; i < j; i, j = i+1, j-1 {
				path[i], path[j] = path[j], path[i]
			}
		default:
			continue
		}
		if _, twice := next[path[0]]; twice {
			tb.Fatalf("plate %s touches itself at %v", plate, path[0])
		}
		next[path[0]] = path
		start = path[0]
	}
	var ring []s2.Point
	for p, runs := start, 0; ; runs++ {
		path, ok := next[p]
		if !ok || runs > len(next) {
			tb.Fatalf("the ring of plate %s is open at %v", plate, p)
		}
		for _, q := range path[:len(path)-1] {
			ring = append(ring, s2Point(q))
		}
		if p = path[len(path)-1]; p == start {
			break
		}
	}
	loop := s2.LoopFromPoints(ring)
	if err := loop.Validate(); err != nil {
		tb.Fatalf("plate %s: %v", plate, err)
	}
	return loop
}
