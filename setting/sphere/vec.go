package sphere

import "math"

// MeanRadiusKm is the mean radius (2a+b)/3 of the WGS84 ellipsoid, as adopted by
// the IUGG (Moritz 2000, Geodetic Reference System 1980, J. Geodesy 74, 128).
const MeanRadiusKm = 6371.0088

const (
	radPerDeg = math.Pi / 180
	degPerRad = 180 / math.Pi
)

// Vec is a vector in the Earth-centred frame; most are unit vectors, that is,
// places on the sphere.
type Vec struct{ X, Y, Z float64 }

// LonLat is a geographic position in degrees, WGS84, longitude first.
type LonLat struct{ Lon, Lat float64 }

// FromLonLat returns the unit vector of a position in degrees. Any finite
// longitude is accepted; latitude is expected within [-90, 90]. A pole gives
// exactly (0, 0, ±1), whatever the longitude.
func FromLonLat(p LonLat) Vec {
	switch {
	case p.Lat >= 90:
		return Vec{0, 0, 1}
	case p.Lat <= -90:
		return Vec{0, 0, -1}
	}
	sinLon, cosLon := math.Sincos(p.Lon * radPerDeg)
	sinLat, cosLat := math.Sincos(p.Lat * radPerDeg)
	return Vec{cosLat * cosLon, cosLat * sinLon, sinLat}
}

// LonLat returns the position of v in degrees, longitude in (-180, 180]. At a
// pole the longitude is 0.
func (v Vec) LonLat() LonLat {
	r := math.Hypot(v.X, v.Y)
	if r < 1e-15*math.Abs(v.Z) {
		return LonLat{0, math.Copysign(90, v.Z)}
	}
	return LonLat{WrapLon(math.Atan2(v.Y, v.X) * degPerRad), math.Atan2(v.Z, r) * degPerRad}
}

// WrapLon returns the longitude in (-180, 180] that means the same meridian.
func WrapLon(lon float64) float64 {
	if lon > -180 && lon <= 180 {
		return lon
	}
	lon = math.Mod(lon, 360)
	switch {
	case lon > 180:
		lon -= 360
	case lon <= -180:
		lon += 360
	}
	return lon
}

// Wrap360 returns an azimuth in [0, 360).
func Wrap360(deg float64) float64 {
	deg = math.Mod(deg, 360)
	if deg < 0 {
		deg += 360
	}
	if deg >= 360 { // a tiny negative number rounds up
		return 0
	}
	return deg
}

// Dot returns the scalar product. The products are rounded one by one, so that
// the result does not depend on whether the processor fuses multiply and add.
func (v Vec) Dot(w Vec) float64 { return float64(v.X*w.X) + float64(v.Y*w.Y) + float64(v.Z*w.Z) }

// Cross returns the vector product, with the products rounded one by one.
func (v Vec) Cross(w Vec) Vec {
	return Vec{
		float64(v.Y*w.Z) - float64(v.Z*w.Y),
		float64(v.Z*w.X) - float64(v.X*w.Z),
		float64(v.X*w.Y) - float64(v.Y*w.X),
	}
}

// Add returns v + w.
func (v Vec) Add(w Vec) Vec { return Vec{v.X + w.X, v.Y + w.Y, v.Z + w.Z} }

// Sub returns v - w.
func (v Vec) Sub(w Vec) Vec { return Vec{v.X - w.X, v.Y - w.Y, v.Z - w.Z} }

// Scale returns k·v.
func (v Vec) Scale(k float64) Vec { return Vec{k * v.X, k * v.Y, k * v.Z} }

// Norm returns the length of v.
func (v Vec) Norm() float64 { return math.Sqrt(v.Dot(v)) }

// Unit returns v scaled to length 1; the zero vector stays zero.
func (v Vec) Unit() Vec {
	n := v.Norm()
	if n == 0 {
		return Vec{}
	}
	return v.Scale(1 / n)
}

// Angle returns the angle between two unit vectors in radians, in [0, π].
//
// Method: 2·asin(chord/2), which keeps full relative accuracy for near points
// (the arc cosine of the dot product does not); beyond a right angle the chord
// to the antipode is used for the same reason.
func Angle(a, b Vec) float64 {
	if a.Dot(b) >= 0 {
		return 2 * math.Asin(math.Min(1, a.Sub(b).Norm()/2))
	}
	return math.Pi - 2*math.Asin(math.Min(1, a.Add(b).Norm()/2))
}

// EastNorth returns the unit vectors that point east and north at v. At a pole,
// where every direction is south or north, they are those of the meridian of
// Greenwich.
func (v Vec) EastNorth() (east, north Vec) {
	east = Vec{-v.Y, v.X, 0}
	if n := east.Norm(); n > 1e-15 {
		east = east.Scale(1 / n)
	} else {
		east = Vec{0, 1, 0}
	}
	return east, v.Cross(east)
}

// Azimuth returns the azimuth in degrees, [0, 360), of the direction d (a vector
// that need not be tangent nor of unit length) at the place v; NaN where d has
// no horizontal part.
func (v Vec) Azimuth(d Vec) float64 {
	east, north := v.EastNorth()
	e, n := d.Dot(east), d.Dot(north)
	if e == 0 && n == 0 {
		return math.NaN()
	}
	return Wrap360(math.Atan2(e, n) * degPerRad)
}

// KmToRad turns a length on the sphere into an angle.
func KmToRad(km float64) float64 { return km / MeanRadiusKm }

// RadToKm turns an angle into a length on the sphere.
func RadToKm(rad float64) float64 { return rad * MeanRadiusKm }
