package builtin_test

import (
	"math"
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
	s := a.Label.String() + " of " + a.Family.String() + ", " + a.Confidence.String()
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
var knownSites = []struct {
	name     string
	lon, lat float64
	want     setting.Label
	why      string // what the site is known for
}{
	{"Hole 504B", -83.73, 1.23, setting.RidgeFlank, "drilled into 6 Myr old crust south of the Costa Rica Rift (DSDP 69 and 70, ODP 111)"},
	{"TAG mound", -44.83, 26.14, setting.RidgeAxis, "hydrothermal mound in the rift valley of the Mid-Atlantic Ridge (ODP 158)"},
	{"9 50 N on the East Pacific Rise", -104.29, 9.84, setting.RidgeAxis, "eruptions of 1991 and 2005 at the axis"},
	{"Hole 735B", 57.27, -32.72, setting.TransformZone, "Atlantis Bank, beside the Atlantis II transform (ODP 118 and 176)"},
	{"Site C0002", 136.64, 33.30, setting.Forearc, "Kumano forearc basin above the Nankai Trough (IODP 314 to 358)"},
	{"JFAST Site C0019", 143.91, 37.94, setting.Trench, "the Tohoku fault 7 km from the axis of the Japan Trench (IODP 343)"},
	{"seaward of the Japan Trench", 145.5, 38.5, setting.OuterRise, "Pacific plate before it goes down"},
	{"Valu Fa Ridge", -176.6, -22.2, setting.BackArcSpreading, "southernmost spreading centre of the Lau Basin (ODP 135)"},
	{"Krafla", -16.78, 65.72, setting.RidgeAxis, "central volcano in Iceland's northern rift zone"},
	{"Parkfield", -120.55, 35.97, setting.TransformZone, "on the San Andreas Fault"},
	{"Mandalay", 96.08, 21.97, setting.TransformZone, "beside the Sagaing Fault"},
	{"Kaikoura", 173.7, -42.4, setting.TransformZone, "Marlborough faults at the southern end of the Hikurangi slab"},
	{"Kathmandu", 85.3, 27.7, setting.CollisionZone, "Himalaya"},
	{"Hindu Kush", 70.8, 36.5, setting.CollisionZone, "intermediate-depth earthquakes below a continent"},
	{"KTB deep drill hole", 12.12, 49.82, setting.PlateInterior, "Oberpfalz, Germany"},
	{"Kola deep drill hole", 30.6, 69.4, setting.PlateInterior, "Baltic Shield"},
	{"Kilauea", -155.28, 19.41, setting.PlateInterior, "Hawaii hotspot"},
	{"Vladivostok", 131.9, 43.1, setting.PlateInterior, "deep earthquakes of the Pacific slab lie below"},
	{"Fuji", 138.73, 35.36, setting.VolcanicArc, "Izu arc, over the Pacific slab"},
	{"Soufriere Hills", -62.18, 16.72, setting.VolcanicArc, "Lesser Antilles"},
	{"Sakurajima", 130.66, 31.58, setting.VolcanicArc, "Ryukyu arc"},
	{"White Island", 177.18, -37.52, setting.VolcanicArc, "Taupo volcanic zone: a rift is nearer than the trench"},
	{"Villarrica", -71.93, -39.42, setting.VolcanicArc, "southern volcanic zone of the Andes, on the Liquine-Ofqui fault"},
	{"Cotopaxi", -78.44, -0.68, setting.VolcanicArc, "northern volcanic zone of the Andes"},
	{"Olkaria", 36.3, -0.9, setting.ContinentalRift, "geothermal field in the Kenya Rift"},
	{"Erta Ale", 40.67, 13.6, setting.ContinentalRift, "Danakil Depression"},
	{"Explorer Ridge", -130.2, 49.8, setting.RidgeAxis, "spreading off Vancouver Island"},
	{"17.4 S, 113.8 W", -113.8, -17.4, setting.RidgeFlank, "60 km west of the fastest part of the East Pacific Rise"},
}

func TestKnownSites(t *testing.T) {
	for _, c := range knownSites {
		t.Run(c.name, func(t *testing.T) {
			a := answerAt(t, c.lon, c.lat)
			if a.Label != c.want {
				t.Errorf("%g, %g (%s) is %s; want %v", c.lon, c.lat, c.why, told(a), c.want)
			}
			t.Log(told(a), a.Plate.Code)
		})
	}
}

var _ = math.NaN
var _ = slices.Contains[[]string]
var _ = strings.Join
var _ slab.Kind
