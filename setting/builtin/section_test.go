package builtin_test

import (
	"errors"
	"math"
	"slices"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"nearmargin/setting"
	"nearmargin/setting/builtin"
	"nearmargin/setting/slab"
	"nearmargin/setting/sphere"
)

// sectionLookup returns a look-up on the built-in model.
func sectionLookup(t *testing.T) *setting.Lookup {
	t.Helper()
	b, err := builtin.Load()
	if err != nil {
		t.Fatal(err)
	}
	l, err := b.Model.Lookup(setting.Options{})
	if err != nil {
		t.Fatal(err)
	}
	return l
}

// drawAbove draws a site above a slab: between two of its contours.
func drawAbove(t *rapid.T, s *slab.Slab) setting.Site {
	cs := slab.Contours(s.Surface)
	i := rapid.IntRange(1, len(cs)-1).Draw(t, "strip")
	corner := func(c slab.Contour, name string) sphere.Vec {
		return sphere.FromLonLat(c.Path[rapid.IntRange(0, len(c.Path)-1).Draw(t, name)])
	}
	f := rapid.Float64Range(0, 1).Draw(t, "fraction")
	p := corner(cs[i-1], "upper").Scale(1 - f).Add(corner(cs[i], "lower").Scale(f)).Unit().LonLat()
	return setting.SiteAt(p.Lon, p.Lat)
}

// TestSectionsAgreeWithAt: given a site above or near any slab, when it is cut,
// expect every sample's depth to be what At says of that place, samples 5 km
// apart, and distances that count from the trench.
func TestSectionsAgreeWithAt(t *testing.T) {
	l := sectionLookup(t)
	slabs := l.Model().Slabs()
	cut := map[string]bool{}
	rapid.Check(t, func(t *rapid.T) {
		site := drawAbove(t, rapid.SampledFrom(slabs).Draw(t, "slab"))
		s, err := l.Section(site)
		var none *setting.NoSlabError
		if errors.As(err, &none) {
			t.Skip("between contours that bend, and outside of the slab")
		}
		if err != nil {
			t.Fatal(err)
		}
		cut[s.Slab.ID] = true
		checkSection(t, l, s)
	})
	if len(cut) < 20 && !testing.Short() { // rapid draws fewer in short mode
		t.Errorf("only %d slabs were cut: too few to prove anything", len(cut))
	}
}

func checkSection(t *rapid.T, l *setting.Lookup, s *setting.Section) {
	t.Helper()
	var a setting.Answer
	met := 0
	for i, p := range s.Samples {
		if i > 0 {
			if km, _ := sphere.Inverse(s.Samples[i-1].At, p.At); math.Abs(km-setting.SectionStepKm) > 1e-6 {
				t.Fatalf("samples %d and %d are %g km apart", i-1, i, km)
			}
		}
		if math.Mod(p.Km, setting.SectionStepKm) != 0 {
			t.Fatalf("sample %d is at %g km, no multiple of the step", i, p.Km)
		}
		if s.HasTrench {
			if km, _ := sphere.Inverse(s.Trench.At, p.At); math.Abs(km-math.Abs(p.Km)) > 0.01 {
				t.Fatalf("sample at %g km lies %g km from the trench", p.Km, km)
			}
		}
		if err := l.At(setting.SiteAt(p.At.Lon, p.At.Lat), &a); err != nil {
			t.Fatal(err)
		}
		for j := range s.Profiles {
			profile := &s.Profiles[j]
			k := slices.IndexFunc(a.Slabs.All(), func(x setting.SlabAnswer) bool { return x.Slab == profile.Slab })
			if profile.Has(i) != (k >= 0) {
				t.Fatalf("%s at %g km: in the section %v, in the answer %v", profile.Slab.ID, p.Km, profile.Has(i), k >= 0)
			}
			if k < 0 {
				continue
			}
			met++
			if got, want := profile.Readings[i].DepthKm, a.Slabs.All()[k].DepthKm; math.Abs(got-want) > 1 {
				t.Fatalf("%s at %g km: %g km deep, At says %g", profile.Slab.ID, p.Km, got, want)
			}
		}
		if a.Slabs.Len() > met && !covered(s, &a) {
			t.Fatalf("at %g km: At has a slab that the section lacks", p.Km)
		}
	}
	if met < 2 {
		t.Fatalf("the section of %s has %d depths", s.Slab.ID, met)
	}
	for _, r := range s.Arc.Ranges {
		if !(r.ToKm >= r.FromKm) || r.FromKm < s.Line.FromKm || r.ToKm > s.Line.ToKm {
			t.Fatalf("arc range %v on a line from %g to %g km", r, s.Line.FromKm, s.Line.ToKm)
		}
	}
}

