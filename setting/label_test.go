package setting_test

import (
	"fmt"
	"math"
	"strings"
	"testing"

	"nearmargin/setting"
)

// Each rule's label just inside and just outside of its limit, for a site square
// off the middle of a boundary; north is plate AA, which overrides the trench and
// the collision.
func TestLabelsAtTheLimits(t *testing.T) {
	const north, south = 1, -1
	for _, c := range []struct {
		segment  string
		side     float64
		limit    string
		inside   setting.Label
		outside  setting.Label
		controls bool // the boundary still decides outside
	}{
		{"trench", north, "trench", setting.Trench, setting.Forearc, true},
		{"trench", south, "trench", setting.Trench, setting.OuterRise, true},
		{"trench", north, "forearc", setting.Forearc, setting.VolcanicArc, true},
		{"trench", north, "volcanic_arc", setting.VolcanicArc, setting.BackArc, true},
		{"trench", north, "back_arc", setting.BackArc, setting.PlateInterior, false},
		{"trench", south, "outer_rise", setting.OuterRise, setting.PlateInterior, false},
		{"ridge", north, "ridge_axis", setting.RidgeAxis, setting.RidgeFlank, true},
		{"ridge", south, "ridge_axis", setting.RidgeAxis, setting.RidgeFlank, true},
		{"ocean-fault", north, "transform_oceanic", setting.TransformZone, setting.PlateInterior, false},
		{"land-fault", south, "transform_continental", setting.TransformZone, setting.PlateInterior, false},
		{"rift", north, "rift", setting.ContinentalRift, setting.PlateInterior, false},
		{"convergence", south, "convergent", setting.ConvergentMargin, setting.PlateInterior, false},
		{"collision", north, "collision_upper", setting.CollisionZone, setting.PlateInterior, false},
		{"collision", south, "collision_lower", setting.CollisionZone, setting.PlateInterior, false},
		{"collision-of-either", north, "collision_either", setting.CollisionZone, setting.PlateInterior, false},
		{"collision-of-either", south, "collision_either", setting.CollisionZone, setting.PlateInterior, false},
	} {
		t.Run(fmt.Sprintf("%s, %s, %+.0f", c.segment, c.limit, c.side), func(t *testing.T) {
			lim := limit(t, c.limit)
			for _, x := range []struct {
				km       float64
				label    setting.Label
				controls bool
			}{{lim.Value - 0.01, c.inside, true}, {lim.Value + 0.01, c.outside, c.controls}} {
				a := answer(t, look(t, setting.Options{}), off(t, c.segment, c.side*x.km))
				if a.Label != x.label {
					t.Errorf("at %.2f km: %v, want %v", x.km, a.Label, x.label)
				}
				if a.IsControlled != x.controls || x.controls && a.Controlling.Boundary.ID() != c.segment {
					t.Errorf("at %.2f km: controlled %v by %v, want %v by %s", x.km, a.IsControlled, a.Controlling.Boundary, x.controls, c.segment)
				}
				if want := map[bool]string{true: "AA", false: "BB"}[c.side > 0]; a.Plate.Code != want {
					t.Errorf("at %.2f km: plate %s, want %s", x.km, a.Plate.Code, want)
				}
			}
			// the reason carries the distance and the limit that it compared
			a := answer(t, look(t, setting.Options{}), off(t, c.segment, c.side*(lim.Value-0.01)))
			r := a.Reasons.All()[0]
			text := r.Text()
			for _, part := range []string{fmt.Sprintf("%.1f km from The %s", lim.Value-0.01, c.segment), fmt.Sprintf("%.0f km", lim.Value)} {
				if !strings.Contains(text, part) {
					t.Errorf("the reason %q does not say %q", text, part)
				}
			}
			if r.Boundary == nil || r.Boundary.ID() != c.segment || math.Abs(r.Km-lim.Value+0.01) > 1e-4 || setting.Limits[r.Limit].Name != c.limit || r.LimitVal != lim.Value {
				t.Errorf("reason %+v", r)
			}
		})
	}
}

// Where the line's own 1σ is more than the limit, the trench is as wide as that.
func TestTrenchIsAsWideAsItsSigma(t *testing.T) {
	for km, want := range map[float64]setting.Label{29.9: setting.Trench, 30.1: setting.Forearc, -29.9: setting.Trench, -30.1: setting.OuterRise} {
		a := answer(t, look(t, setting.Options{}), off(t, "vague-trench", km))
		if a.Label != want {
			t.Errorf("%g km north: %v, want %v", km, a.Label, want)
		}
		if r := a.Reasons.All()[0]; want == setting.Trench && r.LimitVal != 30 {
			t.Errorf("%g km north: the reason's limit is %g, want 30", km, r.LimitVal)
		}
	}
}

