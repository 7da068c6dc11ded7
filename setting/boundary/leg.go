package boundary

import (
	"math"

	"nearmargin/setting/sphere"
)

// leg is one great-circle arc of a boundary, with all that the search reads.
type leg struct {
	arc      sphere.Arc
	boundary int32 // index into Network.boundaries
	nodeA    int32 // index into Network.nodes where A is an end of the boundary, else -1
	nodeB    int32
	left     uint8 // index into Network.plates
	right    uint8
	sinks    uint8 // the subducting plate, noPlate where none
	kind     Type
}

const noPlate = math.MaxUint8

func newLeg(arc sphere.Arc) leg {
	return leg{arc: arc}
}

// atEnd is how far beyond an end a foot must lie to count as inside the leg, as
// an angle: 6 nm, so that rounding does not take a place on a vertex, or one
// square to it, off the vertex.
const atEnd = 1e-15

// chordSq returns the square of the chord from p to the nearest point of the
// leg, a measure that grows with the distance and is exact for small ones.
func (l *leg) chordSq(p sphere.Vec) (float64, sphere.Where) {
	// along the arc's direction at the foot of p: A lies behind it and B before
	ahead := l.arc.N.Cross(p)
	if ahead.Dot(l.arc.A) < -atEnd && ahead.Dot(l.arc.B) > atEnd {
		h := p.Dot(l.arc.N)
		h2 := h * h
		// chord² = 2(1-cos d) with sin d = |h|, without the loss of digits in 1-cos
		return 2 * h2 / (1 + math.Sqrt(math.Max(0, 1-h2))), sphere.Inside
	}
	toA, toB := l.arc.A.Sub(p), l.arc.B.Sub(p)
	a, b := toA.Dot(toA), toB.Dot(toB)
	if a <= b {
		return a, sphere.AtA
	}
	return b, sphere.AtB
}

// foot returns the point of the leg that is nearest to p, given which part it
// lies on.
func (l *leg) foot(p sphere.Vec, w sphere.Where) sphere.Vec {
	switch w {
	case sphere.AtA:
		return l.arc.A
	case sphere.AtB:
		return l.arc.B
	}
	n := l.arc.N
	return p.Sub(n.Scale(n.Dot(p))).Unit()
}

// squareness returns how squarely the line of sight from p meets the leg at its
// point q: 1 at a right angle, 0 along it.
func (l *leg) squareness(p, q sphere.Vec) float64 {
	sight := p.Sub(q.Scale(p.Dot(q)))
	n := sight.Norm()
	if n == 0 {
		return 0
	}
	return math.Abs(sight.Dot(l.arc.N)) / n
}
