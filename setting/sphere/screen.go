package sphere

import "math"

// ScreenRelative bounds the relative error of [ScreenKm] for places from
// ScreenMinRad (0.6 m) to ScreenMaxRad apart on the sphere.
const (
	ScreenRelative = 2e-5
	ScreenMinRad   = 1e-7
	ScreenMaxRad   = 2.0
)

const (
	equatorKm  = 6378.137
	flattening = 1 / 298.257223563
)

// ScreenKm returns about the length of the WGS84 geodesic between two places,
// given as the unit vectors of their geodetic positions, and the angle between
// them. It costs a tenth of [Inverse].
//
// Method: the first-order formula of Andoyer and Lambert in geodetic latitudes
// (Thomas 1965, Mathematical models for navigation systems, U.S. Naval
// Oceanographic Office TR-182).
//
// Accuracy: ScreenRelative, for angles from ScreenMinRad to ScreenMaxRad; not to
// be used for others.
func ScreenKm(a, b Vec, rad float64) float64 {
	half := a.Sub(b).normSq() / 4 // sin²(rad/2)
	sin := math.Sqrt(4 * half * (1 - half))
	k, l := a.Z-b.Z, a.Z+b.Z
	h := (rad + 3*sin) / (2 * half)
	g := (rad - 3*sin) / (2 * (1 - half))
	return equatorKm * (rad - flattening/4*(h*k*k+g*l*l))
}
