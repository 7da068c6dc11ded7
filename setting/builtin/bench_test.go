package builtin

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"nearmargin/setting"
	"nearmargin/setting/sphere"
	"nearmargin/testdata/bench/rounds"
)

// sites returns seeded places: anywhere on the sphere, or within 300 km of a
// boundary.
func sites(tb testing.TB, m *setting.Model, near bool) []setting.Site {
	tb.Helper()
	rng := rand.New(rand.NewPCG(1, 2))
	all := m.Network().Boundaries()
	out := make([]setting.Site, 4096)
	for i := range out {
		lon, lat := rng.Float64()*360-180, math.Asin(rng.Float64()*2-1)*180/math.Pi
		if near {
			path := all[rng.IntN(len(all))].Path()
			p := sphere.Direct(path[rng.IntN(len(path))], rng.Float64()*360, rng.Float64()*300)
			lon, lat = p.Lon, p.Lat
		}
		out[i] = setting.SiteAt(lon, lat)
	}
	return out
}

// BenchmarkAt measures whole answers, beside one Karney inverse in the same run.
func BenchmarkAt(b *testing.B) {
	bundle, err := Load()
	if err != nil {
		b.Fatal(err)
	}
	m := bundle.Model
	for _, near := range []bool{false, true} {
		in := sites(b, m, near)
		for _, brief := range []bool{true, false} {
			b.Run(fmt.Sprintf("near=%t/brief=%t", near, brief), func(b *testing.B) {
				l, err := m.Lookup(setting.Options{Brief: brief})
				if err != nil {
					b.Fatal(err)
				}
				var a setting.Answer
				b.ReportAllocs()
				for i := 0; b.Loop(); i++ {
					if err := l.At(in[i%len(in)], &a); err != nil || a.Label == setting.NoLabel {
						b.Fatal(err, a.Label)
					}
				}
			})
		}
	}
	in := sites(b, m, false)
	b.Run("one Karney inverse", func(b *testing.B) {
		for i := 0; b.Loop(); i++ {
			p, q := in[i%len(in)], in[(i+1)%len(in)]
			if km, _ := sphere.Inverse(sphere.LonLat{Lon: p.Lon, Lat: p.Lat}, sphere.LonLat{Lon: q.Lon, Lat: q.Lat}); km < 0 {
				b.Fatal(km)
			}
		}
	})
}

// BenchmarkAtInverses gives the time of a whole answer in Karney inverses, both
// measured in turn.
func BenchmarkAtInverses(b *testing.B) {
	bundle, err := Load()
	if err != nil {
		b.Fatal(err)
	}
	for _, near := range []bool{false, true} {
		for _, brief := range []bool{true, false} {
			b.Run(fmt.Sprintf("near=%t/brief=%t", near, brief), func(b *testing.B) {
				l, err := bundle.Model.Lookup(setting.Options{Brief: brief})
				if err != nil {
					b.Fatal(err)
				}
				in := sites(b, bundle.Model, near)
				var a setting.Answer
				for b.Loop() {
					ns := rounds.Medians(101, rounds.Slice, func(i int) {
						if err := l.At(in[i%len(in)], &a); err != nil || a.Label == setting.NoLabel {
							b.Fatal(err, a.Label)
						}
					}, func(i int) {
						p, q := in[i%len(in)], in[(i+1)%len(in)]
						if km, _ := sphere.Inverse(sphere.LonLat{Lon: p.Lon, Lat: p.Lat}, sphere.LonLat{Lon: q.Lon, Lat: q.Lat}); km < 0 {
							b.Fatal(km)
						}
					})
					b.ReportMetric(ns[0], "ns/answer")
					b.ReportMetric(ns[1], "ns/inverse")
					b.ReportMetric(ns[0]/ns[1], "inverses/answer")
				}
			})
		}
	}
}
