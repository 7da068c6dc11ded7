package setting_test

import (
	"fmt"
	"math"
	"testing"

	"pgregory.net/rapid"

	"nearmargin/setting"
	"nearmargin/setting/boundary"
	"nearmargin/setting/motion"
	"nearmargin/setting/sphere"
)

// The synthetic model has two plates, AA north of the equator and BB south of
// it. The equator is cut into nine boundaries of 40 degrees, one for each rule, so
// that within 1,500 km of the middle of one no other can decide.
var segments = [9]struct {
	id         string
	kind       boundary.Type
	subducting string
	sigmaKm    float64
}{
	{"trench", boundary.Subduction, "BB", 5},
	{"ridge", boundary.SpreadingRidge, "", 4},
	{"ocean-fault", boundary.OceanicTransform, "", 3},
	{"land-fault", boundary.ContinentalTransform, "", 6},
	{"rift", boundary.ContinentalRift, "", 8},
	{"convergence", boundary.OceanicConvergent, "", 7},
	{"collision", boundary.ContinentalConvergent, "BB", 10},
	{"collision-of-either", boundary.ContinentalConvergent, "", 9},
	{"vague-trench", boundary.Subduction, "BB", 30},
}

// middleLon returns the longitude of the middle of a segment.
func middleLon(segment int) float64 { return sphere.WrapLon(-160 + 40*float64(segment)) }

func segmentOf(tb rapid.TB, id string) int {
	tb.Helper()
	for i := range segments {
		if segments[i].id == id {
			return i
		}
	}
	tb.Fatalf("no segment %q", id)
	return -1
}

// off returns the site that lies kmNorth north of the middle of a segment along
// WGS84, south where it is negative.
func off(tb rapid.TB, id string, kmNorth float64) setting.Site {
	tb.Helper()
	from := sphere.LonLat{Lon: middleLon(segmentOf(tb, id))}
	azimuth := 0.0
	if kmNorth < 0 {
		azimuth = 180
	}
	p := sphere.Direct(from, azimuth, math.Abs(kmNorth))
	return setting.SiteAt(p.Lon, p.Lat)
}

func must[T any](v T, err error) T {
	if err != nil {
		panic(err)
	}
	return v
}

// square returns a zone two degrees wide around a place.
func square(name string, kind setting.ZoneKind, lon, lat float64) *setting.Zone {
	ring := []sphere.LonLat{{Lon: lon - 1, Lat: lat - 1}, {Lon: lon + 1, Lat: lat - 1}, {Lon: lon + 1, Lat: lat + 1}, {Lon: lon - 1, Lat: lat + 1}, {Lon: lon - 1, Lat: lat - 1}}
	return must(setting.NewZone(setting.Zone{Name: name, Kind: kind, Source: "made up", Rings: [][]sphere.LonLat{ring}}))
}

