package setting_test

import (
	"errors"
	"math"
	"strings"
	"testing"

	"nearmargin/setting"
	"nearmargin/setting/slab"
	"nearmargin/setting/sphere"
)

// northward are depths and latitudes of the synthetic slab's contours below.
var northward = []struct{ depthKm, sigmaKm, lat float64 }{{10, 4, 0.3}, {50, 6, 1}, {100, 8, 1.8}, {200, 12, 2.8}, {400, 20, 4.3}, {600, 30, 5.8}}

// sheet returns a slab between contours along parallels that run westward, or
// along meridians where turned.
func sheet(t *testing.T, id string, boundaries []string, turned bool, centre sphere.LonLat, contours ...[2]float64) *slab.Slab {
	t.Helper()
	var list []slab.Contour
	for _, c := range contours {
		k := slab.Contour{DepthKm: c[0], SigmaKm: 5}
		for _, side := range []float64{12, 6, 0, -6, -12} {
			p := sphere.LonLat{Lon: centre.Lon + side, Lat: centre.Lat + c[1]}
			if turned {
				p = sphere.LonLat{Lon: centre.Lon + c[1], Lat: centre.Lat - side/6}
			}
			k.Path = append(k.Path, p)
		}
		list = append(list, k)
	}
	return must(slab.New(slab.Spec{
		ID: id, Name: "The " + id, Kind: slab.Subduction, BoundaryIDs: boundaries, Subducting: "BB", Overriding: "AA",
		ArcMinDepthKm: arcMinKm, Source: "made up", SourceStatus: "memory", Surface: must(slab.NewContours(list)),
	}))
}

// oblique returns a slab north of the vague trench that dips at 15 degrees to it.
func oblique(t *testing.T) *slab.Slab {
	t.Helper()
	var list []slab.Contour
	for _, c := range [][2]float64{{20, 0}, {60, 1}, {120, 2}} {
		k := slab.Contour{DepthKm: c[0], SigmaKm: 5}
		for _, lat := range []float64{0.2, 2, 4} {
			k.Path = append(k.Path, sphere.LonLat{Lon: 170 + c[1] - 0.27*(lat-2), Lat: lat})
		}
		list = append(list, k)
	}
	return must(slab.New(slab.Spec{
		ID: "oblique", Name: "Oblique", Kind: slab.Subduction, BoundaryIDs: []string{"vague-trench"}, Subducting: "BB", Overriding: "AA",
		ArcMinDepthKm: arcMinKm, Source: "made up", SourceStatus: "memory", Surface: must(slab.NewContours(list)),
	}))
}

// sections returns a look-up on the synthetic model with six slabs: one north of
// the trench, a flat one below its lower end, one whose dip runs along the vague
// trench, one that goes down from it and does not name it, one oblique to it, and
// one far from any trench, without one of its own.
func sections(t *testing.T) *setting.Lookup {
	t.Helper()
	var main []slab.Contour
	for _, n := range northward {
		main = append(main, slab.Contour{DepthKm: n.depthKm, SigmaKm: n.sigmaKm, Path: []sphere.LonLat{
			{Lon: -148, Lat: n.lat}, {Lon: -156, Lat: n.lat}, {Lon: -160, Lat: n.lat}, {Lon: -164, Lat: n.lat}, {Lon: -172, Lat: n.lat},
		}})
	}
	c := contents()
	c.Slabs = []*slab.Slab{
		must(slab.New(slab.Spec{
			ID: "northward", Name: "Northward", Kind: slab.Subduction, BoundaryIDs: []string{"trench"},
			Subducting: "BB", Overriding: "AA", ArcMinDepthKm: arcMinKm, Source: "made up", SourceStatus: "memory", Surface: must(slab.NewContours(main)),
		})),
		sheet(t, "lower", []string{"trench"}, false, sphere.LonLat{Lon: -160}, [2]float64{620, 4}, [2]float64{640, 7}),
		sheet(t, "turned", []string{"vague-trench"}, true, sphere.LonLat{Lon: middleLon(8), Lat: 3}, [2]float64{60, 0}, [2]float64{120, 2}, [2]float64{200, 4}),
		sheet(t, "foreign", []string{"trench"}, false, sphere.LonLat{Lon: 150}, [2]float64{20, 0.3}, [2]float64{60, 1}, [2]float64{120, 2}),
		oblique(t),
		sheet(t, "lonely", nil, false, sphere.LonLat{Lon: middleLon(4), Lat: 40}, [2]float64{100, 0}, [2]float64{120, 1}, [2]float64{200, 2}),
	}
	return must(must(setting.NewModel(c)).Lookup(setting.Options{}))
}

