package boundary

import "math"

// reach is a distance as a chord, in the forms in which legs and branches are
// compared with it.
type reach struct {
	chordSq float64
	chord   float32
}

// maxChordSq is the square of the longest chord, the diameter.
const maxChordSq = 4

func reachOf(chordSq float64) reach {
	return reach{chordSq, float32(math.Sqrt(chordSq))} // the rounding is within capsuleSlack
}

// reachOfRad returns the reach of an angle in radians.
func reachOfRad(rad float64) reach {
	if rad >= math.Pi {
		return reachOf(maxChordSq)
	}
	c := 2 * math.Sin(rad/2)
	return reachOf(c * c)
}

// chordAngle returns the angle of a squared chord.
func chordAngle(chordSq float64) float64 { return 2 * math.Asin(math.Min(1, math.Sqrt(chordSq)/2)) }
