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

// Distance3D returns the shortest distance in km from a site at a depth to the
// slab's surface, within the footprint. p must lie within it.
//
// Method: the surface right below or above is at |clearance|, so none is nearer
// than that beyond a circle of that radius. A polar grid over the circle finds
// where to start, compass searches with shrinking steps from its best places the
// minimum.
//
// Accuracy: within 2 % of a search over the whole surface.
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
	starts := [numStarts]start{{km: distance(0, 0)}}
	for i := 1; i < numStarts; i++ {
		starts[i].km = math.Inf(1)
	}
	for i := 1; i <= rings; i++ {
		for j := range rays {
			sin, cos := math.Sincos(2 * math.Pi * (float64(j) + float64(i%2)/2) / rays)
			e, n := radius*float64(i)/rings*sin, radius*float64(i)/rings*cos
			keepStart(&starts, start{distance(e, n), e, n}, 2*radius/rings)
		}
	}
	best := math.Inf(1)
	for _, s := range starts {
		if !math.IsInf(s.km, 1) {
			best = min(best, s.descend(distance, radius/rings))
		}
	}
	return best
}

// The polar grid of places at which a search for the nearest may start, and how
// many of them are followed.
const (
	rings, rays = 12, 24
	numStarts   = 3
	compass     = 12 // directions
)

// start is a place where a search starts: east and north of the site, and its
// distance from it.
type start struct{ km, east, north float64 }

// keepStart puts a start among the best, which are kept in order and farther
// apart than apartKm from each other.
func keepStart(best *[numStarts]start, s start, apartKm float64) {
	at := numStarts
	for i := range best {
		if s.km < best[i].km {
			at = i
			break
		}
		if math.Hypot(s.east-best[i].east, s.north-best[i].north) < apartKm {
			return // a better one is close by
		}
	}
	if at == numStarts {
		return
	}
	last := numStarts - 1 // the one to give up: one close by, else the worst
	for i := at; i < numStarts; i++ {
		if math.Hypot(s.east-best[i].east, s.north-best[i].north) < apartKm {
			last = i
			break
		}
	}
	copy(best[at+1:last+1], best[at:last])
	best[at] = s
}

// descend is a compass search. The compass turns by the golden angle from round to
// round: a valley along a kink of the surface is met in one of them.
func (s start) descend(distance func(e, n float64) float64, step float64) float64 {
	goldenAngle := math.Pi * (3 - math.Sqrt(5))
	least := max(step/200, 0.005)
	for turn := 0.0; step > least; turn += goldenAngle {
		moved := false
		for j := range compass {
			sin, cos := math.Sincos(turn + 2*math.Pi*float64(j)/compass)
			e, n := s.east+step*sin, s.north+step*cos
			if km := distance(e, n); km < s.km {
				s, moved = start{km, e, n}, true
				break
			}
		}
		if !moved {
			step *= 0.8
		}
	}
	return s.km
}
