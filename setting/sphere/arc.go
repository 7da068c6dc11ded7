package sphere

import "math"

// Arc is the shorter great-circle arc from A to B, with what every question
// about it needs. The zero Arc is not valid; build one with [NewArc].
type Arc struct {
	A, B Vec
	// N is the unit normal A×B: it points to the left of someone who walks from A
	// to B.
	N Vec
}

// minArcRad is the shortest arc that has a direction: about 6 mm.
const minArcRad = 1e-9

// NewArc returns the arc from a to b, two unit vectors, and whether it has a
// direction: it has none where the two coincide (within 6 mm) or are antipodes.
func NewArc(a, b Vec) (Arc, bool) {
	// (a-b)×(a+b) = 2·a×b, and loses no digits where a and b are close together
	n := a.Sub(b).Cross(a.Add(b))
	l := n.Norm()
	if l < 2*minArcRad {
		return Arc{A: a, B: b}, false
	}
	n = n.Scale(1 / l)
	return Arc{A: a, B: b, N: n}, true
}

// Length returns the arc's length in radians.
func (s *Arc) Length() float64 { return Angle(s.A, s.B) }

// Where says which part of an arc is nearest to a place.
type Where uint8

// The parts of an arc.
const (
	Inside Where = iota // between the ends
	AtA                 // the first end
	AtB                 // the second end
)

// Nearest returns the point of the arc that is nearest to the unit vector p, and
// the part of the arc that it lies on.
//
// Method: the foot of the perpendicular from p onto the great circle, if it lies
// between the ends; else the nearer end.
//
// Special cases: where p is a pole of the great circle every point of the arc is
// equally far and A is returned.
//
// Accuracy: the distance is good to about 1e-15 rad; to 1e-10 rad within a
// millimetre of a pole of the great circle, and to 1e-8 rad where the nearest
// point is an end close to the antipode of p. The foot itself is good to
// 1e-15/sin δ, with δ the angle from p to the pole of the great circle.
func (s *Arc) Nearest(p Vec) (Vec, Where) {
	q := p.Sub(s.N.Scale(s.N.Dot(p)))
	if l := q.Norm(); l > 1e-10 {
		if s.A.Cross(q).Dot(s.N) > 0 && q.Cross(s.B).Dot(s.N) > 0 {
			// close to the pole of the circle q is short, and rounding has left a part
			// of it along N that counts: take it off again
			q = q.Scale(1 / l)
			return q.Sub(s.N.Scale(s.N.Dot(q))).Unit(), Inside
		}
	}
	if s.A.Sub(p).normSq() <= s.B.Sub(p).normSq() {
		return s.A, AtA
	}
	return s.B, AtB
}

func (v Vec) normSq() float64 { return v.Dot(v) }

// Tangent returns the unit vector along the arc, from A towards B, at its point q.
func (s *Arc) Tangent(q Vec) Vec { return s.N.Cross(q).Unit() }

// Side returns a positive number where p lies to the left of the arc's great
// circle, a negative one to the right, 0 on it.
func (s *Arc) Side(p Vec) float64 { return s.N.Dot(p) }

// Midpoint returns the point half way along the arc.
func (s *Arc) Midpoint() Vec { return s.A.Add(s.B).Unit() }

// At returns the point at the fraction t of the arc's length, 0 at A and 1 at B.
func (s *Arc) At(t float64) Vec {
	l := s.Length()
	sin := math.Sin(l)
	if sin == 0 {
		return s.A
	}
	return s.A.Scale(math.Sin((1-t)*l) / sin).Add(s.B.Scale(math.Sin(t*l) / sin)).Unit()
}

// onCircle is the distance from a great circle below which a place counts as on
// it: about 6 nm, a few times the rounding of a unit vector.
const onCircle = 1e-15

// Cross returns the point in which two arcs cross, and whether they do. Arcs
// that share an end, touch with an end (within 6 nm) or lie on one great circle
// do not cross.
func (s *Arc) Cross(t *Arc) (Vec, bool) {
	if s.A == t.A || s.A == t.B || s.B == t.A || s.B == t.B {
		return Vec{}, false // rounding would put the shared end on either side
	}
	a, b := t.N.Dot(s.A), t.N.Dot(s.B)
	c, d := s.N.Dot(t.A), s.N.Dot(t.B)
	if !apart(a, b) || !apart(c, d) {
		return Vec{}, false
	}
	q := s.N.Cross(t.N).Unit()
	if q.Dot(s.A.Add(s.B)) < 0 {
		q = q.Scale(-1)
	}
	// the great circles meet in two antipodal points; the arcs must meet in the same one
	if q.Dot(t.A.Add(t.B)) <= 0 {
		return Vec{}, false
	}
	return q, true
}

// apart reports whether two heights above a plane lie on different sides of it.
func apart(a, b float64) bool {
	return a > onCircle && b < -onCircle || a < -onCircle && b > onCircle
}
