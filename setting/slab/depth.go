package slab

import (
	"math"

	"nearmargin/setting/sphere"
)

// Relation says how a site at depth lies to a slab.
type Relation uint8

// The relations; the zero value is none.
const (
	NoRelation    Relation = 0
	Above         Relation = 1
	NearInterface Relation = 2
	Within        Relation = 3
	Below         Relation = 4
)

var relationNames = [...]string{"none", "above", "near_interface", "within", "below"}

// String returns the relation as answers spell it.
func (r Relation) String() string { return relationNames[r] }

// interfaceKm is the least distance from the slab's top that counts as near it.
const interfaceKm = 10

// Relate returns how a site at a depth lies to the slab below it, and its height
// above the slab's top in km.
//
// Near the interface is within the larger of σ and 10 km; within the slab is
// below its top by no more than its thickness, measured square to the surface and
// so longer along the vertical by 1/cos(dip).
func (r *Reading) Relate(siteDepthKm float64) (Relation, float64) {
	clearance := r.DepthKm - siteDepthKm
	near := float64(interfaceKm)
	if r.SigmaKm > near { // false for NaN
		near = r.SigmaKm
	}
	switch {
	case math.Abs(clearance) <= near:
		return NearInterface, clearance
	case clearance > 0:
		return Above, clearance
	case -clearance <= r.ThicknessKm/math.Max(0.05, math.Cos(r.DipDeg*math.Pi/180)): // false for NaN
		return Within, clearance
	}
	return Below, clearance
}

// goldenAngle in radians: its multiples never repeat a direction.
const goldenAngle = 2.399963229728653

// Distance3D returns the shortest distance in km from a site at a depth to the
// slab's surface, within the footprint. p must lie within it.
//
// Method: the surface right below or above is at |clearance|, so none is nearer
// than that beyond a circle of that radius. A polar grid over the circle finds
// where to start, a compass search with halving steps the minimum.
//
// Accuracy: within 1 % of a search over the whole surface.
func (s *Slab) Distance3D(p sphere.Vec, siteDepthKm float64) float64 {
	here, ok := s.Surface.At(p)
	if !ok {
		return math.NaN()
	}
	site := p.Scale(sphere.MeanRadiusKm - siteDepthKm)
	east, north := p.EastNorth()
	offset := func(e, n float64) sphere.Vec { // e and n are km along the surface
		return p.Add(east.Scale(e / sphere.MeanRadiusKm)).Add(north.Scale(n / sphere.MeanRadiusKm)).Unit()
	}
	distance := func(e, n float64) float64 {
		q := offset(e, n)
		r, ok := s.Surface.At(q)
		if !ok {
			return math.Inf(1)
		}
		return q.Scale(sphere.MeanRadiusKm - r.DepthKm).Sub(site).Norm()
	}
	radius := math.Abs(here.DepthKm-siteDepthKm) * 1.1 // at depth the same angle is less far
	best, be, bn := distance(0, 0), 0.0, 0.0
	const rings, rays = 10, 24
	for i := 1; i <= rings; i++ {
		for j := range rays {
			sin, cos := math.Sincos(2 * math.Pi * float64(j) / rays)
			e, n := radius*float64(i)/rings*sin, radius*float64(i)/rings*cos
			if d := distance(e, n); d < best {
				best, be, bn = d, e, n
			}
		}
	}
	turn := 0.0
	for step := radius / rings; step > radius/2000 && step > 0.005; {
		moved := false
		turn += goldenAngle // a valley along a kink of the surface is met in one of the rounds
		for j := range 8 {
			sin, cos := math.Sincos(turn + math.Pi/4*float64(j))
			if d := distance(be+step*sin, bn+step*cos); d < best {
				best, be, bn, moved = d, be+step*sin, bn+step*cos, true
				break
			}
		}
		if !moved {
			step *= 0.7
		}
	}
	return best
}
