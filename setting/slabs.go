package setting

import (
	"math"

	"nearmargin/setting/boundary"
	"nearmargin/setting/slab"
)

// maxSlabs bounds how many slabs an answer looks at for one site.
const maxSlabs = 8

// slabEvidence is a slab below the site, or near it.
type slabEvidence struct {
	slab     *slab.Slab
	index    int // in the model
	reading  slab.Reading
	z, sigma float64 // of the slab's top; at the nearest point of the footprint where the site is outside
	beyond   slab.Beyond
	outKm    float64
	looked   bool         // for the trench
	trench   boundary.Hit // the nearest boundary that the slab goes down from
	trenchKm float64      // +Inf where there is none within reach, or it was not looked for
}

// unknownDepthSigmaKm is taken where a surface gives no σ.
const unknownDepthSigmaKm = 20

// slabTrenchReachKm is how far a slab's boundaries are looked for: slabs that lie
// flat in the mantle reach more than 1,500 km from their trench.
const slabTrenchReachKm = 3000

// gatherSlabs collects every slab below the place, and those whose rim or end is
// within reach.
func (e *evidence) gatherSlabs(l *Lookup, p boundary.Place) {
	e.nSlabs = 0
	const margin = 1 + 3*fifteen // of the limit, less than slab.NearKm in all
	for i, s := range l.m.c.Slabs {
		if !s.Near(p.Vec) {
			continue
		}
		x := &e.slabs[e.nSlabs]
		x.slab, x.index, x.beyond, x.outKm = s, i, slab.NotBeyond, 0
		x.looked, x.trenchKm = false, math.Inf(1)
		var in bool
		if x.reading, in = s.Surface.At(p.Vec); !in {
			out, near := s.Surface.Outside(p.Vec, e.limit[limitPastRim]*margin)
			if !near {
				continue
			}
			x.reading, x.beyond, x.outKm = out.Reading, out.Beyond, out.Km
		}
		x.z, x.sigma = x.reading.DepthKm, x.reading.SigmaKm
		if math.IsNaN(x.sigma) {
			x.sigma = unknownDepthSigmaKm
		}
		if e.nSlabs++; e.nSlabs == maxSlabs {
			return
		}
	}
}

// slabTrench returns the distance to the nearest boundary that slab i goes down
// from.
func (e *evidence) slabTrench(i int) float64 {
	s := &e.slabs[i]
	if !s.looked {
		s.looked = true
		if h, ok := e.look.m.slabTies[s.index].group.NearestWith(e.place, slabTrenchReachKm, e.sights); ok {
			s.trench, s.trenchKm = h, h.DistanceKm
		}
	}
	return s.trenchKm
}

// decidingSlab returns which slab of subduction decides: of those below the site
// one in the arc band, else the shallowest; where none is below, the nearest of
// those past whose down-dip rim the site is. It returns -1 where there is none.
func (e *evidence) decidingSlab() int {
	best, below := -1, 0
	inBand := func(i int) bool {
		s := &e.slabs[i]
		return s.z >= s.slab.ArcMinDepthKm*e.limit[limitArcMin] && s.z <= e.limit[limitSlabArc]
	}
	for i := range e.slabs[:e.nSlabs] {
		s := &e.slabs[i]
		if s.slab.Kind != slab.Subduction || s.beyond != slab.NotBeyond {
			continue
		}
		below++
		if best < 0 || inBand(i) && !inBand(best) || inBand(i) == inBand(best) && s.z < e.slabs[best].z {
			best = i
		}
	}
	if best >= 0 {
		if e.watch.on && below > 1 {
			for i := range e.slabs[:e.nSlabs] {
				e.watch.z[i] = true
			}
			e.watch.limit[limitArcMin], e.watch.limit[limitSlabArc] = true, true
		}
		return best
	}
	for i := range e.slabs[:e.nSlabs] {
		s := &e.slabs[i]
		if e.watch.on && s.beyond == slab.PastRim {
			e.watchLimit(s.outKm, limitPastRim, 1)
		}
		if s.slab.Kind == slab.Subduction && s.beyond == slab.PastRim && s.outKm <= e.limit[limitPastRim] && (best < 0 || s.outKm < e.slabs[best].outKm) {
			best = i
		}
	}
	return best
}

// slabLabel returns what slab i makes of the site above it: the label, one more that
// is as well possible, and the limit that decides. NoLabel means that the slab is
// too deep or too far.
func (e *evidence) slabLabel(i int) (label, also Label, limit LimitID) {
	s := &e.slabs[i]
	if e.watchDepth(i, limitSlabForearc, 1); s.z < e.limit[limitSlabForearc] {
		return Forearc, NoLabel, limitSlabForearc
	}
	if e.watchDepth(i, limitArcMin, s.slab.ArcMinDepthKm); s.z < s.slab.ArcMinDepthKm*e.limit[limitArcMin] {
		return Forearc, VolcanicArc, limitArcMin
	}
	if e.watchDepth(i, limitSlabArc, 1); s.z <= e.limit[limitSlabArc] {
		return VolcanicArc, NoLabel, limitSlabArc
	}
	if e.watchDepth(i, limitSlabArcMaybe, 1); s.z <= e.limit[limitSlabArcMaybe] {
		return BackArc, VolcanicArc, limitSlabArcMaybe
	}
	if e.watchDepth(i, limitSlabBackArc, 1); s.z <= e.limit[limitSlabBackArc] && e.trenchWithin(i, limitSlabTrench) {
		return BackArc, NoLabel, limitSlabBackArc
	}
	return NoLabel, BackArc, limitSlabBackArc
}

// SlabAnswer is a slab below the site.
type SlabAnswer struct {
	Slab *slab.Slab
	slab.Reading
	// Where the site has a depth: how it lies to the slab, its height above the
	// slab's top (negative below), and the shortest distance to the surface (NaN in
	// a brief answer).
	Relation     slab.Relation
	ClearanceKm  float64
	Distance3DKm float64
}

// addSlabs lists the slabs below the site, the one that decides first, then from
// the shallowest.
func (l *Lookup) addSlabs(p boundary.Place, a *Answer, e *evidence, first int) {
	done := [maxSlabs]bool{}
	for range e.nSlabs {
		next := -1
		for i := range e.slabs[:e.nSlabs] {
			if done[i] || e.slabs[i].beyond != slab.NotBeyond {
				continue
			}
			if next < 0 || i == first || next != first && e.slabs[i].z < e.slabs[next].z {
				next = i
			}
		}
		if next < 0 {
			return
		}
		done[next] = true // #nosec G602 -- next is the index of a slab, or negative and returned on
		s := &e.slabs[next]
		x := SlabAnswer{Slab: s.slab, Reading: s.reading, ClearanceKm: math.NaN(), Distance3DKm: math.NaN()}
		if d := a.Site.DepthKm; !math.IsNaN(d) {
			x.Relation, x.ClearanceKm = x.Relate(d)
			if !l.brief {
				x.Distance3DKm = s.slab.Distance3D(p.Vec, d)
			}
		}
		a.Slabs.add(x)
	}
}
