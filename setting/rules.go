package setting

import (
	"math"

	"nearmargin/setting/boundary"
	"nearmargin/setting/slab"
)

// RuleID names a rule; answers and the printed table use it.
type RuleID uint8

// The rules, in the order in which they are tried.
const (
	ruleTrench         RuleID = 0
	ruleOnBoundary     RuleID = 1
	ruleSlabDepth      RuleID = 2
	ruleTrenchDistance RuleID = 3
	ruleOuterRise      RuleID = 4
	ruleRidgeFlank     RuleID = 5
	ruleConvergent     RuleID = 6
	ruleCollision      RuleID = 7
	ruleZone           RuleID = 8
	ruleInterior       RuleID = 9
)

const numRules = 10

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
	also    Label   // another label that the rule itself allows; NoLabel for none
	by      source  // the boundary that decides; noSource where a slab or nothing does
	slab    int     // the slab that decides, an index into evidence.slabs; -1 for none
	limit   LimitID // the limit compared with
	neverHi bool    // the rule allows medium confidence at the most
}

// decided returns a verdict by a boundary.
func decided(label Label, by source, limit LimitID) (verdict, bool) {
	return verdict{label: label, by: by, slab: -1, limit: limit}, true
}

var undecided = verdict{by: noSource, slab: -1}

// Rules is the rule table: the first rule that decides gives the label.
var Rules = [numRules]Rule{
	{ruleTrench, "trench", []Label{Trench}, []LimitID{limitTrench},
		"within the larger of the limit and 1σ of a subduction boundary", decideTrench},
	{ruleOnBoundary, "on_boundary", []Label{RidgeAxis, TransformZone, ContinentalRift, BackArcSpreading},
		[]LimitID{limitRidgeAxis, limitOceanTransform, limitLandTransform, limitRift, limitSpreadingDepth},
		"within the limit of a spreading ridge, transform or rift; of several the smallest distance/limit, a ridge or rift before a transform where the two are equal within 1σ. Over a subducting slab a ridge is back-arc spreading where the slab is deeper than the limit, and a transform or rift decides only within its 1σ", decideOnBoundary},
	{ruleSlabDepth, "slab_depth", []Label{Forearc, VolcanicArc, BackArc},
		[]LimitID{limitSlabForearc, limitArcMin, limitSlabArc, limitSlabArcMaybe, limitSlabBackArc, limitSlabTrench, limitPastRim},
		"over a subducting slab, by the depth of its top; of two slabs one in the arc band decides, else the shallowest. Where the slab goes down from continental convergence within collision_upper, collision_zone is an alternative. Past the down-dip rim the rim's depth counts, up to the limit and never high; past a lateral end it gives an alternative", decideSlab},
	{ruleTrenchDistance, "trench_distance", []Label{Forearc, VolcanicArc, BackArc},
		[]LimitID{limitForearc, limitArc, limitBackArc},
		"on the overriding side of a subduction boundary, by distance from the trench where no slab surface is known; where one is known of the trench but not below the site, forearc alone, and high only between the trench and the slab's start", decideTrenchDistance},
	{ruleOuterRise, "outer_rise", []Label{OuterRise}, []LimitID{limitOuterRise},
		"on the subducting plate, seaward of the trench", decideOuterRise},
	{ruleRidgeFlank, "ridge_flank", []Label{RidgeFlank}, []LimitID{limitFlankAge, limitFlank},
		"sea floor younger than the limit at half the spreading rate, measured along the spreading direction, within the limit of the ridge; on land never high", decideRidgeFlank},
	{ruleConvergent, "convergent_margin", []Label{ConvergentMargin}, []LimitID{limitConvergent},
		"within the limit of oceanic convergence", decideConvergent},
	{ruleCollision, "collision_zone", []Label{CollisionZone},
		[]LimitID{limitCollisionUpper, limitCollisionLower, limitCollisionEither, limitCollisionZone},
		"within the limit of continental convergence for the side the site is on, above a collision slab, or in a diffuse zone of kind collision with such a boundary within the limit", decideCollision},
	{ruleZone, "deforming_zone", []Label{DeformingZone}, nil,
		"inside another zone of diffuse deformation; the family follows its kind. Of mixed kind, or near a hotspot, never high", decideZone},
	{ruleInterior, "plate_interior", []Label{PlateInterior}, nil,
		"none of the above; near a hotspot never high. Earthquakes and volcanism within plates are possible all the same", decideInterior},
}

