package boundary

import (
	"math"

	"nearmargin/setting/sphere"
)

// Place is a position in both forms that the search needs.
type Place struct {
	LonLat sphere.LonLat
	Vec    sphere.Vec
}

// PlaceAt returns the place at a position. Longitude may be in any range that
// [sphere.WrapLon] takes; latitude must be within [-90, 90].
func PlaceAt(p sphere.LonLat) Place {
	p.Lon = sphere.WrapLon(p.Lon)
	return Place{p, sphere.FromLonLat(p)}
}

// Hit is a boundary found near a place.
type Hit struct {
	Boundary *Boundary
	// DistanceKm is the length of the WGS84 geodesic to Nearest.
	DistanceKm float64
	// AzimuthDeg is that geodesic's azimuth at the place, [0, 360); NaN at distance 0.
	AzimuthDeg float64
	// Nearest is the point of the boundary that is nearest to the place.
	Nearest sphere.LonLat
	// PathAzimuthDeg is the azimuth of the boundary at Nearest in the direction of
	// its path, [0, 360).
	PathAzimuthDeg float64
	// NearestVec is Nearest as a unit vector.
	NearestVec sphere.Vec
	// Along is the unit vector along the path at Nearest.
	Along sphere.Vec
}

// BoundaryAzimuthDeg returns the azimuth of the boundary as a line without
// direction, [0, 180).
func (h *Hit) BoundaryAzimuthDeg() float64 {
	return math.Mod(h.PathAzimuthDeg, 180)
}

// nearTie is how much farther than the nearest on the sphere a boundary may be
// and still be compared on the ellipsoid: the two distances differ by 0.56 % at
// the most.
const nearTie = 0.01

// moreOnSphere makes a distance on the ellipsoid one on the sphere that misses
// nothing.
const moreOnSphere = 1.006

// coincideKm is the difference in distance that counts as none: 1 µm.
const coincideKm = 1e-9

// Locate returns the plate under a place and the boundary nearest to it.
//
// Method: the nearest leg on the sphere decides the plate. Every leg within 1 %
// of its distance that bounds the same plate is then compared by the length of
// the WGS84 geodesic to its nearest point. Ties go to the line that the line of
// sight meets more squarely, then to the lower id.
//
// Accuracy: the nearest point is that on the sphere; over a geodesic the true
// minimum is nearer by 16 m at the most in 99 of 100 places.
func (n *Network) Locate(p Place) (plate string, nearest Hit) {
	var s Sights
	return n.LocateWith(p, &s)
}

// LocateWith is [Network.Locate] that uses and adds to the sights from the place.
func (n *Network) LocateWith(p Place, s *Sights) (plate string, nearest Hit) {
	s.start(n, p)
	first := found{leg: -1}
	n.search(n.all, p.Vec, filter{}, reachOf(maxChordSq), &first, &s.rivals)
	side := n.side(p.Vec, first)
	s.rivals.keepPassing(n, filter{side, Bounding})
	return n.plates[side], n.refine(p, s)
}

// refine compares the rivals in the list, the leg that is nearest on the sphere and
// those within 1 % of its distance, by the length of the WGS84 geodesic. Those that
// a bound on that length excludes are not measured.
func (n *Network) refine(p Place, s *Sights) Hit {
	r := &s.rivals
	n.screen(p.Vec, r)
	best, foot, bestAt, bestKm, bestAz := found{leg: -1}, sphere.Vec{}, sphere.LonLat{}, 0.0, 0.0
	for i := range r.list[:r.n] {
		other, q := r.list[i], r.feet[i]
		at, km, az := bestAt, bestKm, bestAz
		if i == 0 || q != foot {
			at, km, az = s.to(p, q)
		}
		if i == 0 || km < bestKm-coincideKm || km <= bestKm+coincideKm && n.squarer(p.Vec, other, best) {
			best, foot, bestAt, bestKm, bestAz = other, q, at, km, az
		}
	}
	return n.hit(best, foot, bestAt, bestKm, bestAz)
}

// NearestOf returns the boundary of one type that is nearest to a place, within
// maxKm, and whether there is one. With a role other than [AnyRole] it must have
// the plate of that code on one side, and in that part.
//
// Near ties are compared on WGS84 as in [Network.Locate].
func (n *Network) NearestOf(p Place, t Type, plate string, role Role, maxKm float64) (Hit, bool) {
	var s Sights
	return n.NearestOfWith(p, t, plate, role, maxKm, &s)
}

// NearestOfWith is [Network.NearestOf] that uses and adds to the sights from the
// place.
func (n *Network) NearestOfWith(p Place, t Type, plate string, role Role, maxKm float64, s *Sights) (Hit, bool) {
	f := filter{noPlate, role}
	s.start(n, p)
	if role == AnyRole {
		return n.nearestIn(n.byType[t], p, f, maxKm, s)
	}
	if f.plate = s.index(plate); f.plate == noPlate {
		return Hit{}, false
	}
	return n.nearestIn(n.byPlate[f.plate][t], p, f, maxKm, s)
}

// nearestIn returns the boundary of a tree that passes and is nearest to a place.
func (n *Network) nearestIn(t *tree, p Place, f filter, maxKm float64, s *Sights) (Hit, bool) {
	s.start(n, p)
	first := found{leg: -1}
	n.search(t, p.Vec, f, reachOfRad(sphere.KmToRad(maxKm*moreOnSphere)), &first, &s.rivals)
	if first.leg < 0 {
		return Hit{}, false
	}
	h := n.refine(p, s)
	if h.DistanceKm > maxKm {
		return Hit{}, false
	}
	return h, true
}

func (n *Network) hit(f found, q sphere.Vec, at sphere.LonLat, km, az float64) Hit {
	l := &n.legs[f.leg]
	along := l.arc.Tangent(q)
	h := Hit{
		Boundary:       n.boundaries[l.boundary],
		DistanceKm:     km,
		AzimuthDeg:     az,
		Nearest:        at,
		NearestVec:     q,
		Along:          along,
		PathAzimuthDeg: q.Azimuth(along),
	}
	if km < 1e-6 { // a millimetre: no direction to speak of
		h.AzimuthDeg = math.NaN()
	}
	return h
}
