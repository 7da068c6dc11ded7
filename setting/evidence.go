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
	numSources              = 8
	noSource         source = numSources
)

// sources says where to look for each.
var sources = [numSources]struct {
	kind    boundary.Type
	role    boundary.Role
	reachKm float64
	name    string
}{
	{boundary.Subduction, boundary.Overriding, 800, "subduction boundary, on the overriding plate"},
	{boundary.Subduction, boundary.Subducting, 300, "subduction boundary, on the subducting plate"},
	{boundary.SpreadingRidge, boundary.Bounding, 500, "spreading ridge"},
	{boundary.OceanicTransform, boundary.Bounding, 100, "oceanic transform"},
	{boundary.ContinentalTransform, boundary.Bounding, 150, "continental transform"},
	{boundary.ContinentalRift, boundary.Bounding, 200, "continental rift"},
	{boundary.OceanicConvergent, boundary.Bounding, 250, "oceanic convergence"},
	{boundary.ContinentalConvergent, boundary.Bounding, 800, "continental convergence"},
}

// evidence is all that the rules compare, for one plate.
type evidence struct {
	km    [numSources]float64 // distance, +Inf where there is none within reach
	sigma [numSources]float64 // 1σ of the line's position
	limit [numLimits]float64
	hit   [numSources]boundary.Hit

	flankKmPerMyr float64 // half spreading rate along the direction of spreading; NaN where unknown
	flankCos      float64 // distance along the spreading direction = km × flankCos
	collisionSide side
	zone          ZoneKind
}

// side says on which side of a convergent boundary the plate is.
type side uint8

const (
	sideUnknown side = 0
	sideUpper   side = 1
	sideLower   side = 2
)

// gather collects the evidence for a plate at a place.
func (l *Lookup) gather(p boundary.Place, plate string, zone *Zone, e *evidence) {
	e.limit = limitValues()
	e.zone = NoKind
	if zone != nil {
		e.zone = zone.Kind
	}
	for s := range sources {
		src := &sources[s]
		hit, ok := l.m.network.NearestOf(p, src.kind, plate, src.role, src.reachKm)
		if !ok {
			e.km[s] = math.Inf(1)
			continue
		}
		e.hit[s], e.km[s], e.sigma[s] = hit, hit.DistanceKm, hit.Boundary.SigmaKm()
	}
	e.gatherFlank(l, plate)
	e.gatherCollision(plate)
}

// gatherFlank works out how fast the sea floor moves away from the nearest
// ridge, and how much of the distance to it lies along that direction.
func (e *evidence) gatherFlank(l *Lookup, plate string) {
	e.flankKmPerMyr, e.flankCos = math.NaN(), 1
	if math.IsInf(e.km[sourceRidge], 1) {
		return
	}
	h := &e.hit[sourceRidge]
	across, _ := h.Boundary.Opposite(plate)
	m := l.relative(across, plate, h)
	if !m.Known || math.IsNaN(m.AzimuthDeg) {
		return
	}
	e.flankKmPerMyr = m.RateMmYr / 2
	if !math.IsNaN(h.AzimuthDeg) {
		e.flankCos = math.Abs(math.Cos((h.AzimuthDeg - m.AzimuthDeg) * math.Pi / 180))
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
