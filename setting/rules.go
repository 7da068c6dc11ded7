package setting

import "math"

// RuleID names a rule; answers and the printed table use it.
type RuleID uint8

// The rules, in the order in which they are tried. Rules on slabs take their
// place between ruleOnBoundary and ruleTrenchDistance.
const (
	ruleTrench         RuleID = 0
	ruleOnBoundary     RuleID = 1
	ruleTrenchDistance RuleID = 2
	ruleOuterRise      RuleID = 3
	ruleRidgeFlank     RuleID = 4
	ruleConvergent     RuleID = 5
	ruleCollision      RuleID = 6
	ruleZone           RuleID = 7
	ruleInterior       RuleID = 8
)

const numRules = 9

// Rule is one row of the rule table.
type Rule struct {
	ID     RuleID
	Name   string
	Labels []Label
	Limits []LimitID
	Text   string // what the rule says, for the printed table
	decide func(e *evidence) (verdict, bool)
}

// verdict is what a rule decides.
type verdict struct {
	label   Label
	by      source  // the boundary that decides; noSource in an interior
	limit   LimitID // the limit compared with
	neverHi bool    // the rule allows medium confidence at the most
}

// Rules is the rule table: the first rule that decides gives the label.
var Rules = [numRules]Rule{
	{ruleTrench, "trench", []Label{Trench}, []LimitID{limitTrench},
		"within the larger of the limit and 1σ of a subduction boundary", decideTrench},
	{ruleOnBoundary, "on_boundary", []Label{RidgeAxis, TransformZone, ContinentalRift},
		[]LimitID{limitRidgeAxis, limitOceanTransform, limitLandTransform, limitRift},
		"within the limit of a spreading ridge, transform or rift; of several the smallest distance/limit, a ridge or rift before a transform where the two are equal within 1σ", decideOnBoundary},
	{ruleTrenchDistance, "trench_distance", []Label{Forearc, VolcanicArc, BackArc},
		[]LimitID{limitForearc, limitArc, limitBackArc},
		"on the overriding side of a subduction boundary, by distance from the trench (no slab surface is known)", decideTrenchDistance},
	{ruleOuterRise, "outer_rise", []Label{OuterRise}, []LimitID{limitOuterRise},
		"on the subducting plate, seaward of the trench", decideOuterRise},
	{ruleRidgeFlank, "ridge_flank", []Label{RidgeFlank}, []LimitID{limitFlankAge, limitFlank},
		"sea floor younger than the limit at half the spreading rate, measured along the spreading direction, within the limit of the ridge", decideRidgeFlank},
	{ruleConvergent, "convergent_margin", []Label{ConvergentMargin}, []LimitID{limitConvergent},
		"within the limit of oceanic convergence", decideConvergent},
	{ruleCollision, "collision_zone", []Label{CollisionZone},
		[]LimitID{limitCollisionUpper, limitCollisionLower, limitCollisionEither, limitCollisionZone},
		"within the limit of continental convergence for the side the site is on, or in a diffuse zone of kind collision with such a boundary within the limit", decideCollision},
	{ruleZone, "deforming_zone", []Label{DeformingZone}, nil,
		"inside another zone of diffuse deformation; the family follows its kind", decideZone},
	{ruleInterior, "plate_interior", []Label{PlateInterior}, nil,
		"none of the above; earthquakes and volcanism within plates are possible all the same", decideInterior},
}

// decide runs the rules in order and returns the first verdict.
func (e *evidence) decide() (verdict, RuleID) {
	for i := range Rules {
		if v, ok := Rules[i].decide(e); ok {
			return v, RuleID(i)
		}
	}
	return verdict{label: PlateInterior, by: noSource}, ruleInterior
}

func decideTrench(e *evidence) (verdict, bool) {
	s := sourceOverriding
	if e.km[sourceSubducting] < e.km[s] {
		s = sourceSubducting
	}
	if e.km[s] <= max(e.limit[limitTrench], e.sigma[s]) {
		return verdict{label: Trench, by: s, limit: limitTrench}, true
	}
	return verdict{}, false
}

// onBoundary pairs each source that rule 2 looks at with its limit and label,
// ridges and rifts before transforms.
var onBoundary = [...]struct {
	by    source
	limit LimitID
	label Label
	fault bool
}{
	{sourceRidge, limitRidgeAxis, RidgeAxis, false},
	{sourceRift, limitRift, ContinentalRift, false},
	{sourceOceanFault, limitOceanTransform, TransformZone, true},
	{sourceLandFault, limitLandTransform, TransformZone, true},
}

func decideOnBoundary(e *evidence) (verdict, bool) {
	best, bestRatio := -1, math.Inf(1)
	for i := range onBoundary {
		c := &onBoundary[i]
		ratio := e.km[c.by] / e.limit[c.limit]
		if ratio > 1 {
			continue
		}
		if best >= 0 && c.fault && !onBoundary[best].fault {
			// a transform must be clearly nearer than its ridge or rift
			ratio += e.sigma[onBoundary[best].by] / e.limit[onBoundary[best].limit]
		}
		if ratio < bestRatio {
			best, bestRatio = i, ratio
		}
	}
	if best < 0 {
		return verdict{}, false
	}
	c := &onBoundary[best]
	return verdict{label: c.label, by: c.by, limit: c.limit}, true
}

func decideTrenchDistance(e *evidence) (verdict, bool) {
	for _, band := range [...]struct {
		limit LimitID
		label Label
	}{{limitForearc, Forearc}, {limitArc, VolcanicArc}, {limitBackArc, BackArc}} {
		if e.km[sourceOverriding] < e.limit[band.limit] {
			return verdict{label: band.label, by: sourceOverriding, limit: band.limit}, true
		}
	}
	return verdict{}, false
}

func decideOuterRise(e *evidence) (verdict, bool) {
	if e.km[sourceSubducting] <= e.limit[limitOuterRise] {
		return verdict{label: OuterRise, by: sourceSubducting, limit: limitOuterRise}, true
	}
	return verdict{}, false
}

func decideRidgeFlank(e *evidence) (verdict, bool) {
	if e.km[sourceRidge] <= e.limit[limitFlank] && e.flankAge() < e.limit[limitFlankAge] { // false for NaN
		return verdict{label: RidgeFlank, by: sourceRidge, limit: limitFlankAge}, true
	}
	return verdict{}, false
}

func decideConvergent(e *evidence) (verdict, bool) {
	if e.km[sourceConvergent] <= e.limit[limitConvergent] {
		return verdict{label: ConvergentMargin, by: sourceConvergent, limit: limitConvergent}, true
	}
	return verdict{}, false
}

func decideCollision(e *evidence) (verdict, bool) {
	limit := limitCollisionEither
	switch e.collisionSide {
	case sideUpper:
		limit = limitCollisionUpper
	case sideLower:
		limit = limitCollisionLower
	}
	if e.km[sourceCollision] > e.limit[limit] && e.zone == CollisionKind {
		limit = limitCollisionZone
	}
	if e.km[sourceCollision] <= e.limit[limit] {
		return verdict{label: CollisionZone, by: sourceCollision, limit: limit}, true
	}
	return verdict{}, false
}

func decideZone(e *evidence) (verdict, bool) {
	return verdict{label: DeformingZone, by: noSource}, e.zone != NoKind
}

func decideInterior(e *evidence) (verdict, bool) {
	return verdict{label: PlateInterior, by: noSource}, true
}
