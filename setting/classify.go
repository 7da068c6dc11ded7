package setting

import (
	"math"

	"nearmargin/setting/boundary"
	"nearmargin/setting/slab"
)

// Reason is why a label was given: a rule and the numbers it compared.
type Reason struct {
	Rule     RuleID
	Limit    LimitID
	LimitVal float64
	Boundary *boundary.Boundary // nil where none decided
	Km       float64            // distance to it
	AgeMyr   float64            // of the sea floor, for the rule on ridge flanks
	Slab     *slab.Slab         // nil where none decided
	DepthKm  float64            // of its top
	SigmaKm  float64            // 1σ of that depth
	PastKm   float64            // how far past the slab's rim the site is, 0 above it
}

// Alternative is another label that is met within 1σ.
type Alternative struct {
	Label  Label
	Family Family
	Cause  Cause
}

// CauseKind says what was moved to meet an alternative.
type CauseKind uint8

// The kinds of cause.
const (
	CauseDistance  CauseKind = 1 // the distance to a boundary, by the line's σ
	CauseSite      CauseKind = 2 // the site, by its own σ
	CauseLimit     CauseKind = 3 // a limit of the rule table, by its σ
	CauseOtherSide CauseKind = 4 // the plate, where the side is uncertain
	CauseDepth     CauseKind = 5 // the depth of a slab's top, by its σ
	CauseRule      CauseKind = 6 // nothing: the rule itself allows both
	CauseSlabEnd   CauseKind = 7 // the site lies past a slab's lateral end
)

// Cause is what was moved, by how much, to meet an alternative.
type Cause struct {
	Kind  CauseKind
	By    float64 // signed: km, or the unit of the limit
	Name  string  // the boundary's name, the slab's, the limit's, or the other plate's code
	Rule  RuleID  // the rule that then decides
	Limit LimitID
}

// classify labels the site and works out how sure the label is.
func (l *Lookup) classify(p boundary.Place, a *Answer) {
	e := &a.scratch[0]
	l.gather(p, a.Plate.Code, a, e)
	e.watch.on = true
	v, rule := e.decide()
	e.watch.on = false
	a.Label, a.Family = v.label, v.label.family(e.zone)
	l.control(a, e, v)
	reason := e.reason(v, rule)
	if reason.Slab != nil && a.IsControlled {
		reason.Boundary, reason.Km = a.Controlling.Boundary, a.Controlling.DistanceKm
	}
	a.Reasons.add(reason)
	first := v.slab
	if first < 0 {
		first = e.decidingSlab()
	}
	l.addSlabs(p, a, e, first)

	if v.also != NoLabel {
		a.alternative(v.also, Cause{Kind: CauseRule, Rule: rule, Limit: v.limit}, e.zone)
	}
	e.vary(a)
	e.pastEnds(a)
	if a.SideUncertain && l.m.plates[a.plateAcross] != nil {
		o := &a.scratch[1]
		l.gather(p, a.plateAcross, a, o)
		v, rule := o.decide()
		a.alternative(v.label, Cause{Kind: CauseOtherSide, Name: a.plateAcross, Rule: rule, Limit: v.limit}, o.zone)
	}

	a.Confidence = High
	if v.neverHi {
		a.Confidence = Medium
	}
	for _, alt := range a.Alternatives.All() {
		if alt.Family != a.Family {
			a.Confidence = Low
			break
		}
		a.Confidence = Medium
	}
}

// control gives the boundary that decides: the rule's own, or the nearest that
// the deciding slab goes down from. Where that is farther than a slab's trench may
// be, as for a slab that has lost its trench, it is the nearest trench at which
// the site's plate is the upper one.
func (l *Lookup) control(a *Answer, e *evidence, v verdict) {
	if v.slab >= 0 && e.slabs[v.slab].slab.Kind == slab.Subduction && e.slabTrench(v.slab) > e.limit[limitSlabTrench] &&
		!math.IsInf(e.upTo(sourceOverriding, sources[sourceOverriding].reachKm), 1) {
		v.by = sourceOverriding
	}
	switch {
	case v.by != noSource:
		a.IsControlled = true
		a.Controlling = l.controlling(a, &e.hit[v.by])
	case v.slab >= 0 && !math.IsInf(e.slabTrench(v.slab), 1):
		a.IsControlled = true
		a.Controlling = l.controlling(a, &e.slabs[v.slab].trench)
	}
}

