package setting

import (
	"fmt"
	"math"

	"nearmargin/setting/boundary"
	"nearmargin/setting/slab"
	"nearmargin/setting/sphere"
)

// SectionReachKm is how far a site may lie outside of a slab's footprint and still
// be on a section of it.
const SectionReachKm = 200

// The reach of a section's line, in km.
const (
	sectionMostKm    = 3000 // from the site, either way
	sectionGapKm     = 100  // over which a slab may be missing within a section
	sectionUpDipKm   = 300  // from a slab's up-dip edge to its trench
	sectionOtherKm   = 100  // from a slab's up-dip edge to a trench that is not among its own
	sectionSeawardKm = 75   // shown seaward of the trench
	sectionMarginKm  = 25   // shown past the slab and the site
	sectionRimKm     = 1    // from a slab's rim, within which it matters not on which side
)

// sectionMinSquare is the sine of the least angle at which a section's line may
// meet the trench: below it a section along the dip says little of the trench.
const sectionMinSquare = 0.5

// cut is a section's line in the making. Distances are km from the site, positive
// down the dip.
type cut struct {
	slab    *slab.Slab
	network *boundary.Network
	group   *boundary.Group
	lines   []*boundary.Boundary // those that the slab goes down from
	place   boundary.Place
	outKm   float64 // from the site to the slab's footprint, 0 where the slab is below

	dipDeg float64 // azimuth of the dip below the site or at the nearest point of the footprint
	lineAzimuth
	first, last float64 // where the slab begins and ends on the line
	trench      boundary.Hit
	square      float64 // sine of the angle between line and trench
	zero        float64 // where distances from the trench count from
}

// lineAzimuth is a direction with what gave it.
type lineAzimuth struct {
	deg  float64
	from AzimuthSource
}

// sectionSlab returns the line of a section through the slab that it shows: the
// first below the site, else the nearest of those up or down whose dip the site lies.
func (l *Lookup) sectionSlab(p boundary.Place, a *Answer) (*cut, error) {
	if a.Slabs.Len() > 0 {
		first := &a.Slabs.All()[0]
		if c := l.newCut(p, l.m.slabIndex(first.Slab), 0, first.DipAzimuthDeg); c.choose() {
			return c, nil
		}
		return nil, &NoSlabError{Nearest: first.Slab}
	}
	var best *cut
	for i, s := range l.m.c.Slabs {
		out, ok := s.Surface.Outside(p.Vec, SectionReachKm)
		if !ok || out.Beyond == slab.PastEnd && out.Km > sectionRimKm || best != nil && out.Km >= best.outKm {
			continue
		}
		if c := l.newCut(p, i, out.Km, out.Reading.DipAzimuthDeg); c.choose() {
			best = c
		}
	}
	if best == nil {
		return nil, l.m.noSlab(p)
	}
	return best, nil
}

func (m *Model) slabIndex(s *slab.Slab) int {
	for i := range m.c.Slabs {
		if m.c.Slabs[i] == s {
			return i
		}
	}
	return -1
}

func (l *Lookup) newCut(p boundary.Place, index int, outKm, dipDeg float64) *cut {
	c := &cut{slab: l.m.c.Slabs[index], network: l.m.network, group: l.m.slabTies[index].group, place: p, outKm: outKm, dipDeg: dipDeg}
	for _, id := range c.slab.BoundaryIDs {
		if b, ok := l.m.network.Boundary(id); ok {
			c.lines = append(c.lines, b)
		}
	}
	return c
}

// choose settles the line: along the local dip where that meets the trench
// squarely enough, else away from the nearest point of the trench, else along the
// local dip without a trench. It reports whether the line passes over the slab.
func (c *cut) choose() bool {
	var tries []lineAzimuth
	if !math.IsNaN(c.dipDeg) {
		tries = append(tries, lineAzimuth{c.dipDeg, FromDip})
	}
	if h, ok := c.group.Nearest(c.place, sectionMostKm); ok && len(c.lines) > 0 && !math.IsNaN(h.AzimuthDeg) {
		tries = append(tries, lineAzimuth{c.awayFrom(&h), FromTrench})
	}
	for _, try := range tries {
		if c.lineAzimuth = try; c.extent() && c.cross() && c.square >= sectionMinSquare {
			return true
		}
	}
	for _, try := range tries {
		if c.lineAzimuth = try; c.extent() {
			c.cross()
			return true
		}
	}
	return false
}

