package sphere

import (
	"fmt"
	"math"
)

// Path is a line of great-circle arcs. It is immutable after it is built.
type Path struct {
	legs []pathLeg
	caps []Cap // one for every capLegs legs
}

// capLegs is the number of legs that share a cap.
const capLegs = 6

type pathLeg struct {
	Arc
	fromA, fromB Vec // p·fromA > 0 and p·fromB > 0 where the foot of p lies between the ends
}

// NewPath builds a path through at least two unit vectors, no two of which that
// follow each other coincide.
func NewPath(pts []Vec) (*Path, error) {
	if len(pts) < 2 {
		return nil, fmt.Errorf("a path has %d vertices; at least 2 are needed", len(pts))
	}
	p := &Path{}
	for i := 1; i < len(pts); i++ {
		arc, ok := NewArc(pts[i-1], pts[i])
		if !ok {
			at := pts[i].LonLat()
			return nil, fmt.Errorf("vertices %d and %d of a path (%.4f, %.4f) coincide or are antipodes", i, i+1, at.Lon, at.Lat)
		}
		p.legs = append(p.legs, pathLeg{arc, arc.N.Cross(arc.A), arc.B.Cross(arc.N)})
	}
	for from := 0; from < len(p.legs); from += capLegs {
		p.caps = append(p.caps, capOver(p.legs[from:min(from+capLegs, len(p.legs))]))
	}
	return p, nil
}

// capOver returns a cap that holds the legs: an arc shorter than a half turn lies
// in every cap of less than a quarter turn that holds its ends.
func capOver(legs []pathLeg) Cap {
	var sum Vec
	for i := range legs {
		sum = sum.Add(legs[i].A).Add(legs[i].B)
	}
	c, rad := sum.Unit(), 0.0
	for i := range legs {
		rad = max(rad, Angle(c, legs[i].A), Angle(c, legs[i].B))
	}
	if c == (Vec{}) {
		rad = math.Pi
	}
	return NewCap(c, rad)
}

// Len returns the number of arcs.
func (p *Path) Len() int { return len(p.legs) }

// Leg returns one arc.
func (p *Path) Leg(i int) Arc { return p.legs[i].Arc }

// Start and End return the first and the last vertex.
func (p *Path) Start() Vec { return p.legs[0].A }

// End returns the last vertex.
func (p *Path) End() Vec { return p.legs[len(p.legs)-1].B }

// Nearest returns the point of the path nearest to v, the arc it lies on, which
// part of that arc, and the distance in radians.
func (p *Path) Nearest(v Vec) (q Vec, leg int, where Where, rad float64) {
	q, leg, where, rad, _ = p.NearestWithin(v, math.Pi)
	return q, leg, where, rad
}

// NearestWithin is [Path.Nearest] that reports false where the path lies farther
// away than a distance in radians, and may then know it sooner.
func (p *Path) NearestWithin(v Vec, withinRad float64) (q Vec, leg int, where Where, rad float64, ok bool) {
	best, reach := 4.1, ReachOf(withinRad)
	if withinRad < math.Pi {
		c := 2 * math.Sin(withinRad/2)
		best = c*c*(1+1e-12) + 1e-30
	}
	for k := range p.caps {
		if p.caps[k].Beyond(v, reach) {
			continue
		}
		from := k * capLegs
		for i := from; i < min(from+capLegs, len(p.legs)); i++ {
			l := &p.legs[i]
			var d float64
			w := Inside
			if v.Dot(l.fromA) > 0 && v.Dot(l.fromB) > 0 {
				h := v.Dot(l.N)
				d = 2 * h * h / (1 + math.Sqrt(math.Max(0, 1-h*h))) // the square of the chord
			} else {
				a, b := l.A.Sub(v).normSq(), l.B.Sub(v).normSq()
				d, w = a, AtA
				if b < a {
					d, w = b, AtB
				}
			}
			if d < best {
				best, leg, where, ok = d, i, w, true
				reach = reachOfChord(d)
			}
		}
	}
	if !ok {
		return Vec{}, 0, Inside, math.Inf(1), false
	}
	l := &p.legs[leg]
	switch where {
	case AtA:
		q = l.A
	case AtB:
		q = l.B
	default:
		q = v.Sub(l.N.Scale(l.N.Dot(v))).Unit()
	}
	return q, leg, where, 2 * math.Asin(math.Min(1, math.Sqrt(best)/2)), true
}
