package slab

import (
	"fmt"
	"math"
	"slices"

	"nearmargin/setting/sphere"
)

// Contour is a line of equal depth on a slab's top. The slab deepens to the right
// of it.
type Contour struct {
	DepthKm float64
	SigmaKm float64
	Path    []sphere.LonLat
}

// contourSurface is a surface between contours.
//
// Method: between two contours the depth follows from the distances d1 and d2 to
// both, z = z1 + (z2-z1)·d1/(d1+d2). Dip and its direction are those of the gradient
// of z, (z2-z1)·(d2·u1 + d1·u2)/(d1+d2)², with the unit vectors u1 away from the
// nearest point of the upper contour and u2 towards that of the lower. The footprint
// of each strip is the ring of its two contours and the arcs that join their ends.
//
// Accuracy: exact on the contours, continuous everywhere inside; dip and direction
// jump where the nearest point does, as at kinks.
type contourSurface struct {
	contours  []contour
	strips    []*sphere.Region
	footprint *sphere.Region  // of all strips
	ends      [2]*sphere.Path // the arcs that join the contours' starts, and their ends
	centre    sphere.Vec
	capRad    float64
	cosCap    float64
	cap       sphere.Cap
}

type contour struct {
	depthKm, sigmaKm float64
	path             *sphere.Path
	given            Contour
}

// NewContours builds a surface from at least two contours, from the shallowest to
// the deepest.
func NewContours(cs []Contour) (Surface, error) {
	if len(cs) < 2 {
		return nil, fmt.Errorf("%d contours; at least 2 are needed", len(cs))
	}
	s := &contourSurface{}
	var starts, ends []sphere.Vec
	for i, c := range cs {
		switch {
		case !(c.DepthKm >= 0 && c.DepthKm <= 800):
			return nil, fmt.Errorf("contour %d: depth_km is %g; it must be within 0 and 800", i+1, c.DepthKm)
		case i > 0 && c.DepthKm <= cs[i-1].DepthKm:
			return nil, fmt.Errorf("contour %d: depth_km %g does not lie below the one before, %g", i+1, c.DepthKm, cs[i-1].DepthKm)
		case !(c.SigmaKm > 0) || math.IsInf(c.SigmaKm, 0):
			return nil, fmt.Errorf("contour %g km: sigma_km is %g; it must be more than 0", c.DepthKm, c.SigmaKm)
		}
		var pts []sphere.Vec
		for _, p := range c.Path {
			pts = append(pts, sphere.FromLonLat(p))
		}
		path, err := sphere.NewPath(pts)
		if err != nil {
			return nil, fmt.Errorf("contour %g km: %w", c.DepthKm, err)
		}
		s.contours = append(s.contours, contour{c.DepthKm, c.SigmaKm, path, c})
		starts, ends = append(starts, path.Start()), append(ends, path.End())
	}
	for i := 1; i < len(cs); i++ {
		if err := s.addStrip(i); err != nil {
			return nil, err
		}
	}
	var err error
	for i, pts := range [...][]sphere.Vec{starts, ends} {
		if s.ends[i], err = sphere.NewPath(pts); err != nil {
			return nil, fmt.Errorf("the contours' ends: %w", err)
		}
	}
	if err := s.addFootprint(); err != nil {
		return nil, err
	}
	s.bound()
	return s, nil
}

// addFootprint closes the ring around all strips: the first contour, the ends of
// all, the last contour, the starts of all.
func (s *contourSurface) addFootprint() error {
	last := len(s.contours) - 1
	ring := slices.Clone(s.contours[0].given.Path)
	for _, c := range s.contours[1:last] {
		ring = append(ring, c.given.Path[len(c.given.Path)-1])
	}
	ring = appendReversed(ring, s.contours[last].given.Path)
	for i := last - 1; i >= 0; i-- {
		ring = append(ring, s.contours[i].given.Path[0])
	}
	var err error
	if s.footprint, err = sphere.NewRegion(ring); err != nil {
		return fmt.Errorf("around all contours: %w", err)
	}
	return nil
}

func appendReversed(to, path []sphere.LonLat) []sphere.LonLat {
	for j := len(path) - 1; j >= 0; j-- {
		to = append(to, path[j])
	}
	return to
}

// addStrip closes the ring between contour i-1 and contour i, and checks that the
// lower runs the same way as the upper and lies to the right of it.
func (s *contourSurface) addStrip(i int) error {
	up, low := &s.contours[i-1], &s.contours[i]
	ring := appendReversed(slices.Clone(up.given.Path), low.given.Path)
	region, err := sphere.NewRegion(append(ring, ring[0]))
	if err != nil {
		return fmt.Errorf("between the contours of %g and %g km: %w", up.depthKm, low.depthKm, err)
	}
	s.strips = append(s.strips, region)
	left, against, n := 0, 0, low.path.Len()
	for j := range n {
		leg := low.path.Leg(j)
		m := leg.Midpoint()
		_, k, where, _ := up.path.Nearest(m)
		upper := up.path.Leg(k)
		if where == sphere.Inside && upper.Side(m) > 0 {
			left++
		}
		if upper.Tangent(upper.Midpoint()).Dot(leg.B.Sub(leg.A)) < 0 {
			against++
		}
	}
	if against*2 > n {
		return fmt.Errorf("the contours of %g and %g km run in opposite directions; the slab must deepen to the right of both", up.depthKm, low.depthKm)
	}
	if left*2 > n {
		return fmt.Errorf("the contour of %g km lies to the left of that of %g km; the slab must deepen to the right", low.depthKm, up.depthKm)
	}
	return nil
}

