package builtin_test

import (
	"slices"
	"strings"
	"testing"

	"nearmargin/setting"
	"nearmargin/setting/slab"
)

func answerAt(tb testing.TB, lon, lat float64) *setting.Answer {
	tb.Helper()
	a, err := model(tb).At(setting.SiteAt(lon, lat))
	if err != nil {
		tb.Fatal(err)
	}
	return a
}

// told says in one line what an answer rests on, for messages.
func told(a *setting.Answer) string {
	s := a.Label.String() + " of family " + a.Family.String() + ", confidence " + a.Confidence.String()
	for i := range a.Reasons.All() {
		s += "; " + a.Reasons.All()[i].Text()
	}
	for i := range a.Alternatives.All() {
		alt := &a.Alternatives.All()[i]
		s += "; or " + alt.Label.String() + " (" + alt.Text() + ")"
	}
	return s
}

func alternatives(a *setting.Answer) []setting.Label {
	var out []setting.Label
	for _, alt := range a.Alternatives.All() {
		out = append(out, alt.Label)
	}
	return out
}

// Sites whose setting any text on the region states. Positions are from memory,
// good to a few kilometres; nothing in the model or in the rule table was moved to
// make one of them come out.
func TestKnownSites(t *testing.T) {
	for _, c := range []struct {
		name     string
		lon, lat float64
		want     setting.Label
		why      string // what the site is known for
	}{
		{"Hole 504B", -83.73, 1.23, setting.RidgeFlank, "drilled into crust about 6 Myr old south of the Costa Rica Rift (DSDP 69 and 70, ODP 111)"},
		{"TAG mound", -44.83, 26.14, setting.RidgeAxis, "hydrothermal mound in the rift valley of the Mid-Atlantic Ridge (ODP 158)"},
		{"9 50 N on the East Pacific Rise", -104.29, 9.84, setting.RidgeAxis, "eruptions of 1991 and 2005 at the axis"},
		{"Hole 735B", 57.27, -32.72, setting.TransformZone, "Atlantis Bank, beside the Atlantis II transform (ODP 118 and 176)"},
		{"Site C0002", 136.64, 33.30, setting.Forearc, "Kumano forearc basin above the Nankai Trough (IODP 314 to 358)"},
		{"JFAST Site C0019", 143.91, 37.94, setting.Trench, "the fault of Tohoku 2011, close to the axis of the Japan Trench (IODP 343)"},
		{"seaward of the Japan Trench", 145.5, 38.5, setting.OuterRise, "Pacific plate before it goes down"},
		{"Valu Fa Ridge", -176.6, -22.2, setting.BackArcSpreading, "southernmost spreading centre of the Lau Basin (ODP 135)"},
		{"Krafla", -16.78, 65.72, setting.RidgeAxis, "central volcano in Iceland's northern rift zone"},
		{"Explorer Ridge", -130.2, 49.8, setting.RidgeAxis, "spreading off Vancouver Island"},
		{"17.4 S, 113.8 W", -113.8, -17.4, setting.RidgeFlank, "west of the fastest part of the East Pacific Rise"},
		{"Parkfield", -120.55, 35.97, setting.TransformZone, "on the San Andreas Fault"},
		{"Mandalay", 96.08, 21.97, setting.TransformZone, "beside the Sagaing Fault"},
		{"Kaikoura", 173.7, -42.4, setting.TransformZone, "Marlborough faults at the southern end of the Hikurangi slab"},
		{"Kathmandu", 85.3, 27.7, setting.CollisionZone, "Himalaya"},
		{"Hindu Kush", 70.8, 36.5, setting.CollisionZone, "intermediate-depth earthquakes below a continent"},
		{"KTB deep drill hole", 12.12, 49.82, setting.PlateInterior, "Oberpfalz, Germany"},
		{"Kola deep drill hole", 30.6, 69.4, setting.PlateInterior, "Baltic Shield"},
		{"Kilauea", -155.28, 19.41, setting.PlateInterior, "hotspot of Hawaii"},
		{"Vladivostok", 131.9, 43.1, setting.PlateInterior, "deep earthquakes of the Pacific slab lie below"},
		{"Fuji", 138.73, 35.36, setting.VolcanicArc, "over the Pacific slab, at the edge of the Philippine Sea slab"},
		{"Soufriere Hills", -62.18, 16.72, setting.VolcanicArc, "Lesser Antilles"},
		{"Sakurajima", 130.66, 31.58, setting.VolcanicArc, "Ryukyu arc"},
		{"White Island", 177.18, -37.52, setting.VolcanicArc, "Taupo volcanic zone"},
		{"Villarrica", -71.93, -39.42, setting.VolcanicArc, "southern volcanic zone of the Andes, on the Liquine-Ofqui fault"},
		{"Cotopaxi", -78.44, -0.68, setting.VolcanicArc, "northern volcanic zone of the Andes"},
		{"Taftan", 61.13, 28.60, setting.VolcanicArc, "volcano far behind the Makran front"},
		{"Olkaria", 36.3, -0.9, setting.ContinentalRift, "geothermal field in the Kenya Rift"},
		{"Erta Ale", 40.67, 13.6, setting.ContinentalRift, "Danakil Depression"},
		{"Salt Lake City", -111.9, 40.76, setting.DeformingZone, "eastern edge of the Basin and Range"},
	} {
		t.Run(c.name, func(t *testing.T) {
			if a := answerAt(t, c.lon, c.lat); a.Label != c.want {
				t.Errorf("%g, %g (%s) is %s; want %v", c.lon, c.lat, c.why, told(a), c.want)
			}
		})
	}
}

