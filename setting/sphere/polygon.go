package sphere

import (
	"fmt"
	"math"
)

// Polygon is a ring of great-circle arcs and, possibly, holes in it. A ring
// encloses the smaller of the two parts that it cuts the sphere into, whichever
// way round it is written; it must fit into a hemisphere.
//
// Method: as in [Region] all is kept in gnomonic projection, in which great
// circles are straight lines; edges are found by height in the plane, so that a
// question costs a few edges of many.
type Polygon struct {
	rings   [][]Vec // closed, without doubled positions; the outer one first
	edges   []flatEdge
	bands   bands
	centre  Vec
	ex, ey  Vec     // axes of the plane
	cosCap  float64 // cosine of the radius of a cap around the rings
	areaKm2 float64
}

// RingError says where a polygon is at fault.
type RingError struct {
	Ring     int  // from 0; 0 is the outer ring
	Position int  // from 0; -1 where the ring as a whole is at fault
	Form     bool // a fault of form or range, not one of geometry
	Detail   string
}

func (e *RingError) Error() string {
	if e.Position < 0 {
		return fmt.Sprintf("ring %d: %s", e.Ring, e.Detail)
	}
	return fmt.Sprintf("ring %d, position %d: %s", e.Ring, e.Position, e.Detail)
}

func formError(ring, position int, format string, args ...any) error {
	return &RingError{ring, position, true, fmt.Sprintf(format, args...)}
}

func shapeError(ring, position int, format string, args ...any) error {
	return &RingError{ring, position, false, fmt.Sprintf(format, args...)}
}

// minPolygonKm2 is the least area that a polygon may have: a square metre.
const minPolygonKm2 = 1e-6

// NewPolygon builds a polygon from an outer ring and any holes, each a closed
// list of at least four positions of which the last repeats the first. Positions
// that repeat the one before are left out. Longitudes are -180 to 360.
//
// The error is a *RingError: a ring that is not closed, is too short or has a
// position out of range; that meets itself, has no area or does not fit into a
// hemisphere; a hole that is not inside the outer ring, or overlaps another.
// Holes may touch the outer ring and each other.
func NewPolygon(rings ...[]LonLat) (*Polygon, error) {
	if len(rings) == 0 {
		return nil, formError(0, -1, "a polygon needs an outer ring")
	}
	p := &Polygon{}
	var from [][]int32
	for i, ring := range rings {
		vecs, at, err := ringVecs(i, ring)
		if err != nil {
			return nil, err
		}
		p.rings, from = append(p.rings, vecs), append(from, at)
	}
	if err := p.flatten(from); err != nil {
		return nil, err
	}
	if err := p.checkRings(); err != nil {
		return nil, err
	}
	for i, ring := range p.rings {
		km2 := math.Abs(ringAreaKm2(p.centre, ring))
		if i == 0 {
			p.areaKm2 = km2
		} else {
			p.areaKm2 -= km2
		}
		if km2 < minPolygonKm2 {
			return nil, shapeError(i, -1, "the ring encloses no area (less than 1 m²)")
		}
	}
	if err := p.checkHoles(); err != nil {
		return nil, err
	}
	if p.areaKm2 < minPolygonKm2 {
		return nil, shapeError(0, -1, "the holes leave no area of the outer ring")
	}
	return p, nil
}

// ringVecs turns a ring into unit vectors, each with the index of its position.
func ringVecs(i int, ring []LonLat) ([]Vec, []int32, error) {
	if len(ring) < 4 {
		return nil, nil, formError(i, -1, "the ring has %d positions; a closed ring has at least 4, the last repeating the first", len(ring))
	}
	for j, p := range ring {
		if !(p.Lat >= -90 && p.Lat <= 90) {
			return nil, nil, formError(i, j, "latitude %g is out of range -90 to 90; a position is longitude, latitude", p.Lat)
		}
		if !(p.Lon >= -180 && p.Lon <= 360) {
			return nil, nil, formError(i, j, "longitude %g is out of range -180 to 360", p.Lon)
		}
	}
	first, last := ring[0], ring[len(ring)-1]
	if samePlace(first, last) {
		last = first
	}
	if first != last {
		return nil, nil, formError(i, len(ring)-1, "the ring is not closed: it ends at %g, %g and must end where it starts, at %g, %g", last.Lon, last.Lat, first.Lon, first.Lat)
	}
	var vecs []Vec
	var at []int32
	for j, p := range ring[:len(ring)-1] {
		v := FromLonLat(LonLat{WrapLon(p.Lon), p.Lat})
		if n := len(vecs); n > 0 && Angle(v, vecs[n-1]) < minArcRad {
			continue
		}
		vecs, at = append(vecs, v), append(at, int32(j))
	}
	for len(vecs) > 1 && Angle(vecs[0], vecs[len(vecs)-1]) < minArcRad {
		vecs, at = vecs[:len(vecs)-1], at[:len(at)-1]
	}
	if len(vecs) < 3 {
		return nil, nil, shapeError(i, -1, "the ring has %d distinct positions and encloses no area; at least 3 are needed", len(vecs))
	}
	return append(vecs, vecs[0]), append(at, int32(len(ring)-1)), nil // #nosec G115 -- a ring in memory has fewer than 2^31 positions
}

// samePlace reports whether two positions mean one place, such as 180 and -180.
func samePlace(a, b LonLat) bool {
	return a.Lat == b.Lat && (math.Abs(a.Lat) == 90 || WrapLon(a.Lon) == WrapLon(b.Lon))
}

