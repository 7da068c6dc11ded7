package sphere

import "math"

// Near reports whether the region may reach into a cap: false only where it does
// not.
func (r *Region) Near(centre Vec, rad float64) bool {
	return Angle(r.centre, centre) <= math.Acos(r.cosCap)+rad+1e-9
}