// What else is to be said of some of the sites.
func TestWhatAnswersSayOfKnownSites(t *testing.T) {
	for _, c := range []struct {
		name     string
		lon, lat float64
		says     string
		is       func(a *setting.Answer) bool
	}{
		{"JFAST Site C0019", 143.91, 37.94, "the side is uncertain", func(a *setting.Answer) bool { return a.SideUncertain }},
		{"Kilauea", -155.28, 19.41, "a hotspot, and no high confidence", func(a *setting.Answer) bool {
			return a.Hotspot != nil && strings.Contains(a.Hotspot.Name, "Hawai") && a.Confidence != setting.High
		}},
		{"Fuji", 138.73, 35.36, "two slabs, the Pacific one first", func(a *setting.Answer) bool {
			s := a.Slabs.All()
			return len(s) == 2 && s[0].Slab.Subducting == "PA" && s[1].Slab.Subducting == "PS"
		}},
		{"White Island", 177.18, -37.52, "a rift is nearer than the trench that decides", func(a *setting.Answer) bool {
			return a.Nearest.Boundary.Name() == "Taupo Rift" && a.IsControlled && a.Controlling.Boundary.Subducting() == "PA" && a.Controlling.DistanceKm > a.Nearest.DistanceKm
		}},
		{"Kaikoura", 173.7, -42.4, "forearc as an alternative", func(a *setting.Answer) bool { return slices.Contains(alternatives(a), setting.Forearc) }},
		{"Vladivostok", 131.9, 43.1, "a deep slab, and back_arc as an alternative", func(a *setting.Answer) bool {
			s := a.Slabs.All()
			return len(s) == 1 && s[0].DepthKm > 400 && s[0].DepthKm < 620 && slices.Equal(alternatives(a), []setting.Label{setting.BackArc})
		}},
		{"Hindu Kush", 70.8, 36.5, "a slab of collision", func(a *setting.Answer) bool {
			return a.Slabs.Len() > 0 && a.Slabs.All()[0].Slab.Kind == slab.Collision
		}},
		// the front of the Makran lies off Pakistan and Iran, so that Oman is on the lower plate
		{"Muscat", 58.4, 23.6, "on Arabia, which goes down at the Makran", func(a *setting.Answer) bool {
			return a.Plate.Code == "AR" && a.Label == setting.OuterRise && a.Controlling.Boundary.Subducting() == "AR" && a.Slabs.Len() == 0
		}},
		{"Salt Lake City", -111.9, 40.76, "of family rift", func(a *setting.Answer) bool { return a.Family == setting.RiftFamily && a.Zone != nil }},
		{"Davao", 125.6, 7.07, "controlled by the Philippine Trench", func(a *setting.Answer) bool {
			return a.IsControlled && a.Controlling.Boundary.Name() == "Philippine Trench" && a.Family == setting.SubductionFamily
		}},
		{"Taftan", 61.13, 28.60, "controlled by the Makran", func(a *setting.Answer) bool {
			return a.IsControlled && a.Controlling.Boundary.Name() == "Makran" && a.Controlling.DistanceKm > 400
		}},
	} {
		if a := answerAt(t, c.lon, c.lat); !c.is(a) {
			var slabs []string
			for _, s := range a.Slabs.All() {
				slabs = append(slabs, s.Slab.Name)
			}
			t.Errorf("%s: plate %s, side uncertain %v, nearest %s, slabs %v, %s; want %s", c.name, a.Plate.Code, a.SideUncertain, a.Nearest.Boundary.Name(), slabs, told(a), c.says)
		}
	}
}

// Places that the trade argues about, or that lie where settings meet: an answer
// that claimed high confidence there would be wrong whatever its label.
func TestNoHighConfidenceWhereTheTradeHasNone(t *testing.T) {
	for _, c := range []struct {
		name     string
		lon, lat float64
	}{
		{"Etna", 15.0, 37.75}, {"Yellowstone", -110.6, 44.45}, {"Haiti", -72.3, 18.55}, {"Timor", 125.0, -9.0},
		{"Mendocino triple junction", -124.4, 40.44}, {"Lima, at the edge of a flat slab", -77.04, -12.05},
	} {
		if a := answerAt(t, c.lon, c.lat); a.Confidence != setting.Low && a.Confidence != setting.Medium {
			t.Errorf("%s: %s; want low or medium", c.name, told(a))
		}
	}
}
