package builtin

import (
	"context"
	"math"
	"testing"

	"nearmargin/setting"
	"nearmargin/setting/sphere"
)

// basin is a ring of n+1 positions around a middle: a wavy outline of about the
// area given.
func basin(n int, lon, lat, km2 float64) []sphere.LonLat {
	radius := math.Sqrt(km2/math.Pi) / 111.2
	var ring []sphere.LonLat
	for i := range n {
		t := 2 * math.Pi * float64(i) / float64(n)
		r := radius * (1 + 0.15*math.Sin(5*t) + 0.02*math.Sin(61*t))
		sin, cos := math.Sincos(t)
		ring = append(ring, sphere.LonLat{Lon: lon + r*cos/math.Cos(lat*math.Pi/180), Lat: lat + r*sin})
	}
	return append(ring, ring[0])
}

func BenchmarkArea(b *testing.B) {
	m, err := Load()
	if err != nil {
		b.Fatal(err)
	}
	l, err := m.Model.Lookup(setting.Options{})
	if err != nil {
		b.Fatal(err)
	}
	for _, c := range []struct {
		name          string
		n             int
		lon, lat, km2 float64
	}{
		{"interior", 1000, -98, 40, 5e5},
		{"ridge", 1000, -14, -20, 5e5},
		{"arc", 1000, -72, -34, 5e5},
		{"back-arc", 1000, 178, -22, 5e5},
		{"continent", 1000, 80, 50, 3e7},
		{"most positions", 19999, -72, -34, 5e5},
	} {
		b.Run(c.name, func(b *testing.B) {
			ring := basin(c.n, c.lon, c.lat, c.km2)
			var out setting.AreaAnswer
			for b.Loop() {
				a, err := setting.NewArea([][]sphere.LonLat{ring})
				if err != nil {
					b.Fatal(err)
				}
				if err := l.Area(context.Background(), a, &out); err != nil {
					b.Fatal(err)
				}
			}
			if out.AreaKm2 < 0.9*c.km2 || out.AreaKm2 > 1.1*c.km2 || len(out.Plates) == 0 {
				b.Fatalf("%g km² on %d plates", out.AreaKm2, len(out.Plates))
			}
		})
	}
}
