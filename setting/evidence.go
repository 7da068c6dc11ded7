package setting

import (
	"math"

	"nearmargin/setting/boundary"
)

// source is one kind of boundary that a rule measures to: the nearest of its
// type that bounds the plate in question.
type source uint8

const (
	sourceOverriding source = 0 // a trench whose other plate goes down
	sourceSubducting source = 1 // a trench at which this plate goes down
	sourceRidge      source = 2
	sourceOceanFault source = 3
	sourceLandFault  source = 4
	sourceRift       source = 5
	sourceConvergent source = 6
	sourceCollision  source = 7
	numSources       source = 8
	noSource                = numSources
)

// sources says where to look for each.
var sources = [numSources]struct {
	kind    boundary.Type
	role    boundary.Role
	reachKm float64
}{
	{boundary.Subduction, boundary.Overriding, 700},
	{boundary.Subduction, boundary.Subducting, 250},
	{boundary.SpreadingRidge, boundary.Bounding, 500},
	{boundary.OceanicTransform, boundary.Bounding, 150},
	{boundary.ContinentalTransform, boundary.Bounding, 160},
	{boundary.ContinentalRift, boundary.Bounding, 200},
	{boundary.OceanicConvergent, boundary.Bounding, 250},
	{boundary.ContinentalConvergent, boundary.Bounding, 800},
}

// evidence is all that the rules compare, for one plate. Distances are looked up
// when a rule first asks, and only as far as it asks; most rules never do.
type evidence struct {
	look    *Lookup
	place   boundary.Place
	plate   string
	near    boundary.Hit // the nearest boundary of all where it bounds the plate, else the zero value
	leastKm float64      // no boundary is nearer than this
	sights  *boundary.Sights

	settledKm   [numSources]float64 // the distance up to which km is known
	km          [numSources]float64 // distance, +Inf where there is none within settledKm
	sigma       [numSources]float64 // 1σ of the line's position
	hit         [numSources]boundary.Hit
	limit       [numLimits]float64
	flank       flank
	trench      trenchView
	zone        ZoneKind
	nearHotspot bool

	slabs  [maxSlabs]slabEvidence
	nSlabs int
	watch  watch
}

// side says on which side of a convergent boundary the plate is.
type side uint8

const (
	sideUnknown side = 0
	sideUpper   side = 1
	sideLower   side = 2
)

// gather starts the evidence for a plate at a place. What the rules compare is looked
// up as they ask, but for the slabs.
func (l *Lookup) gather(p boundary.Place, plate string, a *Answer, e *evidence) {
	e.look, e.place, e.plate, e.sights = l, p, plate, &a.sights
	e.near, e.leastKm = boundary.Hit{}, 0
	if a.Nearest.Boundary != nil {
		e.leastKm = a.Nearest.DistanceKm * surelyLess
		if a.Plate.Code == plate {
			e.near = a.Nearest.Hit
		}
	}
	for s := range sources {
		e.settledKm[s], e.km[s], e.sigma[s] = -1, math.Inf(1), 0
	}
	e.limit = baseLimits
	e.flank.known, e.trench.known = false, false
	e.watch = watch{siteKm: a.Site.sigmaKm()}
	e.zone = NoKind
	if a.Zone != nil {
		e.zone = a.Zone.Kind
	}
	e.nearHotspot = a.Hotspot != nil
	e.gatherSlabs(l, p)
}

// surelyLess is a factor that makes a distance to the nearest boundary, which is
// that on the sphere, less than that to any other on the ellipsoid.
const surelyLess = 0.98

// upTo returns the distance to the nearest boundary of a source, having looked for
// it at least as far as a distance: +Inf where there is none as near as that, or
// none within the source's reach.
func (e *evidence) upTo(s source, km float64) float64 {
	if math.IsInf(e.km[s], 1) && e.settledKm[s] < min(km, sources[s].reachKm) {
		e.find(s, km)
	}
	return e.km[s]
}

