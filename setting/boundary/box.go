package boundary

import (
	"fmt"
	"math"
	"slices"

	"github.com/paulmach/orb"

	"nearmargin/setting/sphere"
)

// Box is a region between two meridians and two parallels. Where West is greater
// than East it crosses ±180°.
type Box struct{ West, South, East, North float64 }

// Validate reports what is wrong with the box, if anything.
func (b Box) Validate() error {
	switch {
	case !(b.South >= -90 && b.North <= 90):
		return fmt.Errorf("south %g and north %g must be within -90 and 90", b.South, b.North)
	case b.South > b.North:
		return fmt.Errorf("south %g is greater than north %g; the order is west,south,east,north", b.South, b.North)
	case !(b.West >= -180 && b.West <= 360) || !(b.East >= -180 && b.East <= 360):
		return fmt.Errorf("west %g and east %g must be within -180 and 360", b.West, b.East)
	}
	return nil
}

// parts returns the box cut at ±180°.
func (b Box) parts() []orb.Bound {
	span := func(w, e float64) orb.Bound {
		return orb.Bound{Min: orb.Point{w, b.South}, Max: orb.Point{e, b.North}}
	}
	if b.East-b.West >= 360 {
		return []orb.Bound{span(-180, 180)}
	}
	w, e := sphere.WrapLon(b.West), sphere.WrapLon(b.East)
	if w > e { // also where West is -180: what lies on that meridian is at +180
		return []orb.Bound{span(w, 180), span(-180, e)}
	}
	return []orb.Bound{span(w, e)}
}

// Within returns the boundaries that reach into a box, sorted by id.
func (n *Network) Within(b Box) ([]*Boundary, error) {
	if err := b.Validate(); err != nil {
		return nil, err
	}
	var which []int32
	for _, part := range b.parts() {
		n.boxes.Search(part.Min, part.Max, func(_, _ [2]float64, i int32) bool {
			if l := &n.legs[i]; !slices.Contains(which, l.boundary) && legMeetsBox(l, part) {
				which = append(which, l.boundary)
			}
			return true
		})
	}
	slices.Sort(which)
	out := make([]*Boundary, len(which))
	for i, k := range which {
		out[i] = n.boundaries[k]
	}
	return out, nil
}

// legMeetsBox reports whether a great-circle arc has a point in a box of
// meridians and parallels.
//
// Method: an end lies inside, or the arc meets one of the two meridians between
// the parallels, or one of the two parallels between the meridians. What touches
// the box meets it, as far as rounding allows.
func legMeetsBox(l *leg, b orb.Bound) bool {
	if b.Contains(point(l.arc.A)) || b.Contains(point(l.arc.B)) {
		return true
	}
	for _, lon := range []float64{b.Min[0], b.Max[0]} {
		for _, q := range meetMeridian(&l.arc, lon) {
			if lat := q.LonLat().Lat; lat >= b.Min[1]-touchDeg && lat <= b.Max[1]+touchDeg {
				return true
			}
		}
	}
	for _, lat := range []float64{b.Min[1], b.Max[1]} {
		for _, q := range meetParallel(&l.arc, lat) {
			if lon := q.LonLat().Lon; lon >= b.Min[0]-touchDeg && lon <= b.Max[0]+touchDeg {
				return true
			}
		}
	}
	return false
}

func point(v sphere.Vec) orb.Point {
	p := v.LonLat()
	return orb.Point{p.Lon, p.Lat}
}

// Rounding allowed where an arc touches a box: in degrees, and as an angle along
// the arc.
const (
	touchDeg   = 1e-9
	alongArcOK = -1e-12
)

// covers reports whether the point q of the arc's great circle lies on the arc.
func covers(s *sphere.Arc, q sphere.Vec) bool {
	return s.A.Cross(q).Dot(s.N) >= alongArcOK && q.Cross(s.B).Dot(s.N) >= alongArcOK
}

// meetMeridian returns the point in which the arc meets the meridian, if any; at
// a pole it may return both signs' points. None where the arc runs along it.
func meetMeridian(s *sphere.Arc, lon float64) []sphere.Vec {
	sin, cos := math.Sincos(lon * math.Pi / 180)
	q := s.N.Cross(sphere.Vec{X: -sin, Y: cos}) // on both great circles
	if q.Norm() < 1e-12 {
		return nil
	}
	q = q.Unit()
	var out []sphere.Vec
	for _, q := range []sphere.Vec{q, q.Scale(-1)} {
		if q.Dot(sphere.Vec{X: cos, Y: sin}) >= alongArcOK && covers(s, q) {
			out = append(out, q)
		}
	}
	return out
}

// meetParallel returns the points, at most two, in which the arc meets the
// parallel.
func meetParallel(s *sphere.Arc, lat float64) []sphere.Vec {
	// On the great circle, q(t) = u cos t + w sin t with u, w orthonormal and u the
	// northernmost point; its height is u.Z cos t.
	north := sphere.Vec{Z: 1}
	u := north.Sub(s.N.Scale(s.N.Z)).Unit()
	z := math.Sin(lat * math.Pi / 180)
	if u.Z == 0 || math.Abs(z) > u.Z {
		return nil
	}
	w := s.N.Cross(u)
	t := math.Acos(z / u.Z)
	var out []sphere.Vec
	for _, t := range []float64{t, -t} {
		q := u.Scale(math.Cos(t)).Add(w.Scale(math.Sin(t)))
		if covers(s, q) {
			out = append(out, q)
		}
	}
	return out
}

// boxes returns boxes in longitude and latitude that cover an arc, cut at ±180°:
// arcs bulge towards the poles, and one may run over a pole.
func boxes(s *sphere.Arc) []orb.Bound {
	south, north := latRange(s)
	lo, hi := s.A.LonLat().Lon, s.B.LonLat().Lon
	if lo > hi {
		lo, hi = hi, lo
	}
	span := func(w, e float64) orb.Bound {
		return orb.Bound{Min: orb.Point{w, south}, Max: orb.Point{e, north}}
	}
	switch {
	case north > 89.999 || south < -89.999: // near a pole an arc sweeps over many meridians
		return []orb.Bound{span(-180, 180)}
	case hi-lo > 180: // across ±180°
		return []orb.Bound{span(hi, 180), span(-180, lo)}
	}
	return []orb.Bound{span(lo, hi)}
}

// latRange returns the southernmost and northernmost latitude of an arc.
func latRange(s *sphere.Arc) (south, north float64) {
	a, b := s.A.LonLat().Lat, s.B.LonLat().Lat
	south, north = min(a, b), max(a, b)
	u := sphere.Vec{Z: 1}.Sub(s.N.Scale(s.N.Z)).Unit()
	for _, top := range []sphere.Vec{u, u.Scale(-1)} {
		if s.A.Cross(top).Dot(s.N) > 0 && top.Cross(s.B).Dot(s.N) > 0 {
			lat := top.LonLat().Lat
			south, north = min(south, lat), max(north, lat)
		}
	}
	return south, north
}
