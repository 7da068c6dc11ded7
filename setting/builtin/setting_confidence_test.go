package builtin_test

import (
	"flag"
	"math"
	"math/rand/v2"
	"testing"
	"time"

	"nearmargin/setting"
	"nearmargin/setting/sphere"
)

var seedFlag = flag.Uint64("seed", 20030314, "seed of the random tests; 0 takes one from the clock")

// scattered returns n places spread evenly over the sphere, land and ocean.
func scattered(tb testing.TB, n int) []sphere.LonLat {
	tb.Helper()
	seed := *seedFlag
	if seed == 0 {
		seed = uint64(time.Now().UnixNano())
	}
	tb.Logf("random places: repeat with -seed %d", seed)
	r := rand.New(rand.NewPCG(seed, 2))
	out := make([]sphere.LonLat, n)
	for i := range out {
		out[i] = sphere.LonLat{Lon: 360*r.Float64() - 180, Lat: math.Asin(2*r.Float64()-1) * 180 / math.Pi}
	}
	return out
}

func lookup(tb testing.TB, m *setting.Model) *setting.Lookup {
	tb.Helper()
	l, err := m.Lookup(setting.Options{Brief: true})
	if err != nil {
		tb.Fatal(err)
	}
	return l
}

// Confidence that is always high, or never, would say nothing.
func TestSharesOfConfidence(t *testing.T) {
	l := lookup(t, model(t))
	var all, margins [4]int // margins: what is no plate interior
	const n = 10_000
	var a setting.Answer
	for _, at := range scattered(t, n) {
		if err := l.At(setting.SiteAt(at.Lon, at.Lat), &a); err != nil {
			t.Fatal(err)
		}
		all[a.Confidence]++
		if a.Label != setting.PlateInterior {
			margins[a.Confidence]++
		}
		// what confidence means: a label met beside is no high confidence, one of another family is low
		want := setting.High
		for _, alt := range a.Alternatives.All() {
			if alt.Family != a.Family {
				want = setting.Low
				break
			}
			want = setting.Medium
		}
		if a.Confidence != want && !(want == setting.High && a.Confidence == setting.Medium) {
			t.Errorf("%v: %s; want %v", at, told(&a), want)
		}
	}
	sum := margins[setting.High] + margins[setting.Medium] + margins[setting.Low]
	for _, c := range [...]setting.Confidence{setting.High, setting.Medium, setting.Low} {
		t.Logf("%-6v %5.1f %% of all, %5.1f %% of the %d that are no plate interior", c, 100*float64(all[c])/n, 100*float64(margins[c])/float64(sum), sum)
		if all[c] == 0 || margins[c] == 0 {
			t.Errorf("no place is of %v confidence", c)
		}
	}
	if all[setting.High] <= n/2 {
		t.Errorf("%d of %d places are of high confidence, want more than half", all[setting.High], n)
	}
}
