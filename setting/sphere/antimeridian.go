package sphere

import "math"

// CutAtAntimeridian returns a path cut where it crosses ±180°, as GeoJSON wants
// it: each part stays on one side, and the cuts stand in both, at 180 and -180,
// with their latitude to six decimals. Longitudes must be within (-180, 180].
func CutAtAntimeridian(path []LonLat) [][]LonLat {
	var out [][]LonLat
	part := []LonLat{path[0]}
	for i := 1; i < len(path); i++ {
		a, b := path[i-1], path[i]
		if math.Abs(b.Lon-part[len(part)-1].Lon) > 180 {
			switch {
			case b.Lon == 180: // ends on the edge, coming from the west
				b.Lon = -180
			case a.Lon == 180 && len(part) == 1: // starts on the edge
				part[0].Lon = -180
			case a.Lon == 180: // a vertex on the edge
				edge := part[len(part)-1].Lon
				out = append(out, part)
				part = []LonLat{{Lon: -edge, Lat: a.Lat}}
			default:
				lat := crossingLat(a, b)
				edge := math.Copysign(180, part[len(part)-1].Lon)
				out = append(out, append(part, LonLat{Lon: edge, Lat: lat}))
				part = []LonLat{{Lon: -edge, Lat: lat}}
			}
		}
		part = append(part, b)
	}
	return append(out, part)
}

// crossingLat returns the latitude, to six decimals, at which the arc crosses ±180°.
func crossingLat(a, b LonLat) float64 {
	arc, _ := NewArc(FromLonLat(a), FromLonLat(b))
	q := arc.N.Cross(Vec{Y: 1}) // the plane of the meridians 0° and 180° has the normal Y
	if q.X > 0 {
		q = q.Scale(-1)
	}
	return math.Round(q.Unit().LonLat().Lat*1e6)/1e6 + 0 // no minus zero
}
