package sphere

import (
	"math"

	"github.com/tidwall/geodesic"
)

// Inverse returns the length in kilometres of the shortest geodesic on WGS84
// from a to b, and its azimuth in degrees, [0, 360), at a.
//
// Method: Karney (2013), Algorithms for geodesics, J. Geodesy 87, 43,
// doi:10.1007/s00190-012-0578-z, as implemented by tidwall/geodesic.
//
// Special cases: for coincident points the distance is 0 and the azimuth NaN. At
// a pole the azimuth counts from the meridian of the longitude given.
//
// Accuracy: 15 nm in length.
func Inverse(a, b LonLat) (distanceKm, azimuthDeg float64) {
	if a == b {
		return 0, math.NaN()
	}
	var metres, azi float64
	geodesic.WGS84.Inverse(offEquator(a.Lat), a.Lon, offEquator(b.Lat), b.Lon, &metres, &azi, nil)
	if metres == 0 {
		return 0, math.NaN()
	}
	return metres / 1000, Wrap360(azi)
}

// offEquator takes a latitude within 0.1 nm of the equator for 0. The library
// turns one between 0 and -3.5e-18 into a negative zero, and gives lengths of 0
// or less between places on the equator that are nearly antipodal.
func offEquator(lat float64) float64 {
	if math.Abs(lat) < 1e-15 {
		return 0
	}
	return lat
}

// Direct returns the place that is distanceKm along the WGS84 geodesic which
// leaves a at azimuthDeg. Method as for [Inverse].
func Direct(a LonLat, azimuthDeg, distanceKm float64) LonLat {
	var lat, lon float64
	geodesic.WGS84.Direct(offEquator(a.Lat), a.Lon, azimuthDeg, distanceKm*1000, &lat, &lon, nil)
	return LonLat{WrapLon(lon), lat}
}
