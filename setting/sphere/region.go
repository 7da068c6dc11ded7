package sphere

import (
	"fmt"
	"math"
)

// Region is a polygon on the sphere with great-circle edges and, possibly, holes.
// A ring encloses the smaller of the two areas it separates, whichever way round
// it is written.
type Region struct {
	rings  []ring // the outer one first
	centre Vec
	cosCap float64 // cosine of the radius of a cap around the outer ring
}

type ring []Vec // closed: the last vertex is the first

// NewRegion builds a region from an outer ring and any holes, each a closed list
// of at least four positions of which the last repeats the first. The outer ring
// must fit into the hemisphere around the mean of its positions.
func NewRegion(rings ...[]LonLat) (*Region, error) {
	r := &Region{}
	for i, pts := range rings {
		if len(pts) < 4 {
			return nil, fmt.Errorf("ring %d has %d positions; a closed ring has at least 4", i+1, len(pts))
		}
		if pts[0] != pts[len(pts)-1] {
			return nil, fmt.Errorf("ring %d is not closed: it starts at %g, %g and ends at %g, %g", i+1, pts[0].Lon, pts[0].Lat, pts[len(pts)-1].Lon, pts[len(pts)-1].Lat)
		}
		v := make(ring, len(pts))
		for j, p := range pts {
			if !(p.Lat >= -90 && p.Lat <= 90) || math.IsNaN(p.Lon) || math.IsInf(p.Lon, 0) {
				return nil, fmt.Errorf("ring %d, position %d (%g, %g) is not a longitude and a latitude in degrees", i+1, j+1, p.Lon, p.Lat)
			}
			v[j] = FromLonLat(p)
		}
		r.rings = append(r.rings, v)
	}
	if len(r.rings) == 0 {
		return nil, fmt.Errorf("a region needs a ring")
	}
	for _, v := range r.rings[0][1:] {
		r.centre = r.centre.Add(v)
	}
	r.centre = r.centre.Unit()
	r.cosCap = 1
	for _, v := range r.rings[0] {
		r.cosCap = min(r.cosCap, v.Dot(r.centre))
	}
	if r.cosCap < 0.01 {
		return nil, fmt.Errorf("ring 1 does not fit into the hemisphere around its middle")
	}
	return r, nil
}

// Contains reports whether the unit vector p lies inside. A place on an edge may
// count either way.
func (r *Region) Contains(p Vec) bool {
	// an edge may bulge out of the cap of its ends by no more than this
	if p.Dot(r.centre) < r.cosCap-1e-9 || !r.rings[0].winds(p) {
		return false
	}
	for _, hole := range r.rings[1:] {
		if hole.winds(p) {
			return false
		}
	}
	return true
}

// winds reports whether the ring goes around p: the azimuths of its vertices, as
// seen from p, turn by a full circle in all. The antipode of a place inside turns
// as well; callers have excluded it by the cap.
func (g ring) winds(p Vec) bool {
	sum := 0.0
	for i := 1; i < len(g); i++ {
		u, v := g[i-1].Cross(p), g[i].Cross(p)
		sum += math.Atan2(p.Dot(u.Cross(v)), u.Dot(v))
	}
	return math.Abs(sum) > math.Pi
}
