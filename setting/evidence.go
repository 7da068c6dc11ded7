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

// evidence is all that the rules compare, for one plate.
type evidence struct {
	km    [numSources]float64 // distance, +Inf where there is none within reach
	sigma [numSources]float64 // 1σ of the line's position
	limit [numLimits]float64
	hit   [numSources]boundary.Hit

	flankKmPerMyr float64 // half spreading rate; NaN where unknown
	flankCos      float64 // distance along the spreading direction = km × flankCos; more than 1 past an offset
	onLand        bool    // the site lies on land near a spreading ridge
	trenchSquare  float64 // sine of the angle between the trench and the line of sight: 1 square to it
	trenchHasSlab bool    // a slab surface goes down from the nearest trench
	collisionSide side
	zone          ZoneKind
	nearHotspot   bool

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

// gather collects the evidence for a plate at a place.
func (l *Lookup) gather(p boundary.Place, plate string, a *Answer, e *evidence) {
	e.limit = baseLimits
	e.watch.on = false
	e.zone = NoKind
	if a.Zone != nil {
		e.zone = a.Zone.Kind
	}
	e.nearHotspot = a.Hotspot != nil
	own := a.Plate.Code == plate // and so the nearest boundary bounds it
	for s := range sources {
		src := &sources[s]
		if own && a.Nearest.Answers(src.kind, plate, src.role) {
			e.km[s] = math.Inf(1)
			if a.Nearest.DistanceKm <= src.reachKm {
				e.hit[s], e.km[s], e.sigma[s] = a.Nearest.Hit, a.Nearest.DistanceKm, a.Nearest.Boundary.SigmaKm()
			}
			continue
		}
		hit, ok := l.m.network.NearestOfWith(p, src.kind, plate, src.role, src.reachKm, &a.sights)
		if !ok {
			e.km[s] = math.Inf(1)
			continue
		}
		e.hit[s], e.km[s], e.sigma[s] = hit, hit.DistanceKm, hit.Boundary.SigmaKm()
	}
	e.gatherTrench(l, p)
	e.gatherFlank(l, p, plate)
	e.gatherCollision(plate)
	e.gatherSlabs(l, p, &a.sights)
}

// gatherTrench works out how squarely the nearest trench is seen, and whether a
// slab surface goes down from it.
func (e *evidence) gatherTrench(l *Lookup, p boundary.Place) {
	e.trenchSquare, e.trenchHasSlab = 1, false
	if math.IsInf(e.km[sourceOverriding], 1) {
		return
	}
	h := &e.hit[sourceOverriding]
	e.trenchHasSlab = l.m.slabOf[h.Boundary.ID()]
	sight := p.Vec.Sub(h.NearestVec.Scale(p.Vec.Dot(h.NearestVec)))
	if n := sight.Norm(); n > 0 {
		c := sight.Dot(h.Along) / n
		e.trenchSquare = math.Sqrt(math.Max(0, 1-c*c))
	}
}

// squareOn is the cosine of the angle up to which a ridge counts as seen along the
// direction of spreading.
const squareOn = 0.97

// gatherFlank works out how fast the sea floor moves away from the nearest
// ridge, and how much of the distance to it lies along that direction.
func (e *evidence) gatherFlank(l *Lookup, p boundary.Place, plate string) {
	e.flankKmPerMyr, e.flankCos = math.NaN(), 1
	if math.IsInf(e.km[sourceRidge], 1) {
		return
	}
	e.onLand = l.m.landAt(p.Vec)
	h := &e.hit[sourceRidge]
	across, _ := h.Boundary.Opposite(plate)
	m := l.relative(across, plate, h)
	if !m.Known || math.IsNaN(m.AzimuthDeg) {
		return
	}
	e.flankKmPerMyr = m.RateMmYr / 2
	if !math.IsNaN(h.AzimuthDeg) {
		e.flankCos = math.Abs(math.Cos((h.AzimuthDeg - m.AzimuthDeg) * math.Pi / 180))
		if e.flankCos < squareOn && e.km[sourceRidge] > 0 {
			// the nearest ridge is off to the side: the one that made this floor lies along
			// the direction of spreading, past an offset
			if along, ok := l.m.network.AlongTo(p, m.AzimuthDeg, boundary.SpreadingRidge, plate, 2*e.limit[limitFlank]); ok {
				e.flankCos = along / e.km[sourceRidge]
			}
		}
	}
}

func (e *evidence) gatherCollision(plate string) {
	e.collisionSide = sideUnknown
	if math.IsInf(e.km[sourceCollision], 1) {
		return
	}
	switch e.hit[sourceCollision].Boundary.Subducting() {
	case "":
	case plate:
		e.collisionSide = sideLower
	default:
		e.collisionSide = sideUpper
	}
}

// flankAge returns the age of the sea floor in Myr that the distance to the
// ridge makes, NaN where the rate is not known.
func (e *evidence) flankAge() float64 {
	return e.km[sourceRidge] * e.flankCos / e.flankKmPerMyr
}