func section(t *testing.T, l *setting.Lookup, s setting.Site) *setting.Section {
	t.Helper()
	x, err := l.Section(s)
	if err != nil {
		t.Fatal(err)
	}
	return x
}

// kmAt returns the length of the meridian from the equator to a latitude.
func kmAt(lat float64) float64 {
	km, _ := sphere.Inverse(sphere.LonLat{Lon: -160}, sphere.LonLat{Lon: -160, Lat: lat})
	return math.Copysign(km, lat)
}

// between returns the depth and σ that a straight line between the contours gives
// at a latitude.
func between(lat float64) (depthKm, sigmaKm float64) {
	for i := 1; i < len(northward); i++ {
		if a, b := northward[i-1], northward[i]; lat >= a.lat && lat <= b.lat {
			f := (lat - a.lat) / (b.lat - a.lat)
			return a.depthKm + f*(b.depthKm-a.depthKm), a.sigmaKm + f*(b.sigmaKm-a.sigmaKm)
		}
	}
	return math.NaN(), math.NaN()
}

// TestSectionOfAStraightSlab compares a section with what the contours, which run
// along parallels, give by hand: above the slab, past its rim, between the trench
// and its start, and seaward.
func TestSectionOfAStraightSlab(t *testing.T) {
	l := sections(t)
	for _, c := range []struct {
		name      string
		lat       float64
		below     bool
		outsideKm float64
	}{
		{"above", 2.2, true, 0},
		{"at its start", 0.31, true, 0},
		{"between trench and start", 0.1, false, 0.2 * 111.2},
		{"on the trench", 0, false, 0.3 * 111.2},
		{"seaward", -0.3, false, 0.6 * 111.2},
		{"past the rim, where the lower slab is below", 6.2, true, 0},
	} {
		t.Run(c.name, func(t *testing.T) {
			s := section(t, l, setting.SiteAt(-160, c.lat))
			if c.lat > 5.8 {
				if s.Slab.ID != "lower" {
					t.Fatalf("slab %s, want the one below the site", s.Slab.ID)
				}
				return
			}
			if s.Slab.ID != "northward" || s.IsBelow != c.below || math.Abs(s.OutsideKm-c.outsideKm) > 1 {
				t.Fatalf("slab %s, below %v, %g km outside; want northward, %v, %g", s.Slab.ID, s.IsBelow, s.OutsideKm, c.below, c.outsideKm)
			}
			if math.Abs(s.SiteKm-kmAt(c.lat)) > 0.01 {
				t.Errorf("the site is at %g km, want %g", s.SiteKm, kmAt(c.lat))
			}
			if az := s.Line.AzimuthDeg; math.Min(az, 360-az) > 0.1 || s.Line.From != setting.FromDip {
				t.Errorf("azimuth %g from %v, want 0 from the dip", az, s.Line.From)
			}
			checkStraight(t, s)
		})
	}
}

