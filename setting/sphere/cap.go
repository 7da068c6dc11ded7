package sphere

import "math"

// Cap is a part of the sphere around a middle, for a quick test of whether
// something is out of reach.
type Cap struct {
	centre     Vec
	cosR, sinR float64
}

// NewCap returns the cap of an angular radius around a unit vector. One of a
// quarter turn or more becomes the whole sphere.
func NewCap(centre Vec, rad float64) Cap {
	rad += 1e-9
	if !(rad < math.Pi/2) {
		return Cap{Vec{X: 1}, -1, 0}
	}
	sin, cos := math.Sincos(rad)
	return Cap{centre, cos, sin}
}

// Reach is a distance from a place in the form that [Cap.Beyond] takes.
type Reach struct{ cos, sin float64 }

// ReachOf returns the reach of an angle in radians.
func ReachOf(rad float64) Reach {
	if rad >= math.Pi {
		return Reach{-1, 0}
	}
	sin, cos := math.Sincos(rad)
	return Reach{cos, sin}
}

// reachOfChord returns the reach of the square of a chord.
func reachOfChord(chordSq float64) Reach {
	if chordSq >= 4 {
		return Reach{-1, 0}
	}
	return Reach{1 - chordSq/2, math.Sqrt(chordSq * (1 - chordSq/4))}
}

// Holds reports whether p lies in the cap.
func (c *Cap) Holds(p Vec) bool { return p.Dot(c.centre) >= c.cosR }

// Beyond reports whether the whole cap lies farther from p than the reach.
func (c *Cap) Beyond(p Vec, r Reach) bool {
	// cos and sin of the sum of both angles: beyond a half turn nothing lies
	if r.sin*c.cosR+r.cos*c.sinR <= 0 {
		return false
	}
	return p.Dot(c.centre) < r.cos*c.cosR-r.sin*c.sinR-4e-15
}
