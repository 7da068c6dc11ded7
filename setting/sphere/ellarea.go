package sphere

import "math"

// The WGS84 ellipsoid (NGA.STND.0036, World Geodetic System 1984, table 3.1).
const (
	wgs84A  = 6378.137              // semi-major axis, km
	wgs84F  = 1 / 298.257223563     // flattening
	wgs84B  = wgs84A * (1 - wgs84F) // semi-minor axis, km
	wgs84E2 = wgs84F * (2 - wgs84F) // square of the first eccentricity
)

// areaTerms is how many powers of e² the series below take: the first left out
// is less than 1e-17 of the whole.
const areaTerms = 8

// meanDensity is the mean of [AreaDensity] over the sphere, so that 4π·meanDensity
// is the area of the ellipsoid in km². bandSums[n] is the coefficient of z^(2n)
// in the polynomial P of [edgeArea], without b².
var meanDensity, bandSums = func() (mean float64, p [areaTerms]float64) {
	e2n := 1.0
	for n := range areaTerms {
		c := float64(n+1) * e2n / float64(2*n+1)
		mean += c
		for j := range n {
			p[j] += c
		}
		e2n *= wgs84E2
	}
	return mean * wgs84B * wgs84B, p
}()

// EarthAreaKm2 is the area of the WGS84 ellipsoid.
var EarthAreaKm2 = 4 * math.Pi * meanDensity

// AreaDensity returns how many km² of the WGS84 ellipsoid a steradian of the unit
// sphere stands for at a unit vector, geographic latitude being taken as
// spherical: b²/(1-e²·sin²φ)² (Snyder 1987, Map Projections: A Working Manual,
// USGS Professional Paper 1395, p. 25: the product of the radii of curvature).
func AreaDensity(p Vec) float64 {
	w := 1 - wgs84E2*p.Z*p.Z
	return wgs84B * wgs84B / (w * w)
}

// edgeArea returns what an arc adds to the area of the ring that it belongs to,
// over the steradians that the ring encloses times meanDensity.
//
// Method: what [AreaDensity] has above its mean is the derivative of a function
// of sin φ that is 0 at both poles, so that by Green's theorem its integral over
// the ring is that of a smooth form along the ring, without a seam or a pole.
// Along a great circle with unit normal N that form is N_z·b²·z·P(z²) ds. P has
// the coefficients bandSums; the integral is taken by Gauss's rule, with five points
// on parts of at most 30°, and with two where the arc is shorter than 1°.
//
// Accuracy: 1e-12 of the arc's own part.
func edgeArea(s *Arc) float64 {
	length := s.Length()
	parts := int(math.Ceil(length / (math.Pi / 6)))
	if parts == 0 {
		return 0
	}
	t := s.N.Cross(s.A)
	step, sum := length/float64(parts), 0.0
	rule := gauss5[:]
	if length < radPerDeg {
		rule = gauss2[:]
	}
	for i := range parts {
		for _, g := range rule {
			sin, cos := math.Sincos((float64(i) + g.x) * step)
			z := s.A.Z*cos + t.Z*sin
			z2, p := z*z, 0.0
			for n := areaTerms - 2; n >= 0; n-- {
				p = p*z2 + bandSums[n]
			}
			sum += g.w * z * p
		}
	}
	return s.N.Z * wgs84B * wgs84B * sum * step
}

// gauss2 and gauss5 are Gauss's rules with two and five points on (0, 1)
// (Abramowitz & Stegun 1964, Handbook of Mathematical Functions, table 25.4).
var gauss2 = [...]struct{ x, w float64 }{
	{0.5 - 0.5773502691896257/2, 0.5},
	{0.5 + 0.5773502691896257/2, 0.5},
}

var gauss5 = [...]struct{ x, w float64 }{
	{0.5 - 0.9061798459386640/2, 0.2369268850561891 / 2},
	{0.5 - 0.5384693101056831/2, 0.4786286704993665 / 2},
	{0.5, 0.5688888888888889 / 2},
	{0.5 + 0.5384693101056831/2, 0.4786286704993665 / 2},
	{0.5 + 0.9061798459386640/2, 0.2369268850561891 / 2},
}

// ringAreaKm2 returns the signed area on WGS84 of a closed ring of unit vectors,
// positive where it runs anticlockwise as seen from above. All of it must lie
// within the hemisphere around o.
//
// Method: the solid angle is the sum of the signed triangles between o and each
// edge (Eriksson 1990, On the measure of solid angles, Math. Mag. 63, 184), with
// the triple product taken from differences to o, which loses no digits in a
// small ring; then [edgeArea].
//
// Accuracy: 1e-12 of the area, or 1e-16 of the square of the Earth's radius.
func ringAreaKm2(o Vec, ring []Vec) float64 {
	sr, more := 0.0, 0.0
	for i := 1; i < len(ring); i++ {
		a, b := ring[i-1], ring[i]
		sr += 2 * math.Atan2(o.Dot(a.Sub(o).Cross(b.Sub(o))), 1+o.Dot(a)+a.Dot(b)+b.Dot(o))
		if arc, ok := NewArc(a, b); ok {
			more += edgeArea(&arc)
		}
	}
	return sr*meanDensity + more
}

// zoneAreaKm2 returns the area on WGS84 per radian of longitude between the
// equator and the sine of a latitude, negative to the south (Snyder 1987, p. 25).
func zoneAreaKm2(sinLat float64) float64 {
	e := math.Sqrt(wgs84E2)
	es := e * sinLat
	return wgs84B * wgs84B / 2 * (sinLat/(1-es*es) + math.Atanh(es)/e)
}