func checkStraight(t *testing.T, s *setting.Section) {
	t.Helper()
	if !s.HasTrench || s.Trench.Boundary.ID() != "trench" || math.Abs(s.Trench.At.Lat) > 1e-6 || math.Abs(s.Trench.At.Lon+160) > 0.005 {
		t.Fatalf("trench %v at %v, want that at 160 W on the equator", s.HasTrench, s.Trench.At)
	}
	if math.Abs(s.Trench.CrossingDeg-90) > 0.1 {
		t.Errorf("line and trench cross at %g degrees, want 90", s.Trench.CrossingDeg)
	}
	// BB turns about an axis 90 degrees east of the ridge's middle, 40 degrees from
	// here: southward at slowMmYr·cos 40 degrees, away from AA
	want := slowMmYr * math.Cos(40*math.Pi/180)
	m := s.Trench.Motion
	if !m.Known || m.Plate != "BB" || m.RelativeTo != "AA" || math.Abs(m.RateMmYr-want) > 0.01 || math.Abs(m.AzimuthDeg-180) > 0.01 || math.Abs(m.OpeningMmYr-want) > 0.01 {
		t.Errorf("motion %+v, want %g mm/yr southward", m, want)
	}
	if len(s.Arc.Ranges) != 1 {
		t.Fatalf("arc ranges %v, want one", s.Arc.Ranges)
	}
	// 80 km is reached at latitude 1.48, 170 km at 2.5
	if r := s.Arc.Ranges[0]; math.Abs(r.FromKm-kmAt(1.48)) > 0.2 || math.Abs(r.ToKm-kmAt(2.5)) > 0.2 {
		t.Errorf("arc from %g to %g km, want %g to %g", r.FromKm, r.ToKm, kmAt(1.48), kmAt(2.5))
	}
	last, seen, zero := 0.0, 0, false
	for i, p := range s.Samples {
		zero = zero || p.Km == 0
		if math.Abs(kmAt(p.At.Lat)-p.Km) > 0.01 {
			t.Errorf("sample at %g km lies %g km from the equator", p.Km, kmAt(p.At.Lat))
		}
		z, sigma := between(p.At.Lat)
		r := s.Profiles[0].Readings[i]
		if math.IsNaN(z) != !s.Profiles[0].Has(i) {
			t.Errorf("at %g km: depth %g, want %g", p.Km, r.DepthKm, z)
			continue
		}
		if math.IsNaN(z) {
			continue
		}
		seen++
		if math.Abs(r.DepthKm-z) > 1 || math.Abs(r.SigmaKm-sigma) > 0.2 {
			t.Errorf("at %g km: %g ± %g km, want %g ± %g", p.Km, r.DepthKm, r.SigmaKm, z, sigma)
		}
		if r.DepthKm <= last {
			t.Errorf("at %g km the slab does not deepen: %g after %g km", p.Km, r.DepthKm, last)
		}
		last = r.DepthKm
	}
	if !zero || seen < 115 || s.Samples[0].Km > -75 {
		t.Errorf("a sample on the trench: %v; %d samples on the slab; the first at %g km", zero, seen, s.Samples[0].Km)
	}
	if len(s.Profiles) != 2 || s.Profiles[1].Slab.ID != "lower" {
		t.Errorf("%d slabs, want the lower one as well", len(s.Profiles))
	}
}

// TestSectionChoosesItsLine: where the dip leads along the trench the line comes
// from the trench; where there is no trench distances count from the slab's edge.
func TestSectionChoosesItsLine(t *testing.T) {
	l := sections(t)
	s := section(t, l, setting.SiteAt(middleLon(8)+2, 3))
	if s.Slab.ID != "turned" || s.Line.From != setting.FromTrench || !s.HasTrench || s.Trench.Boundary.ID() != "vague-trench" {
		t.Fatalf("slab %s, line from %v, trench %v", s.Slab.ID, s.Line.From, s.HasTrench)
	}
	if math.Abs(s.SiteKm-kmAt(3)) > 0.5 || s.Trench.CrossingDeg < 89.9 {
		t.Errorf("the site is at %g km, crossing %g degrees; want %g and 90", s.SiteKm, s.Trench.CrossingDeg, kmAt(3))
	}

	// the line down the dip meets the trench at 15 degrees, 125 km up from the slab
	s = section(t, l, setting.SiteAt(171.5, 0.6))
	if s.Slab.ID != "oblique" || s.Line.From != setting.FromTrench || s.Trench.CrossingDeg < 89 {
		t.Errorf("slab %s, line from %v, crossing %g degrees; want oblique, the trench, 90", s.Slab.ID, s.Line.From, s.Trench.CrossingDeg)
	}

	s = section(t, l, setting.SiteAt(150, 1.5))
	if s.Slab.ID != "foreign" || !s.HasTrench || s.Trench.Boundary.ID() != "vague-trench" || math.Abs(s.SiteKm-kmAt(1.5)) > 0.5 {
		t.Errorf("slab %s, trench %v, site at %g km; want the vague trench though the slab does not name it", s.Slab.ID, s.HasTrench, s.SiteKm)
	}

	s = section(t, l, setting.SiteAt(middleLon(4), 41))
	if s.Slab.ID != "lonely" || s.HasTrench || s.Line.From != setting.FromDip {
		t.Fatalf("slab %s, line from %v, trench %v", s.Slab.ID, s.Line.From, s.HasTrench)
	}
	if math.Abs(s.SiteKm-110) > 6 { // one degree from its edge, found to within a step
		t.Errorf("the site is %g km from the slab's edge, want 110", s.SiteKm)
	}
	for i, p := range s.Samples {
		if s.Profiles[0].Has(i) {
			if p.Km != 0 {
				t.Errorf("the slab begins at %g km, want 0", p.Km)
			}
			break
		}
	}
}