// awayFrom returns the azimuth at the site that leads away from the nearest point
// of the trench, or towards it where the site is on the side that goes down.
func (c *cut) awayFrom(h *boundary.Hit) float64 {
	b := h.Boundary
	left := h.NearestVec.Cross(h.Along).Dot(c.place.Vec) > 0
	if onSinking := b.Subducting() != "" && (b.Subducting() == b.Left()) == left; onSinking {
		return h.AzimuthDeg
	}
	return sphere.Wrap360(h.AzimuthDeg + 180)
}

// at returns the place at a distance from the site.
func (c *cut) at(km float64) sphere.LonLat {
	return sphere.Direct(c.place.LonLat, c.deg, km)
}

// extent finds where the slab begins and ends on the line: the run of samples
// with the slab below that is nearest to the site, with gaps of sectionGapKm at
// the most. It reports false where the line does not meet the slab.
func (c *cut) extent() bool {
	in := func(km float64) bool {
		_, ok := c.slab.Surface.At(sphere.FromLonLat(c.at(km)))
		return ok
	}
	run := func(step, gap float64) (near, far float64) {
		near, far = math.NaN(), math.NaN()
		for km, missing := 0.0, 0.0; math.Abs(km) <= sectionMostKm && missing <= gap; km += step {
			if !in(km) {
				missing += math.Abs(step)
				continue
			}
			if math.IsNaN(near) {
				near, gap = km, sectionGapKm
			}
			far, missing = km, 0
		}
		return near, far
	}
	gap := float64(sectionGapKm)
	if c.outKm > 0 {
		gap = 2 * SectionReachKm // the line does not leave by the shortest way
	}
	upNear, upFar := run(-SectionStepKm, gap)
	downNear, downFar := run(SectionStepKm, gap)
	switch {
	case math.IsNaN(upNear) && math.IsNaN(downNear):
		return false
	case math.IsNaN(upNear):
		c.first, c.last = downNear, downFar
	case math.IsNaN(downNear):
		c.first, c.last = upFar, upNear
	default:
		c.first, c.last = upFar, downFar
	}
	return c.last > c.first
}

// cross finds where the line meets the trench: the crossing with one of the
// slab's boundaries that is nearest to the slab's up-dip edge, no more than
// sectionUpDipKm from it; else one with any subduction boundary at which the plate
// on the up-dip side goes down, no more than sectionOtherKm from the edge. It sets
// where distances count from, and reports whether there is a crossing.
func (c *cut) cross() bool {
	c.trench, c.square, c.zero = boundary.Hit{}, 0, c.first
	if !c.crossAny(c.lines, sectionUpDipKm, false) {
		c.crossAny(c.network.Boundaries(), sectionOtherKm, true)
	}
	return c.trench.Boundary != nil
}

// crossAny is cross for a list of boundaries. With check it takes subduction
// boundaries alone whose down-going plate lies on the up-dip side.
//
// Method: the geodesic is taken as great-circle arcs of sectionArcKm, which leave
// it by less than 0.1 m.
func (c *cut) crossAny(list []*boundary.Boundary, reachKm float64, check bool) bool {
	const sectionArcKm = 50
	best := math.Inf(1)
	until := math.Min(c.first+reachKm, c.last)
	var arcs []sphere.Arc
	for km := c.first - reachKm; km < until; km += sectionArcKm {
		if arc, ok := sphere.NewArc(sphere.FromLonLat(c.at(km)), sphere.FromLonLat(c.at(math.Min(km+sectionArcKm, until)))); ok {
			arcs = append(arcs, arc)
		}
	}
	for _, b := range list {
		if check && b.Type() != boundary.Subduction {
			continue
		}
		path := b.Path()
		for i := 1; i < len(path); i++ {
			leg, _ := sphere.NewArc(sphere.FromLonLat(path[i-1]), sphere.FromLonLat(path[i]))
			for j := range arcs {
				q, meets := meeting(&arcs[j], &leg)
				if !meets {
					continue
				}
				km := c.distance(q)
				off := math.Abs(km - c.first)
				if off >= best || check && !sinksBefore(b, &leg, &arcs[j]) {
					continue
				}
				best = off
				along := leg.Tangent(q)
				c.trench = boundary.Hit{
					Boundary: b, Nearest: q.LonLat(), NearestVec: q, Along: along,
					PathAzimuthDeg: q.Azimuth(along), DistanceKm: math.Abs(km), AzimuthDeg: math.NaN(),
				}
				c.square, c.zero = arcs[j].Tangent(q).Cross(along).Norm(), km
			}
		}
	}
	return !math.IsInf(best, 1)
}