// controlling is boundaryAnswer for a hit that often is the nearest.
func (l *Lookup) controlling(a *Answer, h *boundary.Hit) BoundaryAnswer {
	if h.Boundary == a.Nearest.Boundary && h.NearestVec == a.Nearest.NearestVec && h.Along == a.Nearest.Along {
		return a.Nearest
	}
	return l.boundaryAnswer(a, *h)
}

// vary moves every distance, every slab's depth, the site and every limit by one
// σ either way, one at a time, and notes each other label that is met. What the
// watch has not marked leaves the verdict as it is and is not tried.
func (e *evidence) vary(a *Answer) {
	try := func(c Cause) {
		v, rule := e.decide()
		c.Rule, c.Limit = rule, v.limit
		a.alternative(v.label, c, e.zone)
		if v.also != NoLabel {
			a.alternative(v.also, c, e.zone)
		}
	}
	for s := range sources {
		if !e.watch.km[s] {
			continue
		}
		e.varyOne(&e.km[s], e.sigma[s], Cause{Kind: CauseDistance}, e.nameOf(s), try)
		e.varyOne(&e.km[s], a.Site.sigmaKm(), Cause{Kind: CauseSite}, e.nameOf(s), try)
	}
	for i := range e.slabs[:e.nSlabs] {
		s := &e.slabs[i]
		if e.watch.z[i] {
			e.varyOne(&s.z, s.sigma, Cause{Kind: CauseDepth}, s.slab.Name, try)
		}
		if e.watch.trench[i] && !math.IsInf(s.trenchKm, 1) {
			e.varyOne(&s.trenchKm, s.trench.Boundary.SigmaKm(), Cause{Kind: CauseDistance}, s.trench.Boundary.Name(), try)
		}
	}
	for i := range Limits {
		if !e.watch.limit[i] {
			continue
		}
		e.varyOne(&e.limit[i], Limits[i].Sigma, Cause{Kind: CauseLimit}, Limits[i].Name, try)
	}
}

func (e *evidence) nameOf(s int) string {
	if math.IsInf(e.km[s], 1) {
		return ""
	}
	return e.hit[s].Boundary.Name()
}

// varyOne moves one quantity by σ either way, tries the rules, and puts it back.
func (e *evidence) varyOne(x *float64, sigma float64, c Cause, name string, try func(Cause)) {
	value := *x
	if sigma == 0 || math.IsInf(value, 1) {
		return
	}
	c.Name = name
	for _, by := range [...]float64{sigma, -sigma} {
		*x, c.By = max(0, value+by), by
		try(c)
	}
	*x = value
}

// pastEnds notes what a slab past whose lateral end the site lies would make of it.
func (e *evidence) pastEnds(a *Answer) {
	for i := range e.slabs[:e.nSlabs] {
		s := &e.slabs[i]
		if s.beyond != slab.PastEnd || s.slab.Kind != slab.Subduction || s.outKm > e.limit[limitPastRim] {
			continue
		}
		if label, _, limit := e.slabLabel(i); label != NoLabel {
			a.alternative(label, Cause{Kind: CauseSlabEnd, By: s.outKm, Name: s.slab.Name, Rule: ruleSlabDepth, Limit: limit}, e.zone)
		}
	}
}

// alternative notes a label met, once.
func (a *Answer) alternative(label Label, c Cause, zone ZoneKind) {
	if label == a.Label {
		return
	}
	for _, have := range a.Alternatives.All() {
		if have.Label == label {
			return
		}
	}
	a.Alternatives.add(Alternative{label, label.family(zone), c})
}

// reason puts a verdict's numbers together.
func (e *evidence) reason(v verdict, rule RuleID) Reason {
	r := Reason{Rule: rule, Limit: v.limit, LimitVal: e.limit[v.limit], AgeMyr: math.NaN()}
	switch {
	case v.by != noSource:
		r.Boundary, r.Km = e.hit[v.by].Boundary, e.km[v.by]
	case v.slab >= 0:
		s := &e.slabs[v.slab]
		r.Slab, r.DepthKm, r.SigmaKm, r.PastKm = s.slab, s.z, s.sigma, s.outKm
		if v.limit == limitArcMin {
			r.LimitVal *= s.slab.ArcMinDepthKm
		}
	}
	switch rule {
	case ruleTrench:
		r.LimitVal = max(r.LimitVal, e.sigma[v.by])
	case ruleRidgeFlank:
		r.AgeMyr = e.flankAge()
	}
	return r
}