// The flank ends at 10 Myr of sea floor or at 350 km, whichever comes first.
func TestRidgeFlank(t *testing.T) {
	slow := limit(t, "flank_age").Value * slowMmYr / 2 // km
	far := limit(t, "flank").Value
	for _, c := range []struct {
		motion string
		km     float64
		want   setting.Label
	}{
		{"slow", slow - 0.01, setting.RidgeFlank}, {"slow", slow + 0.01, setting.PlateInterior},
		{"slow", -slow + 0.01, setting.RidgeFlank}, {"slow", -slow - 0.01, setting.PlateInterior},
		{"fast", slow + 0.01, setting.RidgeFlank}, {"fast", far - 0.01, setting.RidgeFlank}, {"fast", far + 0.01, setting.PlateInterior},
		{"half", 100, setting.PlateInterior}, // without a rate there is no age
	} {
		a := answer(t, look(t, setting.Options{Motion: c.motion}), off(t, "ridge", c.km))
		if a.Label != c.want {
			t.Errorf("%s, %.2f km: %v, want %v", c.motion, c.km, a.Label, c.want)
		}
	}
	a := answer(t, look(t, setting.Options{}), off(t, "ridge", 150))
	r := a.Reasons.All()[0]
	if math.Abs(r.AgeMyr-5) > 1e-6 || !strings.Contains(r.Text(), "5.0 Myr old; the limit is 10 Myr") {
		t.Errorf("age %g, %q; want 5 Myr of a limit of 10", r.AgeMyr, r.Text())
	}
}

func TestZones(t *testing.T) {
	for _, c := range []struct {
		name   string
		lon    float64
		lat    float64
		label  setting.Label
		family setting.Family
	}{
		{"Stretched", 0, 40, setting.DeformingZone, setting.RiftFamily},
		{"Sheared", 20, 40, setting.DeformingZone, setting.TransformFamily},
		{"Squeezed", 40, 40, setting.DeformingZone, setting.CollisionFamily}, // no collision within its limit
		{"Unclear", 60, 40, setting.DeformingZone, setting.InteriorFamily},
		{"Plateau", middleLon(6) + 10, 4, setting.CollisionZone, setting.CollisionFamily}, // 440 km from the collision
		{"", 80, 40, setting.PlateInterior, setting.InteriorFamily},
	} {
		a := answer(t, look(t, setting.Options{}), setting.SiteAt(c.lon, c.lat))
		if a.Label != c.label || a.Family != c.family || (a.Zone == nil) != (c.name == "") || a.Zone != nil && a.Zone.Name != c.name {
			t.Errorf("%q: %v of family %v in zone %v, want %v of %v", c.name, a.Label, a.Family, a.Zone, c.label, c.family)
		}
	}
	a := answer(t, look(t, setting.Options{}), setting.SiteAt(middleLon(6)+10, 4))
	if r := a.Reasons.All()[0]; setting.Limits[r.Limit].Name != "collision_zone" {
		t.Errorf("on the plateau the limit is %q, want collision_zone", setting.Limits[r.Limit].Name)
	}
}

func TestHotspotMakesAnInteriorLessSure(t *testing.T) {
	l := look(t, setting.Options{})
	a := answer(t, l, setting.SiteAt(-100, 51))
	if a.Hotspot == nil || a.Hotspot.Name != "Plume" || math.Abs(a.HotspotKm-111.2) > 0.3 || a.Label != setting.PlateInterior || a.Confidence != setting.Medium {
		t.Errorf("one degree from the plume: %v, %.1f km, %v of confidence %v", a.Hotspot, a.HotspotKm, a.Label, a.Confidence)
	}
	if a := answer(t, l, setting.SiteAt(-100, 51.7)); a.Hotspot == nil {
		t.Error("189 km away the plume is within reach")
	}
	if a := answer(t, l, setting.SiteAt(-100, 51.9)); a.Hotspot != nil || a.Confidence != setting.High {
		t.Errorf("211 km away: %v of confidence %v, want none and high", a.Hotspot, a.Confidence)
	}
}

// Where a transform and a ridge meet, the smaller share of its limit decides, and
// the ridge where they are as good as equal.
func TestRidgeBeforeTransform(t *testing.T) {
	// the two meet at 100 degrees west; the site lies 10 km north of the line
	for _, c := range []struct {
		east float64 // degrees from where they meet
		want setting.Label
	}{{-0.5, setting.RidgeAxis}, {-0.02, setting.RidgeAxis}, {0.02, setting.RidgeAxis}, {0.5, setting.TransformZone}} {
		s := off(t, "ridge", 10)
		s.Lon = -100 + c.east
		if a := answer(t, look(t, setting.Options{}), s); a.Label != c.want {
			t.Errorf("%+.2f degrees east of the meeting: %v, want %v", c.east, a.Label, c.want)
		}
	}
}

// every label's family stands in the rule table's own lists.
func TestRuleTableNamesEveryLabelAndLimit(t *testing.T) {
	table := setting.RuleTable()
	for _, l := range setting.AllLabels {
		if !strings.Contains(table, l.String()) {
			t.Errorf("the table has no label %v", l)
		}
	}
	for i, l := range setting.Limits {
		if int(l.ID) != i || !strings.Contains(table, "limit "+l.Name+":") || l.Why == "" || !(l.Value > 0) || !(l.Sigma > 0) || !(l.Sigma < l.Value) {
			t.Errorf("limit %+v is not in the table, or has no source or σ", l)
		}
	}
	for i, r := range setting.Rules {
		if int(r.ID) != i || !strings.Contains(table, fmt.Sprintf("%d. %s: ", i+1, r.Name)) {
			t.Errorf("rule %d %q is not in the table", r.ID, r.Name)
		}
	}
}
