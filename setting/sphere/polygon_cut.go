package sphere

import (
	"iter"
	"math"
	"slices"
)

// Cuts appends the angles along an arc at which it may meet an edge.
//
// Method: the part of the arc within the cap around the polygon is projected into
// the plane and met there with the edges at its heights. An edge that runs along
// the arc gives its two ends.
func (p *Polygon) Cuts(s *Arc, out []float64) []float64 {
	length := s.Length()
	t := s.N.Cross(s.A)
	// the height above the plane through the centre's horizon: ρ cos(angle - top)
	a, b := s.A.Dot(p.centre), t.Dot(p.centre)
	rho := math.Hypot(a, b)
	level := p.cosCap - 1e-9
	if rho <= level {
		return out
	}
	top, half := math.Atan2(b, a), math.Acos(level/rho)
	from, to := max(0, top-half), min(length, top+half)
	if from >= to {
		return out
	}
	at := func(angle float64) planar {
		sin, cos := math.Sincos(angle)
		return p.flat(s.A.Scale(cos).Add(t.Scale(sin)))
	}
	seg := flatEdge{a: at(from), b: at(to)}
	add := func(along float64) {
		v := p.round(planar{seg.a.x + along*(seg.b.x-seg.a.x), seg.a.y + along*(seg.b.y-seg.a.y)})
		if angle := math.Atan2(v.Dot(t), v.Dot(s.A)); angle > 0 && angle < length {
			out = append(out, angle)
		}
	}
	first, last := p.bands.span(seg.minY(), seg.maxY(), p.bands.num())
	for k := first; k <= last; k++ {
		for _, i := range p.bands.list(k) {
			e := &p.edges[i]
			if e.maxX() < seg.minX()-onEdge || e.minX() > seg.maxX()+onEdge {
				continue
			}
			p.meet(&seg, e, add)
		}
	}
	return out
}

// meet reports the fractions of seg at which it meets e, or touches it within
// rounding.
func (p *Polygon) meet(seg, e *flatEdge, add func(along float64)) {
	aOff, aAlong := seg.offset(e.a)
	bOff, bAlong := seg.offset(e.b)
	switch {
	case math.Abs(aOff) <= onEdge && math.Abs(bOff) <= onEdge:
		add(aAlong)
		add(bAlong)
	case aOff > onEdge && bOff > onEdge || aOff < -onEdge && bOff < -onEdge:
	default:
		u := aOff / (aOff - bOff)
		add(aAlong + u*(bAlong-aAlong))
	}
}

// Between returns the parts of an arc between the angles given, which are sorted
// in place; parts too short to have a direction are left out.
func (s *Arc) Between(cuts []float64) iter.Seq[*Arc] {
	return func(yield func(*Arc) bool) {
		if len(cuts) == 0 {
			yield(s)
			return
		}
		slices.Sort(cuts)
		t := s.N.Cross(s.A)
		last, from := 0.0, s.A
		for i := range len(cuts) + 1 {
			to := s.B
			if i < len(cuts) {
				if cuts[i] < last+minArcRad {
					continue
				}
				sin, cos := math.Sincos(cuts[i])
				to, last = s.A.Scale(cos).Add(t.Scale(sin)), cuts[i]
			}
			part := Arc{from, to, s.N}
			if Angle(from, to) >= minArcRad && !yield(&part) {
				return
			}
			from = to
		}
	}
}
