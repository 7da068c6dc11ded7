package boundary

import (
	"math"

	"nearmargin/setting/sphere"
)

// capsule is the room within a distance w of a straight line in space, from a to
// a+d. The lines of a plate boundary are long and thin, and so is a capsule: far
// more of the network can be left out by it than by a cap or a box around the same
// lines.
//
// Its numbers have 32 bits, so that a search reads half the memory; w holds
// [capsuleSlack] for what that loses.
type capsule struct {
	ax, ay, az float32
	dx, dy, dz float32
	inv        float32 // 1/d·d, 0 where a and the end coincide
	w          float32
}

// capsuleSlack is more than the rounding of a place, of a capsule's line and of
// the distance between them to 32 bits, as a chord: 13 m.
const capsuleSlack = 2e-6

// point32 is a place on the unit sphere in 32 bits.
type point32 struct{ x, y, z float32 }

func round32(v sphere.Vec) point32 { return point32{float32(v.X), float32(v.Y), float32(v.Z)} }

// newCapsule returns the capsule of that radius around the line from a to b.
func newCapsule(a, b sphere.Vec, w float64) capsule {
	d := b.Sub(a)
	from, by := round32(a), round32(d)
	c := capsule{from.x, from.y, from.z, by.x, by.y, by.z, 0, float32(w + capsuleSlack)}
	if l2 := d.Dot(d); l2 > 1e-20 {
		c.inv = float32(1 / l2)
	}
	return c
}

// axisSq returns the square of the distance in space from p to the line in the
// capsule's middle.
func (c *capsule) axisSq(p *point32) float32 {
	x, y, z := p.x-c.ax, p.y-c.ay, p.z-c.az
	t := min(1, max(0, (x*c.dx+y*c.dy+z*c.dz)*c.inv))
	x -= t * c.dx
	y -= t * c.dy
	z -= t * c.dz
	return x*x + y*y + z*z
}

// beyond reports whether the whole capsule, whose axis is at the distance from a
// place whose square is given, is farther from it than a chord.
func (c *capsule) beyond(axisSq, chord float32) bool {
	r := chord + c.w
	return axisSq > r*r
}

// besides reports whether the whole capsule lies on one side of the plane through
// the sphere's middle that has the unit normal n.
func (c *capsule) besides(n *point32) bool {
	start := n.x*c.ax + n.y*c.ay + n.z*c.az
	end := start + n.x*c.dx + n.y*c.dy + n.z*c.dz
	return start > c.w && end > c.w || start < -c.w && end < -c.w
}

// lineDistance returns the distance in space from p to the straight line from a
// to b.
func lineDistance(p, a, b sphere.Vec) float64 {
	d := b.Sub(a)
	v := p.Sub(a)
	if l2 := d.Dot(d); l2 > 0 {
		v = v.Sub(d.Scale(min(1, max(0, v.Dot(d)/l2))))
	}
	return v.Norm()
}

// rod is a line in space with a radius, what a capsule is made from.
type rod struct {
	a, b sphere.Vec
	w    float64
}

// rodAround returns a rod that holds the rods given: from the end farthest from
// their middle to the end farthest from that. A capsule is convex, and so holds
// each of them where it holds the balls around their ends.
func rodAround(rods []rod) rod {
	if len(rods) == 1 {
		return rods[0]
	}
	var sum sphere.Vec
	for i := range rods {
		sum = sum.Add(rods[i].a).Add(rods[i].b)
	}
	out := rod{}
	out.a = farthestEnd(rods, sum.Scale(1/float64(2*len(rods))))
	out.b = farthestEnd(rods, out.a)
	for i := range rods {
		out.w = max(out.w, lineDistance(rods[i].a, out.a, out.b)+rods[i].w, lineDistance(rods[i].b, out.a, out.b)+rods[i].w)
	}
	return out
}

func farthestEnd(rods []rod, from sphere.Vec) sphere.Vec {
	best, far := from, -1.0
	for i := range rods {
		for _, v := range [...]sphere.Vec{rods[i].a, rods[i].b} {
			d := v.Sub(from)
			if d2 := d.Dot(d); d2 > far {
				best, far = v, d2
			}
		}
	}
	return best
}

// rodOfArc returns the chord of an arc, with the arc's height over it.
func rodOfArc(s *sphere.Arc) rod {
	half := s.A.Add(s.B).Norm() / 2 // the cosine of half the arc
	return rod{s.A, s.B, math.Max(0, 1-half)}
}