// decide runs the rules in order and returns the first verdict.
func (e *evidence) decide() (verdict, RuleID) {
	for i := range Rules {
		if v, ok := Rules[i].decide(e); ok {
			return v, RuleID(i)
		}
	}
	return undecided, ruleInterior // not reached: the last rule always decides
}

func decideTrench(e *evidence) (verdict, bool) {
	s := sourceOverriding
	for _, either := range [...]source{sourceOverriding, sourceSubducting} {
		// as far as the limit may be, or 1σ of the line, each with a margin of its own
		e.upTo(either, max(e.about(either, limitTrench), 2*e.look.m.maxSigmaKm[boundary.Subduction]+e.watch.siteKm+1))
	}
	if e.km[sourceSubducting] < e.km[s] {
		s = sourceSubducting
	}
	if e.watch.on {
		e.watchTrench()
	}
	if e.km[s] <= max(e.limit[limitTrench], e.sigma[s]) {
		return decided(Trench, s, limitTrench)
	}
	return undecided, false
}

// watchTrench marks all that [decideTrench] compares, where a move may count.
func (e *evidence) watchTrench() {
	for _, s := range [...]source{sourceOverriding, sourceSubducting} {
		if e.km[s] <= max(e.limit[limitTrench]+Limits[limitTrench].Sigma, e.sigma[s])+e.moveKm(s)+1e-6 {
			e.watch.km[sourceOverriding], e.watch.km[sourceSubducting], e.watch.limit[limitTrench] = true, true, true
		}
	}
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
	over := e.decidingSlab()
	if over >= 0 && e.slabs[over].beyond != slab.NotBeyond {
		over = -1
	}
	if e.watch.on {
		e.watchRatios()
	}
	best, bestRatio := -1, math.Inf(1)
	for i := range onBoundary {
		c := &onBoundary[i]
		if !e.within(c.by, c.limit) {
			continue
		}
		ratio := e.km[c.by] / e.limit[c.limit]
		if over >= 0 && !e.overSlab(c.by, over) {
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
		return undecided, false
	}
	c := &onBoundary[best]
	v := verdict{label: c.label, by: c.by, slab: -1, limit: c.limit}
	if over >= 0 {
		if c.by == sourceRidge {
			v.label = BackArcSpreading
		} else {
			v.also, _, _ = e.slabLabel(over)
		}
	}
	return v, true
}

// watchRatios marks the distances and limits of the boundaries that
// [decideOnBoundary] may compare with each other, where there are several.
func (e *evidence) watchRatios() {
	var in [len(onBoundary)]bool
	n := 0
	for i := range onBoundary {
		c := &onBoundary[i]
		km := e.upTo(c.by, e.about(c.by, c.limit))
		if in[i] = km-e.moveKm(c.by) <= e.limit[c.limit]+Limits[c.limit].Sigma+1e-6; in[i] {
			n++
		}
	}
	if n < 2 {
		return
	}
	for i := range onBoundary {
		if in[i] {
			e.watch.km[onBoundary[i].by], e.watch.limit[onBoundary[i].limit] = true, true
		}
	}
}

// overSlab reports whether a boundary may decide although a slab is below: a
// ridge where the slab is deep enough, a rift or transform within its own 1σ.
func (e *evidence) overSlab(by source, over int) bool {
	if by == sourceRidge {
		e.watchDepth(over, limitSpreadingDepth, 1)
		return e.slabs[over].z > e.limit[limitSpreadingDepth]
	}
	if e.watch.on && sees(e.km[by], e.sigma[by], e.moveKm(by)) {
		e.watch.km[by] = true
	}
	return e.km[by] <= e.sigma[by]
}

func decideSlab(e *evidence) (verdict, bool) {
	i := e.decidingSlab()
	if i < 0 {
		return undecided, false
	}
	s := &e.slabs[i]
	label, also, limit := e.slabLabel(i)
	if label == NoLabel || label == BackArc && e.nearOwnTrench() {
		return undecided, false
	}
	if also == NoLabel && e.collides(i) {
		also = CollisionZone
	}
	return verdict{label: label, also: also, by: noSource, slab: i, limit: limit, neverHi: s.beyond != slab.NotBeyond}, true
}

// nearOwnTrench reports whether the site lies between a trench and the start of
// its slab: a slab of another trench far below does not make that a back-arc.
func (e *evidence) nearOwnTrench() bool {
	return e.beforeSlab() && e.viewTrench().square >= minTrenchSquare && e.closer(sourceOverriding, limitForearc)
}

// collides reports whether a slab goes down from continental convergence near the
// site: it is as well a collision zone.
func (e *evidence) collides(i int) bool {
	return e.look.m.slabTies[e.slabs[i].index].collides && e.trenchWithin(i, limitCollisionUpper) && e.slabs[i].trench.Boundary.Type() == boundary.ContinentalConvergent
}

// minTrenchSquare is the sine of the smallest angle between a trench and the line
// of sight to it at which distance from the trench says something: a place off
// the end of a trench is not above its slab.
const minTrenchSquare = 0.75

func decideTrenchDistance(e *evidence) (verdict, bool) {
	trench := e.viewTrench()
	if trench.square < minTrenchSquare {
		return undecided, false
	}
	for _, band := range [...]struct {
		limit LimitID
		label Label
	}{{limitForearc, Forearc}, {limitArc, VolcanicArc}, {limitBackArc, BackArc}} {
		if e.closer(sourceOverriding, band.limit) {
			v, _ := decided(band.label, sourceOverriding, band.limit)
			v.neverHi = trench.hasSlab && !e.beforeSlab() // off the end of the slab that is known
			return v, true
		}
		if trench.hasSlab { // farther away the slab itself would say
			break
		}
	}
	return undecided, false
}

// beforeSlab reports whether the site lies up the dip of a slab that is known,
// between the trench and its first contour.
func (e *evidence) beforeSlab() bool {
	for i := range e.slabs[:e.nSlabs] {
		if e.slabs[i].beyond == slab.BeforeStart {
			return true
		}
	}
	return false
}

func decideOuterRise(e *evidence) (verdict, bool) {
	if e.within(sourceSubducting, limitOuterRise) {
		return decided(OuterRise, sourceSubducting, limitOuterRise)
	}
	return undecided, false
}

func decideRidgeFlank(e *evidence) (verdict, bool) {
	if e.within(sourceRidge, limitFlank) && e.youngFlank() {
		return verdict{label: RidgeFlank, by: sourceRidge, slab: -1, limit: limitFlankAge, neverHi: e.spread().onLand}, true
	}
	return undecided, false
}

// youngFlank reports whether the sea floor is younger than the limit; false where
// its age is not known.
func (e *evidence) youngFlank() bool {
	age := e.flankAge()
	if e.watch.on {
		if sees(age, e.limit[limitFlankAge], e.moveKm(sourceRidge)*e.flank.cos/e.flank.kmPerMyr) {
			e.watch.km[sourceRidge] = true
		}
		e.watchLimit(age, limitFlankAge, 1)
	}
	return age < e.limit[limitFlankAge]
}

func decideConvergent(e *evidence) (verdict, bool) {
	if e.within(sourceConvergent, limitConvergent) {
		return decided(ConvergentMargin, sourceConvergent, limitConvergent)
	}
	return undecided, false
}

func decideCollision(e *evidence) (verdict, bool) {
	limit := limitCollisionEither
	switch e.collisionSide() {
	case sideUpper:
		limit = limitCollisionUpper
	case sideLower:
		limit = limitCollisionLower
	}
	if e.within(sourceCollision, limit) {
		return decided(CollisionZone, sourceCollision, limit)
	}
	for i := range e.slabs[:e.nSlabs] {
		if s := &e.slabs[i]; s.slab.Kind == slab.Collision && s.beyond == slab.NotBeyond {
			return verdict{label: CollisionZone, by: noSource, slab: i}, true
		}
	}
	if e.zone == CollisionKind && e.within(sourceCollision, limitCollisionZone) {
		return decided(CollisionZone, sourceCollision, limitCollisionZone)
	}
	return undecided, false
}

func decideZone(e *evidence) (verdict, bool) {
	return verdict{label: DeformingZone, also: e.deepSlab(), by: noSource, slab: -1, neverHi: e.zone == MixedKind || e.nearHotspot}, e.zone != NoKind
}

func decideInterior(e *evidence) (verdict, bool) {
	return verdict{label: PlateInterior, also: e.deepSlab(), by: noSource, slab: -1, neverHi: e.nearHotspot}, true
}

// deepSlab returns BackArc where a slab is below that is too deep or too far to
// decide, else NoLabel.
func (e *evidence) deepSlab() Label {
	if i := e.decidingSlab(); i >= 0 {
		if label, also, _ := e.slabLabel(i); label == NoLabel {
			return also
		}
	}
	return NoLabel
}