// flatten chooses the plane, and projects the rings into it. The second axis is
// the long one, so that edges are spread over many heights.
func (p *Polygon) flatten(from [][]int32) error {
	p.centre = middle(p.rings[0])
	ex, ey := p.centre.EastNorth()
	var xx, xy, yy float64
	p.cosCap = 1
	for i, ring := range p.rings {
		for j, v := range ring {
			d := v.Dot(p.centre)
			switch {
			case d < minCosCap && i == 0:
				return shapeError(0, -1, "the ring does not fit into a hemisphere (its middle is taken at %.4g, %.4g); divide the polygon into smaller ones", p.centre.LonLat().Lon, p.centre.LonLat().Lat)
			case d < minCosCap:
				return holeOutside(i, from[i][j], v)
			}
			p.cosCap = min(p.cosCap, d)
			x, y := v.Dot(ex), v.Dot(ey)
			xx, xy, yy = xx+x*x, xy+x*y, yy+y*y
		}
	}
	sin, cos := math.Sincos(math.Atan2(2*xy, xx-yy) / 2) // the direction of the long axis
	p.ey = ex.Scale(cos).Add(ey.Scale(sin)).Unit()
	p.ex = p.ey.Cross(p.centre)
	for i, ring := range p.rings {
		for j := 1; j < len(ring); j++ {
			p.edges = append(p.edges, flatEdge{p.flat(ring[j-1]), p.flat(ring[j]), int32(i), from[i][j-1], from[i][j]})
		}
	}
	p.bands = newBands(p.edges)
	return nil
}

// minCosCap is the cosine of the radius of the largest cap that a ring may need:
// 89.4°.
const minCosCap = 0.01

// middle returns the middle of a closed ring: the mean of its edges, or, where
// the ring does not fit into the hemisphere around that, nearly the middle of the
// smallest cap that holds it (Bădoiu & Clarkson 2003, Smaller core-sets for
// balls, SODA, 801).
func middle(ring []Vec) Vec {
	var c Vec
	for i := 1; i < len(ring); i++ {
		m := ring[i-1].Add(ring[i])
		c = c.Add(m.Scale(ring[i].Sub(ring[i-1]).Norm()))
	}
	c = c.Unit()
	if c == (Vec{}) {
		c = ring[0]
	}
	for i := 1; i < 200; i++ {
		far, least := 0, 2.0
		for j := range ring {
			if d := ring[j].Dot(c); d < least {
				far, least = j, d
			}
		}
		if least > 0.2 || i > 1 && i%50 == 0 && least > 2*minCosCap {
			break
		}
		c = c.Add(ring[far].Sub(c).Scale(1 / float64(i+1))).Unit()
	}
	return c
}

func (p *Polygon) flat(v Vec) planar {
	d := v.Dot(p.centre)
	return planar{v.Dot(p.ex) / d, v.Dot(p.ey) / d}
}

func (p *Polygon) round(q planar) Vec {
	return p.centre.Add(p.ex.Scale(q.x)).Add(p.ey.Scale(q.y)).Unit()
}

// AreaKm2 returns the area on the WGS84 ellipsoid, the holes taken off; see
// [AreaDensity]. Accuracy: 1e-12 of the area of the outer ring.
func (p *Polygon) AreaKm2() float64 { return p.areaKm2 }

// Cap returns a cap that holds the polygon.
func (p *Polygon) Cap() (centre Vec, rad float64) { return p.centre, math.Acos(p.cosCap) + 1e-9 }

// Outline returns the rings, closed. They must not be changed.
func (p *Polygon) Outline() [][]Vec { return p.rings }

// Contains reports whether the unit vector v lies inside. A place on an edge may
// count either way.
func (p *Polygon) Contains(v Vec) bool {
	if v.Dot(p.centre) < p.cosCap-1e-9 { // a cap of less than a hemisphere is convex: no edge leaves it
		return false
	}
	q, in := p.flat(v), false
	for _, i := range p.bands.at(q.y) {
		if e := &p.edges[i]; e.spans(q.y) && q.x < e.xAt(q.y) {
			in = !in
		}
	}
	return in
}

// strictly reports whether the unit vector v lies inside and not on an edge.
func (p *Polygon) strictly(v Vec) bool {
	if v.Dot(p.centre) < p.cosCap-1e-9 {
		return false
	}
	q, in := p.flat(v), false
	for _, i := range p.bands.at(q.y) {
		e := &p.edges[i]
		if e.spans(q.y) && q.x < e.xAt(q.y) {
			in = !in
		}
		if e.holds(q) {
			return false
		}
	}
	return in
}

// Overlaps reports whether two polygons have more than a line in common, and a
// place where they do.
//
// Method: where the insides of two polygons meet, one holds a part of an edge of
// the other, or they are one and the same and have a place inside in common.
func (p *Polygon) Overlaps(o *Polygon) (Vec, bool) {
	pc, pr := p.Cap()
	oc, or := o.Cap()
	if Angle(pc, oc) > pr+or {
		return Vec{}, false
	}
	for _, pair := range [...][2]*Polygon{{p, o}, {o, p}} {
		a, b := pair[0], pair[1]
		if v := a.round(a.inside()); b.strictly(v) {
			return v, true
		}
		var cuts []float64
		for _, ring := range a.rings {
			for i := 1; i < len(ring); i++ {
				arc, ok := NewArc(ring[i-1], ring[i])
				if !ok {
					continue
				}
				cuts = b.Cuts(&arc, cuts[:0])
				for m := range arc.Between(cuts) {
					if v := m.Midpoint(); b.strictly(v) {
						return v, true
					}
				}
			}
		}
	}
	return Vec{}, false
}