// meeting returns the point in which two arcs meet, and whether they do: also where
// one ends on the other, unlike [sphere.Arc.Cross], since a line often runs through
// a vertex of the trench.
func meeting(a, b *sphere.Arc) (sphere.Vec, bool) {
	const touching = 1e-12 // 6 µm
	q := a.N.Cross(b.N)
	if q.Norm() < 1e-9 { // on one great circle
		return sphere.Vec{}, false
	}
	q = q.Unit()
	if q.Dot(a.Midpoint()) < 0 {
		q = q.Scale(-1)
	}
	for _, x := range [...]*sphere.Arc{a, b} {
		if x.A.Cross(q).Dot(x.N) < -touching || q.Cross(x.B).Dot(x.N) < -touching {
			return sphere.Vec{}, false
		}
	}
	return q, true
}

// sinksBefore reports whether the plate that goes down at a leg of a boundary is
// the one from which the arc comes.
func sinksBefore(b *boundary.Boundary, leg, arc *sphere.Arc) bool {
	return (b.Subducting() == b.Left()) == (leg.Side(arc.A) > 0)
}

// distance returns how far along the line a place on it lies from the site.
func (c *cut) distance(q sphere.Vec) float64 {
	km, az := sphere.Inverse(c.place.LonLat, q.LonLat())
	if math.Cos((az-c.deg)*math.Pi/180) < 0 {
		return -km
	}
	return km // 0 where az is NaN
}

// line returns the section's line, its ends on multiples of the step from the
// trench.
func (c *cut) line() SectionLine {
	site := -c.zero
	from := math.Min(-sectionSeawardKm, math.Min(site, c.first-c.zero)-sectionMarginKm)
	to := math.Max(site, c.last-c.zero) + sectionMarginKm
	return SectionLine{
		Origin: c.place.LonLat, OriginKm: site + 0, AzimuthDeg: c.deg, From: c.from,
		FromKm: math.Floor(from/SectionStepKm) * SectionStepKm,
		ToKm:   math.Ceil(to/SectionStepKm) * SectionStepKm,
	}
}

// NoSlabError says that no slab is near enough to a site for a section.
type NoSlabError struct {
	Nearest *slab.Slab // nil where the model has no slabs
	Km      float64    // from the site to its footprint
	Beyond  slab.Beyond
}

func (e *NoSlabError) Error() string {
	switch {
	case e.Nearest == nil:
		return "this edition of the model holds no slab surfaces"
	case e.Km <= SectionReachKm && e.Beyond == slab.PastEnd:
		return fmt.Sprintf("the site lies %.0f km past the lateral end of the nearest slab, %s; give a site above a slab, or up or down its dip within %d km", e.Km, e.Nearest.Name, SectionReachKm)
	case e.Km <= SectionReachKm:
		return fmt.Sprintf("no line through the site crosses the nearest slab, %s, %.0f km away, along its dip; give a site above it", e.Nearest.Name, e.Km)
	}
	return fmt.Sprintf("no slab lies within %d km of the site; the nearest is %s, %.0f km away", SectionReachKm, e.Nearest.Name, e.Km)
}

// noSlab names the slab nearest to a place that is on no section.
func (m *Model) noSlab(p boundary.Place) *NoSlabError {
	e := &NoSlabError{Km: math.Inf(1)}
	for _, s := range m.c.Slabs {
		if _, in := s.Surface.At(p.Vec); in {
			return &NoSlabError{Nearest: s}
		}
		if out, ok := s.Surface.Outside(p.Vec, math.Pi*sphere.MeanRadiusKm); ok && out.Km < e.Km {
			*e = NoSlabError{s, out.Km, out.Beyond}
		}
	}
	return e
}
