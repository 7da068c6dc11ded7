package figure

import (
	"math"
	"slices"

	"nearmargin/setting/sphere"
)

// projection maps places to a plane, in Earth radii, x to the right and y up. ok is
// false for places that have none.
type projection interface {
	at(p sphere.LonLat) (x, y float64, ok bool)
}

// azimuthal is Lambert's azimuthal equal-area projection of a sphere (Snyder 1987,
// Map projections: a working manual, USGS Professional Paper 1395, eqs. 24-2 to 24-4).
type azimuthal struct{ centre, east, north sphere.Vec }

func newAzimuthal(centre sphere.Vec) *azimuthal {
	e, n := centre.EastNorth()
	return &azimuthal{centre, e, n}
}

func (a *azimuthal) at(p sphere.LonLat) (x, y float64, ok bool) {
	v := sphere.FromLonLat(p)
	c := a.centre.Dot(v)
	if c < -1+1e-9 { // the antipode, which is the whole rim
		return 0, 0, false
	}
	k := math.Sqrt(2 / (1 + c))
	return k * a.east.Dot(v), k * a.north.Dot(v), true
}

// equalEarth is the Equal Earth projection of a sphere about a meridian (Savric,
// Patterson and Jenny 2019, The Equal Earth map projection, Int. J. Geogr. Inf. Sci. 33,
// 454-465, eqs. 7 to 9).
//
// Places run on past the edges half a turn away from the meridian; seen brings them back.
type equalEarth struct{ middle float64 }

// seen returns a place with its longitude at most half a turn away from the middle.
func (e equalEarth) seen(p sphere.LonLat) sphere.LonLat {
	if off := p.Lon - e.middle; off > 180 {
		p.Lon -= 360
	} else if off < -180 {
		p.Lon += 360
	}
	return p
}

// edge returns the place at a latitude on the east or the west edge.
func (e equalEarth) edge(lat, side float64) sphere.LonLat {
	return sphere.LonLat{Lon: e.middle + side*180, Lat: lat}
}

func (e equalEarth) at(p sphere.LonLat) (x, y float64, ok bool) {
	const a1, a2, a3, a4 = 1.340264, -0.081106, 0.000893, 0.003796
	t := math.Asin(math.Sqrt(3) / 2 * math.Sin(p.Lat*math.Pi/180))
	t2 := t * t
	t6 := t2 * t2 * t2
	x = 2 * math.Sqrt(3) * (p.Lon - e.middle) * math.Pi / 180 * math.Cos(t) / (3 * (9*a4*t6*t2 + 7*a3*t6 + 3*a2*t2 + a1))
	return x, t * (a4*t6*t2 + a3*t6 + a2*t2 + a1), true
}

// worldReach is the angle from the middle of the sites beyond which a map shows the
// whole world.
const worldReach = 75 * math.Pi / 180

// chooseProjection returns the projection for places: azimuthal about their middle, or
// that of the whole world where they lie far apart. reach is the angle from the middle
// to the farthest, in radians.
func chooseProjection(places []sphere.LonLat) (p projection, reach float64) {
	var sum sphere.Vec
	for _, at := range places {
		sum = sum.Add(sphere.FromLonLat(at))
	}
	if len(places) == 0 || sum.Norm() < 1e-6 {
		return equalEarth{middleMeridian(places)}, math.Pi
	}
	c := sum.Unit()
	for _, at := range places {
		reach = math.Max(reach, sphere.Angle(c, sphere.FromLonLat(at)))
	}
	if reach > worldReach {
		return equalEarth{middleMeridian(places)}, reach
	}
	return newAzimuthal(c), reach
}

// middleMeridian returns the meridian for the middle of a world map: Greenwich, which
// readers know, but where places lie close to the edges half a turn from it and leave a wide
// gap elsewhere; then the edges go into the gap. In degrees, a multiple of 10.
func middleMeridian(places []sphere.LonLat) float64 {
	const nearEdge, wideGap = 20, 60
	var lons []float64
	nearest := math.Inf(1)
	for _, p := range places {
		lons = append(lons, p.Lon)
		nearest = math.Min(nearest, 180-math.Abs(p.Lon))
	}
	if nearest > nearEdge {
		return 0
	}
	slices.Sort(lons)
	widest, at := 0.0, 0.0
	for i, lon := range lons {
		next := lons[0] + 360
		if i+1 < len(lons) {
			next = lons[i+1]
		}
		if next-lon > widest {
			widest, at = next-lon, (lon+next)/2
		}
	}
	if widest < wideGap {
		return 0
	}
	return sphere.WrapLon(10*math.Round(at/10) + 180)
}

// densify adds places along great-circle arcs longer than a degree.
func densify(path []sphere.LonLat) []sphere.LonLat {
	const most = math.Pi / 180
	out := path[:1:1]
	for i := 1; i < len(path); i++ {
		a, b := sphere.FromLonLat(path[i-1]), sphere.FromLonLat(path[i])
		n := math.Ceil(sphere.Angle(a, b) / most)
		for k := 1.0; k < n; k++ {
			p := a.Scale(1 - k/n).Add(b.Scale(k / n)).Unit().LonLat()
			if math.Abs(p.Lon-out[len(out)-1].Lon) > 180 { // the seam is on the line
				p.Lon = -p.Lon
			}
			out = append(out, p)
		}
		out = append(out, path[i])
	}
	return out
}
