package sphere

// Shape is a part of the Earth's surface that a question about an area is asked
// of: a [Polygon] or a [Quad].
type Shape interface {
	// AreaKm2 returns the area on the WGS84 ellipsoid.
	AreaKm2() float64
	// Contains reports whether the unit vector p lies inside. A place on the
	// outline, within rounding, may count either way.
	Contains(p Vec) bool
	// Cuts appends the angles in radians along an arc, from its first end, at which
	// it may meet the outline. None that it meets is left out; some may stand twice
	// or touch only, so that the parts between them are to be looked at one by one.
	Cuts(s *Arc, out []float64) []float64
	// Cap returns a cap that holds the shape.
	Cap() (centre Vec, rad float64)
	// Outline returns the rings as closed lists of unit vectors joined by
	// great-circle arcs.
	Outline() [][]Vec
	// Sample appends about n places, spread evenly by area over the shape, each with
	// its weight; equal weights would be right on a sphere.
	Sample(n int, out []Sample) []Sample
}

// Sample is one of many places that stand for an area.
type Sample struct {
	At     Vec
	Weight float64 // in proportion to the area that it stands for, within its shape
}

// goldenStep is the fractional part of the golden ratio: steps of this size on a
// circle are spread more evenly than any other.
const goldenStep = 0.6180339887498949

// golden returns the place of sample k across the shape, within (0, 1).
func golden(k int) float64 {
	x := (float64(k) + 0.5) * goldenStep
	return x - float64(int(x))
}
