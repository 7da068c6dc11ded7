package sphere

import (
	"fmt"
	"math"
)

// Region is a polygon on the sphere with great-circle edges and, possibly, holes.
// It must fit into a hemisphere; a ring encloses the part of it that is not
// outside, whichever way round it is written.
//
// Method: the rings are kept in gnomonic projection around the middle of the
// outer one, in which great circles are straight lines, so that a planar test is
// exact on the sphere.
type Region struct {
	rings  [][]planar // the outer one first; closed: the last vertex is the first
	centre Vec
	ex, ey Vec     // axes of the projection plane
	cosCap float64 // cosine of the radius of a cap around the outer ring
}

type planar struct{ x, y float64 }

// NewRegion builds a region from an outer ring and any holes, each a closed list
// of at least four positions of which the last repeats the first. The outer ring
// must fit into a hemisphere.
func NewRegion(rings ...[]LonLat) (*Region, error) {
	if len(rings) == 0 {
		return nil, fmt.Errorf("a region needs a ring")
	}
	r := &Region{cosCap: 1}
	vecs := make([][]Vec, len(rings))
	for i, pts := range rings {
		if len(pts) < 4 {
			return nil, fmt.Errorf("ring %d has %d positions; a closed ring has at least 4", i+1, len(pts))
		}
		if pts[0] != pts[len(pts)-1] {
			return nil, fmt.Errorf("ring %d is not closed: it starts at %g, %g and ends at %g, %g", i+1, pts[0].Lon, pts[0].Lat, pts[len(pts)-1].Lon, pts[len(pts)-1].Lat)
		}
		for j, p := range pts {
			if !(p.Lat >= -90 && p.Lat <= 90) || math.IsNaN(p.Lon) || math.IsInf(p.Lon, 0) {
				return nil, fmt.Errorf("ring %d, position %d (%g, %g) is not a longitude and a latitude in degrees", i+1, j+1, p.Lon, p.Lat)
			}
			vecs[i] = append(vecs[i], FromLonLat(p))
		}
	}
	for _, v := range vecs[0][1:] {
		r.centre = r.centre.Add(v)
	}
	r.centre = r.centre.Unit()
	r.ex, r.ey = r.centre.EastNorth()
	for i, ring := range vecs {
		var flat []planar
		for _, v := range ring {
			d := v.Dot(r.centre)
			if d < 0.01 {
				return nil, fmt.Errorf("ring %d does not fit into the hemisphere around its middle", i+1)
			}
			if i == 0 {
				r.cosCap = min(r.cosCap, d)
			}
			flat = append(flat, r.project(v, d))
		}
		r.rings = append(r.rings, flat)
	}
	return r, nil
}

func (r *Region) project(v Vec, d float64) planar { return planar{v.Dot(r.ex) / d, v.Dot(r.ey) / d} }

// Contains reports whether the unit vector p lies inside. A place on an edge may
// count either way.
func (r *Region) Contains(p Vec) bool {
	d := p.Dot(r.centre)
	if d < r.cosCap-1e-9 { // a cap of less than a hemisphere is convex: no edge leaves it
		return false
	}
	q := r.project(p, d)
	if !winds(r.rings[0], q) {
		return false
	}
	for _, hole := range r.rings[1:] {
		if winds(hole, q) {
			return false
		}
	}
	return true
}

// winds reports whether a ray from q crosses the ring an odd number of times.
func winds(ring []planar, q planar) bool {
	in := false
	for i := 1; i < len(ring); i++ {
		a, b := ring[i-1], ring[i]
		if (a.y > q.y) != (b.y > q.y) && q.x < float64((b.x-a.x)*(q.y-a.y))/(b.y-a.y)+a.x {
			in = !in
		}
	}
	return in
}
