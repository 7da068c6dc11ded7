package setting_test

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"nearmargin/setting"
	"nearmargin/setting/builtin"
	"nearmargin/setting/sphere"
)

// TestWatchMissesNothing compares the alternatives that are found by moving the
// marked quantities alone with those found by moving all.
func TestWatchMissesNothing(t *testing.T) {
	b, err := builtin.Load()
	if err != nil {
		t.Fatal(err)
	}
	l, err := b.Model.Lookup(setting.Options{Brief: true})
	if err != nil {
		t.Fatal(err)
	}
	sites, marks, met := 60000, 0, 0
	if testing.Short() {
		sites = 5000
	}
	all := b.Model.Network().Boundaries()
	r := rand.New(rand.NewPCG(20030314, 5))
	for i := range sites {
		lon, lat := r.Float64()*360-180, math.Asin(r.Float64()*2-1)*180/math.Pi
		if i%4 != 0 { // most of them where rules are close to each other
			path := all[r.IntN(len(all))].Path()
			p := sphere.Direct(path[r.IntN(len(path))], r.Float64()*360, 600*r.Float64()*r.Float64())
			lon, lat = p.Lon, p.Lat
		}
		s := setting.SiteAt(lon, lat)
		if i%3 == 0 {
			s.UncertaintyKm = 100 * r.Float64() * r.Float64()
		}
		watched, plain, n, err := setting.VaryBoth(l, s)
		if err != nil {
			t.Fatal(err)
		}
		if !slices.Equal(watched, plain) {
			t.Fatalf("at %g, %g ± %g km: %+v, by trying all %+v", lon, lat, s.UncertaintyKm, watched, plain)
		}
		marks += n
		met += len(plain)
	}
	if met < sites/10 {
		t.Errorf("only %d alternatives at %d sites", met, sites)
	}
	t.Logf("%d sites, %d alternatives, %.2f quantities tried a site", sites, met, float64(marks)/float64(sites))
}