func (s *contourSurface) bound() {
	for _, c := range s.contours {
		for j := range c.path.Len() {
			leg := c.path.Leg(j)
			s.centre = s.centre.Add(leg.Midpoint())
		}
	}
	s.centre = s.centre.Unit()
	for _, c := range s.contours {
		for j := range c.path.Len() {
			leg := c.path.Leg(j)
			s.capRad = max(s.capRad, sphere.Angle(s.centre, leg.A), sphere.Angle(s.centre, leg.B))
		}
	}
	s.cosCap = math.Cos(s.capRad)
	s.cap = sphere.NewCap(s.centre, s.capRad)
}

// Contours returns the contours of a surface that was built from them, nil of any
// other.
func Contours(s Surface) []Contour {
	c, ok := s.(*contourSurface)
	if !ok {
		return nil
	}
	var out []Contour
	for _, k := range c.contours {
		out = append(out, k.given)
	}
	return out
}

func (s *contourSurface) Cap() (sphere.Vec, float64) { return s.centre, s.capRad }

func (s *contourSurface) At(p sphere.Vec) (Reading, bool) {
	if p.Dot(s.centre) < s.cosCap {
		return Reading{}, false
	}
	for i, strip := range s.strips {
		if strip.Contains(p) {
			return s.between(p, i), true
		}
	}
	// a place on the contour that two strips share may count as outside of both
	if s.footprint.Contains(p) {
		for i := 1; i < len(s.contours)-1; i++ {
			if _, _, _, rad := s.contours[i].path.Nearest(p); rad < onContourRad {
				return s.between(p, i), true
			}
		}
	}
	return Reading{}, false
}

// onContourRad is the distance within which a place counts as on a contour: 6 mm.
const onContourRad = 1e-9

// between reads strip i, between contour i and the next.
func (s *contourSurface) between(p sphere.Vec, i int) Reading {
	up, low := &s.contours[i], &s.contours[i+1]
	q1, leg1, _, d1 := up.path.Nearest(p)
	q2, leg2, _, d2 := low.path.Nearest(p)
	d1, d2 = sphere.RadToKm(d1), sphere.RadToKm(d2)
	// unit vectors away from the upper contour and towards the lower; on a contour its normal to the right
	away, towards := p.Sub(q1).Unit(), q2.Sub(p).Unit()
	const onContourKm = 1e-6
	if d1 < onContourKm {
		leg := up.path.Leg(leg1)
		away = leg.N.Scale(-1)
	}
	if d2 < onContourKm {
		leg := low.path.Leg(leg2)
		towards = leg.N.Scale(-1)
	}
	wide := max(d1+d2, onContourKm)
	t, down := d1/wide, away.Scale(d2/wide).Add(towards.Scale(d1/wide)) // down·(z2-z1)/wide is the gradient
	return Reading{
		DepthKm:       up.depthKm + t*(low.depthKm-up.depthKm),
		SigmaKm:       up.sigmaKm + t*(low.sigmaKm-up.sigmaKm),
		DipDeg:        math.Atan2((low.depthKm-up.depthKm)*down.Norm(), wide) * 180 / math.Pi,
		DipAzimuthDeg: p.Azimuth(down),
		ThicknessKm:   math.NaN(),
	}
}

func (s *contourSurface) Outside(p sphere.Vec, withinKm float64) (Outside, bool) {
	if s.cap.Beyond(p, sphere.ReachOf(sphere.KmToRad(withinKm))) {
		return Outside{}, false
	}
	last := len(s.contours) - 1
	// the rim: first and last contour, and the arcs that join the contours' ends
	best, bestRad, strip := sphere.Vec{}, sphere.KmToRad(withinKm), -1
	see := func(path *sphere.Path, stripOf func(leg int) int) {
		if q, leg, _, rad, ok := path.NearestWithin(p, bestRad); ok && (rad < bestRad || strip < 0) {
			best, bestRad, strip = q, rad, stripOf(leg)
		}
	}
	see(s.contours[0].path, func(int) int { return 0 })
	see(s.contours[last].path, func(int) int { return last - 1 })
	for _, e := range s.ends {
		see(e, func(leg int) int { return leg })
	}
	km := sphere.RadToKm(bestRad)
	if strip < 0 || km > withinKm {
		return Outside{}, false
	}
	r := s.between(best, strip)
	return Outside{outward(best, p, r), km, r}, true
}
