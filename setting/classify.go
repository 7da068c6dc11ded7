package setting

import (
	"math"

	"nearmargin/setting/boundary"
)

// Reason is why a label was given: a rule and the numbers it compared.
type Reason struct {
	Rule     RuleID
	Limit    LimitID // meaningful where Boundary is not nil
	Boundary *boundary.Boundary
	Km       float64 // distance to it
	LimitVal float64
	AgeMyr   float64 // of the sea floor, for the rule on ridge flanks
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
)

// Cause is what was moved, by how much, to meet an alternative.
type Cause struct {
	Kind  CauseKind
	By    float64 // signed: km, or Myr for the limit on age
	Name  string  // the boundary's name, the limit's, or the other plate's code
	Rule  RuleID  // the rule that then decides
	Limit LimitID
}

// classify labels the site and works out how sure the label is.
func (l *Lookup) classify(p boundary.Place, a *Answer) {
	var e evidence
	l.gather(p, a.Plate.Code, a.Zone, &e)
	v, rule := e.decide()
	a.Label, a.Family = v.label, v.label.family(e.zone)
	a.Reasons.add(e.reason(v, rule))
	if v.by != noSource {
		a.IsControlled = true
		a.Controlling = l.boundaryAnswer(a, e.hit[v.by])
	}

	e.vary(a)
	if a.SideUncertain && l.m.plates[a.plateAcross] != nil {
		var o evidence
		l.gather(p, a.plateAcross, a.Zone, &o)
		v, rule := o.decide()
		a.alternative(v, Cause{Kind: CauseOtherSide, Name: a.plateAcross, Rule: rule, Limit: v.limit}, o.zone)
	}

	a.Confidence = High
	if v.neverHi || a.Label == PlateInterior && (a.Hotspot != nil || a.Zone != nil) {
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

// vary moves every distance, the site and every limit by one σ either way, one
// at a time, and notes each other label that is met.
func (e *evidence) vary(a *Answer) {
	try := func(c Cause) {
		v, rule := e.decide()
		if v.label != a.Label {
			c.Rule, c.Limit = rule, v.limit
			a.alternative(v, c, e.zone)
		}
	}
	for s := range sources {
		km := e.km[s]
		if math.IsInf(km, 1) {
			continue
		}
		for _, c := range [...]Cause{{Kind: CauseDistance, By: e.sigma[s]}, {Kind: CauseSite, By: a.Site.sigmaKm()}} {
			if c.By == 0 {
				continue
			}
			c.Name = e.hit[s].Boundary.Name()
			for _, sign := range [...]float64{1, -1} {
				e.km[s] = max(0, km+sign*c.By)
				try(Cause{Kind: c.Kind, By: sign * c.By, Name: c.Name})
			}
		}
		e.km[s] = km
	}
	for i := range Limits {
		value := e.limit[i]
		for _, sign := range [...]float64{1, -1} {
			e.limit[i] = value + sign*Limits[i].Sigma
			try(Cause{Kind: CauseLimit, By: sign * Limits[i].Sigma, Name: Limits[i].Name})
		}
		e.limit[i] = value
	}
}

// alternative notes a label met, once.
func (a *Answer) alternative(v verdict, c Cause, zone ZoneKind) {
	if v.label == a.Label {
		return
	}
	for _, have := range a.Alternatives.All() {
		if have.Label == v.label {
			return
		}
	}
	a.Alternatives.add(Alternative{v.label, v.label.family(zone), c})
}

// reason puts a verdict's numbers together.
func (e *evidence) reason(v verdict, rule RuleID) Reason {
	r := Reason{Rule: rule, Limit: v.limit, AgeMyr: math.NaN()}
	if v.by != noSource {
		r.Boundary, r.Km, r.LimitVal = e.hit[v.by].Boundary, e.km[v.by], e.limit[v.limit]
	}
	switch rule {
	case ruleTrench:
		r.LimitVal = max(r.LimitVal, e.sigma[v.by])
	case ruleRidgeFlank:
		r.AgeMyr = e.flankAge()
	}
	return r
}
