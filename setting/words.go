package setting

import (
	"fmt"
	"math"
	"strconv"
	"strings"

	"nearmargin/setting/boundary"
)

// Text puts the reason into one sentence that carries the numbers compared.
func (r *Reason) Text() string { return string(r.AppendText(nil)) }

// AppendText appends what Text returns.
func (r *Reason) AppendText(b []byte) []byte {
	switch {
	case r.Slab != nil:
		return r.appendSlab(b)
	case r.Boundary == nil && r.Rule == ruleZone:
		return append(b, "inside a zone of diffuse deformation"...)
	case r.Boundary == nil:
		return append(b, "farther from every boundary than its rule reaches; earthquakes and volcanism within plates are possible all the same"...)
	}
	switch r.Rule {
	case ruleTrenchDistance:
		b = append(b, "on the overriding plate, "...)
	case ruleOuterRise:
		b = append(b, "on the subducting plate, "...)
	}
	b = appendKm(b, r.Km, 1)
	b = append(b, " from "...)
	b = append(b, r.Boundary.Name()...)
	switch r.Rule {
	case ruleRidgeFlank:
		b = append(b, ": at half the present spreading rate the sea floor is "...)
		b = strconv.AppendFloat(b, r.AgeMyr, 'f', 1, 64)
		b = append(b, " Myr old; the limit is "...)
		b = strconv.AppendFloat(b, r.LimitVal, 'f', 0, 64)
		return append(b, " Myr"...)
	case ruleConvergent:
		b = append(b, ", oceanic convergence without a trench"...)
	default:
		b = append(b, ", "...)
		b = append(b, article(r.Boundary.Type())...)
	}
	b = append(b, "; the limit is "...)
	b = appendKm(b, r.LimitVal, 0)
	if r.Rule == ruleTrenchDistance {
		b = append(b, ", and no slab surface is known below"...)
	}
	return b
}

// appendSlab is AppendText where a slab decided.
func (r *Reason) appendSlab(b []byte) []byte {
	if r.PastKm > 0 {
		b = appendKm(b, r.PastKm, 1)
		b = append(b, " past the down-dip rim of slab "...)
		b = append(b, r.Slab.Name...)
		b = append(b, ", whose top is there at "...)
	} else {
		b = append(b, "the top of slab "...)
		b = append(b, r.Slab.Name...)
		b = append(b, " lies at "...)
	}
	b = strconv.AppendFloat(b, r.DepthKm, 'f', 0, 64)
	b = append(b, " ± "...)
	b = strconv.AppendFloat(b, r.SigmaKm, 'f', 0, 64)
	b = append(b, " km depth"...)
	if r.Rule == ruleSlabDepth {
		b = append(b, "; the limit is "...)
		b = appendKm(b, r.LimitVal, 0)
	}
	if r.Boundary != nil {
		b = append(b, "; "...)
		b = appendKm(b, r.Km, 1)
		b = append(b, " from "...)
		b = append(b, r.Boundary.Name()...)
	}
	return b
}

func appendKm(b []byte, km float64, decimals int) []byte {
	return append(strconv.AppendFloat(b, km, 'f', decimals, 64), " km"...)
}

// article names a type of boundary as a noun.
func article(t boundary.Type) string {
	switch t {
	case boundary.SpreadingRidge:
		return "a spreading ridge"
	case boundary.OceanicTransform:
		return "an oceanic transform"
	case boundary.ContinentalTransform:
		return "a continental transform"
	case boundary.ContinentalRift:
		return "a continental rift"
	case boundary.Subduction:
		return "a subduction boundary"
	case boundary.OceanicConvergent:
		return "oceanic convergence"
	case boundary.ContinentalConvergent:
		return "continental convergence"
	}
	return t.String()
}