// TestSectionWithDepth: a site at depth gets its relation to the slab.
func TestSectionWithDepth(t *testing.T) {
	site := setting.SiteAt(-160, 1.8)
	site.DepthKm = 33
	s := section(t, sections(t), site)
	if s.Below.Relation != slab.Above || math.Abs(s.Below.ClearanceKm-67) > 0.5 {
		t.Errorf("%v by %g km, want above by 67", s.Below.Relation, s.Below.ClearanceKm)
	}
	var codes []string
	for _, n := range s.Notes.All() {
		codes = append(codes, string(n.Code))
	}
	for _, want := range []setting.NoteCode{setting.NoteFixedDepth, setting.NoteScreening} {
		if !strings.Contains(strings.Join(codes, " "), string(want)) {
			t.Errorf("notes %v, want %s among them", codes, want)
		}
	}
}

// TestNoSection: given a site on no section, expect the nearest slab and how far
// it is; given a bad site, expect the field.
func TestNoSection(t *testing.T) {
	l := sections(t)
	empty := look(t, setting.Options{})
	for _, c := range []struct {
		name     string
		l        *setting.Lookup
		lon, lat float64
		nearest  string
		km       float64
		says     string
	}{
		{"far from all", l, -160, 20, "lower", 13 * 111.2, "within 200 km"},
		{"past the lateral end", l, -147, 3, "northward", 111, "lateral end"},
		{"on the other hemisphere", l, middleLon(4), -60, "lonely", 100 * 111.195, "the nearest is The lonely"},
		{"no slabs at all", empty, -160, 2, "", 0, "no slab surfaces"},
	} {
		t.Run(c.name, func(t *testing.T) {
			_, err := c.l.Section(setting.SiteAt(c.lon, c.lat))
			var none *setting.NoSlabError
			if !errors.As(err, &none) {
				t.Fatalf("%v, want a *NoSlabError", err)
			}
			if !strings.Contains(err.Error(), c.says) {
				t.Errorf("%q does not say %q", err, c.says)
			}
			if c.nearest == "" {
				if none.Nearest != nil {
					t.Errorf("nearest %s, want none", none.Nearest.ID)
				}
				return
			}
			if none.Nearest.ID != c.nearest || math.Abs(none.Km-c.km) > 3 {
				t.Errorf("nearest %s at %g km, want %s at %g", none.Nearest.ID, none.Km, c.nearest, c.km)
			}
		})
	}
	_, err := l.Section(setting.SiteAt(0, 91))
	var field *setting.FieldError
	if !errors.As(err, &field) || field.Field != "lat" {
		t.Errorf("%v, want a *FieldError on lat", err)
	}
}

func TestAzimuthSourcesHaveNames(t *testing.T) {
	seen := map[string]bool{setting.NoAzimuth.String(): true}
	for _, s := range setting.AllAzimuthSources {
		if seen[s.String()] {
			t.Errorf("the name %q stands twice", s)
		}
		seen[s.String()] = true
	}
	if got := setting.AzimuthSource(9).String(); got != "AzimuthSource(9)" {
		t.Errorf("a source that is none is called %q", got)
	}
}