// covered reports whether every slab of the answer has a profile.
func covered(s *setting.Section, a *setting.Answer) bool {
	for _, x := range a.Slabs.All() {
		if !slices.ContainsFunc(s.Profiles, func(p setting.SlabProfile) bool { return p.Slab == x.Slab }) {
			return false
		}
	}
	return true
}

// TestRegularSlabsDeepenDownTheDip: on slabs whose contours are about parallel,
// expect a trench, and a top that deepens all the way.
func TestRegularSlabsDeepenDownTheDip(t *testing.T) {
	l := sectionLookup(t)
	for _, c := range []struct {
		name, slab, trench string
		lon, lat           float64
		arc                bool
	}{
		{"Chile", "chile-south", "chile-trench", -72.4, -36.1, true},
		{"Honshu", "japan", "japan-trench", 141, 39.5, true},
		{"Kanto, above two slabs", "kanto", "sagami-trough", 139.9, 35.7, false},
		{"Tonga", "tonga", "tonga-trench", -176.5, -20, true},
		{"Cascadia", "cascadia", "cascadia-trench", -122.3, 45.5, true},
		{"Sumatra", "sumatra", "sumatra-trench", 100.4, -0.5, true},
		{"Mariana", "mariana", "mariana-trench", 145.5, 18, true},
		{"Hellenic arc, whose slab begins seaward of the trench", "hellenic", "hellenic-trench", 25.4, 36.4, true},
		{"Alaska, from a collision belt", "alaska", "chugach-saint-elias", -152, 61, true},
	} {
		t.Run(c.name, func(t *testing.T) {
			s, err := l.Section(setting.SiteAt(c.lon, c.lat))
			if err != nil {
				t.Fatal(err)
			}
			if s.Slab.ID != c.slab || !s.HasTrench || !strings.HasPrefix(s.Trench.Boundary.ID(), c.trench) {
				t.Fatalf("slab %s, trench %v %s; want %s, %s", s.Slab.ID, s.HasTrench, s.Trench.Boundary.ID(), c.slab, c.trench)
			}
			if s.Line.From != setting.FromDip || s.Trench.CrossingDeg < 30 {
				t.Errorf("line from %v, crossing %g degrees", s.Line.From, s.Trench.CrossingDeg)
			}
			if (len(s.Arc.Ranges) > 0) != c.arc {
				t.Errorf("arc ranges %v", s.Arc.Ranges)
			}
			if s.Trench.Motion.OpeningMmYr >= 0 {
				t.Errorf("the plates part at %g mm/yr", s.Trench.Motion.OpeningMmYr)
			}
			last, met := 0.0, 0
			for i, p := range s.Samples {
				if !s.Profiles[0].Has(i) {
					continue
				}
				met++
				if z := s.Profiles[0].Readings[i].DepthKm; z < last {
					t.Errorf("at %g km: %g km deep after %g", p.Km, z, last)
				} else {
					last = z
				}
			}
			if met < 20 {
				t.Errorf("%d samples on the slab", met)
			}
		})
	}
}