// Text says what was moved to meet the alternative.
func (a *Alternative) Text() string {
	c := &a.Cause
	switch c.Kind {
	case CauseDistance:
		return fmt.Sprintf("met with %s %.1f km %s (1σ of its position)", c.Name, math.Abs(c.By), farther(c.By))
	case CauseSite:
		return fmt.Sprintf("met with the site %.1f km %s %s (1σ of the site)", math.Abs(c.By), map[bool]string{true: "farther from", false: "nearer to"}[c.By > 0], c.Name)
	case CauseLimit:
		return fmt.Sprintf("met with the limit %q moved by %+.3g %s (1σ of the limit)", c.Name, c.By, limitUnit(c.Name))
	case CauseDepth:
		return fmt.Sprintf("met with the top of slab %s %.0f km %s (1σ of its depth)", c.Name, math.Abs(c.By), map[bool]string{true: "deeper", false: "shallower"}[c.By > 0])
	case CauseRule:
		return fmt.Sprintf("the rule %q allows both here", Rules[c.Rule].Name)
	case CauseSlabEnd:
		return fmt.Sprintf("%.0f km past the lateral end of slab %s", c.By, c.Name)
	}
	return fmt.Sprintf("met on plate %s: the side is uncertain", c.Name)
}

func farther(by float64) string {
	if by > 0 {
		return "farther away"
	}
	return "nearer"
}

func limitUnit(name string) string {
	for i := range Limits {
		if Limits[i].Name == name {
			return Limits[i].Unit
		}
	}
	return ""
}

// Text puts the note into a sentence.
func (n *Note) Text() string {
	switch n.Code {
	case NotePresentDay:
		return "The setting is that of the present day, not of the time when the rock formed."
	case NoteScreening:
		return "A screening aid on generalised models: for hazard, siting or drilling defer to national hazard models, local codes and licensed practice."
	case NoteSideUncertain:
		return fmt.Sprintf("The nearest boundary is within 2σ: the site may lie on plate %s or on plate %s.", n.A, n.B)
	case NoteNoMotion:
		return fmt.Sprintf("Motion model %s has no angular velocity for plate %s; motion_fallback names another model to take it from.", n.A, n.B)
	case NoteOtherMotion:
		return fmt.Sprintf("Motion model %s lacks one of the plates; the motion is from the fallback %s.", n.A, n.B)
	case NoteSigmaBound:
		return "The correlation between the two plates' angular velocities is not published: σ of the rate is an upper bound."
	case NoteComposed:
		return fmt.Sprintf("Plate %s is not in the published table; its velocity is %s: relative to that plate it is Bird's (2003), and it carries no σ.", n.A, n.B)
	case NoteZoneTotal:
		return fmt.Sprintf("Inside the zone of diffuse deformation %q: the rate is the total across the zone, not that of one fault.", n.A)
	case NoteZeroZero:
		return "Longitude and latitude are both 0, which often stands for a missing value."
	case NoteNoSlabs:
		return "This edition of the model holds no slab surfaces: near trenches the setting goes by distance."
	case NoteOtherPlates:
		return fmt.Sprintf("The controlling boundary lies between plates %s and %s, not on the site's own; its motion is that of the plate that goes down as seen from the other.", n.A, n.B)
	case NoteFixedDepth:
		return "Depths of 10 and 33 km are often fixed by convention rather than measured: the relation to the slab may mean nothing."
	}
	return string(n.Code)
}

// RuleTable returns the rule table as text, in the order in which rules are
// tried, with every limit, its σ and where it comes from.
func RuleTable() string {
	var b strings.Builder
	b.WriteString("The first rule that decides gives the label. Each measures to the nearest boundary of\n" +
		"its own type that bounds the site's plate; that boundary becomes the controlling one.\n\n")
	for i := range Rules {
		r := &Rules[i]
		var labels []string
		for _, l := range r.Labels {
			labels = append(labels, l.String())
		}
		fmt.Fprintf(&b, "%d. %s: %s\n   %s\n", i+1, r.Name, strings.Join(labels, ", "), r.Text)
		for _, id := range r.Limits {
			l := Limits[id]
			fmt.Fprintf(&b, "   limit %s: %g ± %.3g %s (%s)\n", l.Name, l.Value, l.Sigma, l.Unit, l.Why)
		}
	}
	b.WriteString("\nConfidence: every distance, every limit and the site's position are moved by one σ either\n" +
		"way, one at a time, and the other plate is tried where the side is uncertain. high: no\n" +
		"other label is met; medium: other labels of the same family; low: another family.\n" +
		"Labels that a rule itself allows beside its own count as met.\n")
	return b.String()
}
