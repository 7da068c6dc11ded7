package sphere

import (
	"fmt"
	"math"
)

// Quad is the part of the Earth between two parallels and two meridians, up to
// all of it.
type Quad struct {
	west, span   float64 // degrees; span is within (0, 360]
	south, north float64 // degrees
	sinS, sinN   float64
	centre       Vec
	rad          float64
}

// NewQuad returns what lies from west eastward to east, between south and north,
// in degrees. Longitudes are -180 to 360; east may be less than west, across
// ±180°. Two longitudes of one meridian 360° apart mean all the way round.
func NewQuad(west, south, east, north float64) (*Quad, error) {
	switch {
	case !(south >= -90 && north <= 90 && south < north):
		return nil, fmt.Errorf("south %g and north %g enclose no area; south must be less than north", south, north)
	case !(west >= -180 && west <= 360 && east >= -180 && east <= 360):
		return nil, fmt.Errorf("west %g and east %g must be within -180 and 360", west, east)
	}
	span := math.Mod(east-west, 360)
	switch {
	case east-west >= 360:
		span = 360
	case span < 0:
		span += 360
	}
	q := &Quad{west: WrapLon(west), span: span, south: south, north: north, sinS: FromLonLat(LonLat{0, south}).Z, sinN: FromLonLat(LonLat{0, north}).Z}
	if !(q.AreaKm2() >= minPolygonKm2) {
		return nil, fmt.Errorf("west %g and east %g enclose no area (less than 1 m²); west must be less than east, or greater to cross ±180°", west, east)
	}
	q.bound()
	return q, nil
}

// bound finds a cap around the quad.
func (q *Quad) bound() {
	q.centre = FromLonLat(LonLat{q.west + q.span/2, (q.south + q.north) / 2})
	if q.span > 180 { // the cap around the nearer pole, or the whole sphere
		q.centre, q.rad = Vec{Z: 1}, (90-q.south)*radPerDeg
		if q.south+q.north < 0 {
			q.centre, q.rad = Vec{Z: -1}, (90+q.north)*radPerDeg
		}
		return
	}
	for _, ring := range q.Outline() {
		for _, v := range ring {
			q.rad = max(q.rad, Angle(q.centre, v))
		}
	}
	q.rad += outlineStepDeg * radPerDeg
}

// AreaKm2 returns the area on the WGS84 ellipsoid, in closed form.
func (q *Quad) AreaKm2() float64 {
	return q.span * radPerDeg * (zoneAreaKm2(q.sinN) - zoneAreaKm2(q.sinS))
}

// Contains reports whether the unit vector v lies inside.
func (q *Quad) Contains(v Vec) bool {
	if v.Z < q.sinS || v.Z > q.sinN {
		return false
	}
	if q.span == 360 {
		return true
	}
	east := math.Atan2(v.Y, v.X)*degPerRad - q.west
	if east < 0 {
		east += 360
	}
	if east >= 360 {
		east -= 360
	}
	return east <= q.span
}

// Cap returns a cap that holds the quad.
func (q *Quad) Cap() (centre Vec, rad float64) { return q.centre, q.rad + 1e-9 }

// Cuts appends the angles along an arc at which it may meet a side.
func (q *Quad) Cuts(s *Arc, out []float64) []float64 {
	length := s.Length()
	t := s.N.Cross(s.A)
	add := func(angle float64) {
		angle = math.Mod(angle+4*math.Pi, 2*math.Pi)
		if angle > 0 && angle < length {
			out = append(out, angle)
		}
	}
	rho, top := math.Hypot(s.A.Z, t.Z), math.Atan2(t.Z, s.A.Z)
	for _, z := range [...]float64{q.sinS, q.sinN} {
		if math.Abs(z) <= rho {
			d := math.Acos(z / rho)
			add(top + d)
			add(top - d)
		}
	}
	if q.span == 360 {
		return out
	}
	for _, lon := range [...]float64{q.west, q.west + q.span} {
		sin, cos := math.Sincos(lon * radPerDeg)
		n := Vec{X: -sin, Y: cos}
		zero := math.Atan2(-s.A.Dot(n), t.Dot(n))
		add(zero)
		add(zero + math.Pi)
	}
	return out
}

// outlineStepDeg is the longest arc that stands for a part of a parallel in an
// outline: off by 4 m at 60° latitude.
const outlineStepDeg = 0.1

// Outline returns the sides as one closed ring; as two, or none, where the quad
// goes all the way round. Parallels are divided into arcs of at most 0.1°.
func (q *Quad) Outline() [][]Vec {
	parallel := func(lat, from, to float64) (out []Vec) {
		steps := int(math.Ceil(math.Abs(to-from) / outlineStepDeg))
		if math.Abs(lat) == 90 {
			steps = 1
		}
		for i := range steps + 1 {
			out = append(out, FromLonLat(LonLat{from + (to-from)*float64(i)/float64(steps), lat}))
		}
		return out
	}
	var out [][]Vec
	west, east := q.west, q.west+q.span
	if q.span == 360 {
		for _, lat := range [...]float64{q.south, q.north} {
			if math.Abs(lat) < 90 {
				out = append(out, parallel(lat, west, east))
			}
		}
		return out
	}
	meridian := func(lon, from, to float64) []Vec { // a side may be half a turn long: in two
		return []Vec{FromLonLat(LonLat{lon, (from + to) / 2})}
	}
	ring := parallel(q.south, west, east)
	ring = append(ring, meridian(east, q.south, q.north)...)
	ring = append(ring, parallel(q.north, east, west)...)
	ring = append(ring, meridian(west, q.north, q.south)...)
	return append(out, append(ring, ring[0]))
}

// Sample appends n places; see [Polygon.Sample].
func (q *Quad) Sample(n int, out []Sample) []Sample {
	for k := range n {
		z := q.sinS + (q.sinN-q.sinS)*(float64(k)+0.5)/float64(n)
		sin, cos := math.Sincos((q.west + q.span*golden(k)) * radPerDeg)
		h := math.Sqrt(math.Max(0, 1-z*z))
		v := Vec{h * cos, h * sin, z}
		out = append(out, Sample{v, AreaDensity(v)})
	}
	return out
}