// contents returns the parts of the synthetic model.
func contents() setting.Contents {
	c := setting.Contents{
		ID: "synthetic", Edition: "1", Title: "Two hemispheres", Licence: "CC0-1.0", SHA256: "none",
		Plates:        []setting.Plate{{Code: "AA", Name: "North"}, {Code: "BB", Name: "South"}},
		DefaultMotion: "slow",
		Zones: []*setting.Zone{
			square("Stretched", setting.ExtensionKind, 0, 40), square("Sheared", setting.ShearKind, 20, 40),
			square("Squeezed", setting.CollisionKind, 40, 40), square("Unclear", setting.MixedKind, 60, 40),
			square("Plateau", setting.CollisionKind, middleLon(6)+10, 4),
		},
		Hotspots: []setting.Hotspot{{Name: "Plume", At: sphere.LonLat{Lon: -100, Lat: 50}, Source: "made up"}},
	}
	for i, s := range segments {
		from := sphere.WrapLon(-180 + 40*float64(i))
		c.Boundaries = append(c.Boundaries, must(boundary.New(boundary.Spec{
			ID: s.id, Name: "The " + s.id, Type: s.kind, Left: "AA", Right: "BB", Subducting: s.subducting,
			SigmaKm: s.sigmaKm, Source: "made up", SourceStatus: boundary.FromMemory,
			Path: []sphere.LonLat{{Lon: from}, {Lon: from + 20}, {Lon: sphere.WrapLon(from + 40)}},
		})))
	}
	// BB turns about an axis 90 degrees east of the ridge's middle, relative to AA:
	// southward at the ridge, so that it opens
	axis := sphere.FromLonLat(sphere.LonLat{Lon: middleLon(1) + 90})
	plates := func(name string, mmYr float64, basis string, spread motion.Spread) *motion.Model {
		still := motion.Entry{Plate: "AA", Spread: spread, Basis: motion.Published}
		moving := motion.Entry{Plate: "BB", Vector: axis.Scale(mmYr / sphere.MeanRadiusKm), Spread: spread, Basis: basis}
		return must(motion.NewModel(motion.Info{Name: name}, []motion.Entry{still, moving}))
	}
	sure := must(motion.ComponentSpread(sphere.Vec{X: 1e-4, Y: 1e-4, Z: 1e-4}))
	c.Motions = []*motion.Model{
		plates("slow", slowMmYr, motion.Published, motion.NoSpread()), plates("fast", fastMmYr, motion.Published, sure),
		plates("composed", slowMmYr, motion.Composed("AA"), sure),
		must(motion.NewModel(motion.Info{Name: "half"}, []motion.Entry{{Plate: "AA", Basis: motion.Published}})),
	}
	return c
}

// Full spreading rates of the synthetic ridge: at the slow one the sea floor is
// 10 Myr old 300 km away, at the fast one 500 km away.
const (
	slowMmYr = 60
	fastMmYr = 100
)

var synthetic = must(setting.NewModel(contents()))

func look(tb rapid.TB, o setting.Options) *setting.Lookup {
	tb.Helper()
	l, err := synthetic.Lookup(o)
	if err != nil {
		tb.Fatal(err)
	}
	return l
}

func answer(tb rapid.TB, l *setting.Lookup, s setting.Site) *setting.Answer {
	tb.Helper()
	a := &setting.Answer{}
	if err := l.At(s, a); err != nil {
		tb.Fatal(err)
	}
	return a
}

func limit(tb rapid.TB, name string) setting.Limit {
	tb.Helper()
	for _, l := range setting.Limits {
		if l.Name == name {
			return l
		}
	}
	tb.Fatalf("the rule table has no limit %q", name)
	return setting.Limit{}
}

func TestSyntheticModelIsClosed(t *testing.T) {
	for _, f := range synthetic.Network().Faults() {
		t.Errorf("%s at %v: %s", f.Code, f.At, f.Detail)
	}
	for i, s := range segments {
		a := answer(t, look(t, setting.Options{}), off(t, s.id, 1500))
		if a.Nearest.Boundary.ID() != s.id || math.Abs(a.Nearest.DistanceKm-1500) > 1e-3 {
			t.Errorf("segment %d: nearest is %s at %.4f km, want %s at 1500", i, a.Nearest.Boundary.ID(), a.Nearest.DistanceKm, s.id)
		}
	}
	a := answer(t, look(t, setting.Options{}), off(t, "ridge", 100))
	if m := a.Nearest.Motion; math.Abs(m.OpeningMmYr-slowMmYr) > 1e-9 || m.Plate != "BB" || m.RelativeTo != "AA" {
		t.Errorf("the ridge opens by %g mm/yr of %s to %s, want %d of BB to AA", m.OpeningMmYr, m.Plate, m.RelativeTo, slowMmYr)
	}
}

// names returns the alternatives as text, for messages and comparison.
func names(a *setting.Answer) map[string]bool {
	out := map[string]bool{}
	for _, alt := range a.Alternatives.All() {
		out[fmt.Sprint(alt.Label)] = true
	}
	return out
}