func (e *evidence) find(s source, km float64) {
	src := &sources[s]
	km = min(km, src.reachKm)
	if e.near.Answers(src.kind, e.plate, src.role) {
		e.settledKm[s] = math.Inf(1)
		if e.near.DistanceKm <= src.reachKm {
			e.hit[s], e.km[s], e.sigma[s] = e.near, e.near.DistanceKm, e.near.Boundary.SigmaKm()
		}
		return
	}
	e.settledKm[s] = km
	if km < e.leastKm {
		return
	}
	if hit, ok := e.look.m.network.NearestOfWith(e.place, src.kind, e.plate, src.role, km, e.sights); ok {
		e.hit[s], e.km[s], e.sigma[s] = hit, hit.DistanceKm, hit.Boundary.SigmaKm()
	}
}

// about returns how far to look where a distance to a source is compared with a
// limit, so that all that moves by 1σ is seen: the limit, the line and the site.
func (e *evidence) about(s source, l LimitID) float64 {
	return e.limit[l] + Limits[l].Sigma + max(e.look.m.maxSigmaKm[sources[s].kind], e.watch.siteKm) + 1
}

// trenchView is how the nearest trench of the overriding plate is seen.
type trenchView struct {
	known   bool
	square  float64 // sine of the angle between the trench and the line of sight: 1 square to it
	hasSlab bool    // a slab surface goes down from it
}

// viewTrench works out how squarely the nearest trench is seen, and whether a slab
// surface goes down from it.
func (e *evidence) viewTrench() *trenchView {
	v := &e.trench
	if v.known {
		return v
	}
	*v = trenchView{known: true, square: 1}
	if math.IsInf(e.upTo(sourceOverriding, sources[sourceOverriding].reachKm), 1) {
		return v
	}
	h := &e.hit[sourceOverriding]
	v.hasSlab = e.look.m.slabOf[h.Boundary.ID()]
	sight := e.place.Vec.Sub(h.NearestVec.Scale(e.place.Vec.Dot(h.NearestVec)))
	if n := sight.Norm(); n > 0 {
		c := sight.Dot(h.Along) / n
		v.square = math.Sqrt(math.Max(0, 1-c*c))
	}
	return v
}

// flank is how the nearest ridge's flank spreads.
type flank struct {
	known    bool
	kmPerMyr float64 // half spreading rate; NaN where unknown
	cos      float64 // distance along the spreading direction = km × cos; more than 1 past an offset
	onLand   bool    // the site lies on land near a spreading ridge
}

// squareOn is the cosine of the angle up to which a ridge counts as seen along the
// direction of spreading.
const squareOn = 0.97

// spread works out how fast the sea floor moves away from the nearest ridge, which
// has been found, and how much of the distance to it lies along that direction.
func (e *evidence) spread() *flank {
	f := &e.flank
	if f.known {
		return f
	}
	*f = flank{known: true, kmPerMyr: math.NaN(), cos: 1, onLand: e.look.m.landAt(e.place.Vec)}
	h := &e.hit[sourceRidge]
	across, _ := h.Boundary.Opposite(e.plate)
	m := e.look.relative(across, e.plate, h)
	if !m.Known || math.IsNaN(m.AzimuthDeg) {
		return f
	}
	f.kmPerMyr = m.RateMmYr / 2
	if math.IsNaN(h.AzimuthDeg) {
		return f
	}
	f.cos = math.Abs(math.Cos((h.AzimuthDeg - m.AzimuthDeg) * math.Pi / 180))
	if f.cos < squareOn && h.DistanceKm > 0 {
		// the nearest ridge is off to the side: the one that made this floor lies along
		// the direction of spreading, past an offset
		if along, ok := e.look.m.network.AlongTo(e.place, m.AzimuthDeg, boundary.SpreadingRidge, e.plate, 2*baseLimits[limitFlank]); ok {
			f.cos = along / h.DistanceKm
		}
	}
	return f
}

// flankAge returns the age of the sea floor in Myr that the distance to the
// ridge makes, NaN where the rate is not known. The ridge has been found.
func (e *evidence) flankAge() float64 {
	f := e.spread()
	return e.km[sourceRidge] * f.cos / f.kmPerMyr
}

// collisionSide says on which side of the nearest continental convergence the
// plate is, as far as a rule asks.
func (e *evidence) collisionSide() side {
	if math.IsInf(e.upTo(sourceCollision, e.about(sourceCollision, limitCollisionUpper)), 1) {
		return sideUnknown
	}
	switch e.hit[sourceCollision].Boundary.Subducting() {
	case "":
		return sideUnknown
	case e.plate:
		return sideLower
	}
	return sideUpper
}
