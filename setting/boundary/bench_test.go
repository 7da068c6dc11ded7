package boundary

import (
	"fmt"
	"math"
	"testing"
	"unsafe"

	"github.com/golang/geo/s2"

	"nearmargin/setting/sphere"
	"nearmargin/testdata/bench/rounds"
)

// BenchmarkNearest measures the search on a network of about 5,800 legs: whole
// answers (plate, side and near ties on the ellipsoid), the search on the sphere
// alone, and S2's closest edge, which is what the search on the sphere is to be
// compared with. S2's points are made beforehand.
func BenchmarkNearest(b *testing.B) {
	r := seeded(b)
	n := mustNetwork(b, synthetic(r, 467))
	if legs := n.NumLegs(); legs < 5700 || legs > 5900 {
		b.Fatalf("%d legs", legs)
	}
	x := newS2Index(n)
	const count = 4096
	kinds := []struct {
		name string
		draw func() sphere.Vec
	}{
		{"sphere", func() sphere.Vec { return anyVec(r) }},
		{"within300km", func() sphere.Vec {
			l := &n.legs[r.IntN(len(n.legs))]
			v := l.arc.At(r.Float64())
			rad := sphere.KmToRad(300) * math.Sqrt(r.Float64())
			return v.Scale(math.Cos(rad)).Add(v.Cross(anyVec(r)).Unit().Scale(math.Sin(rad)))
		}},
	}
	for _, kind := range kinds {
		var places [count]Place
		var points [count]s2.Point
		var want [count]float64 // radians
		for i := range places {
			places[i] = PlaceAt(kind.draw().LonLat())
			points[i] = s2Point(places[i].LonLat)
			f, _ := n.nearest(n.all, places[i].Vec, filter{}, reachOf(maxChordSq))
			want[i] = sphere.Angle(places[i].Vec, n.legs[f.leg].foot(places[i].Vec, f.where))
		}
		b.Run("Locate/"+kind.name, func(b *testing.B) {
			b.ReportAllocs()
			i := 0
			for b.Loop() {
				_, h := n.Locate(places[i%count])
				// 0.56 % for the ellipsoid
				if s := sphere.RadToKm(want[i%count]); math.Abs(h.DistanceKm-s) > 0.006*s+1e-6 {
					b.Fatalf("%g km, on the sphere %g", h.DistanceKm, s)
				}
				i++
			}
		})
		b.Run("search/"+kind.name, func(b *testing.B) {
			b.ReportAllocs()
			i := 0
			for b.Loop() {
				f, _ := n.nearest(n.all, places[i%count].Vec, filter{}, reachOf(maxChordSq))
				if got := 2 * math.Asin(math.Sqrt(f.chordSq)/2); math.Abs(got-want[i%count]) > mmRad {
					b.Fatalf("%g rad, want %g", got, want[i%count])
				}
				i++
			}
		})
		b.Run("S2/"+kind.name, func(b *testing.B) {
			b.ReportAllocs()
			i := 0
			for b.Loop() {
				got := x.query.Distance(s2.NewMinDistanceToPointTarget(points[i%count])).Angle().Radians()
				if math.Abs(got-want[i%count]) > 1e-7 { // 0.6 m: S2 works with squared chords
					b.Fatalf("%g rad, want %g", got, want[i%count])
				}
				i++
			}
		})
	}
}

// BenchmarkNearestOf measures the search for one type within 1,000 km.
func BenchmarkNearestOf(b *testing.B) {
	r := seeded(b)
	n := mustNetwork(b, synthetic(r, 467))
	var places [4096]Place
	for i := range places {
		places[i] = PlaceAt(anyVec(r).LonLat())
	}
	b.ReportAllocs()
	i, found := 0, 0
	for b.Loop() {
		h, ok := n.NearestOf(places[i%len(places)], AllTypes[i%len(AllTypes)], "", AnyRole, 1000)
		if ok {
			found++
			if h.DistanceKm > 1000 || h.Boundary.Type() != AllTypes[i%len(AllTypes)] {
				b.Fatalf("%v at %g km", h.Boundary.Type(), h.DistanceKm)
			}
		}
		i++
	}
	if i > 10000 && found < i/100 {
		b.Fatalf("found %d of %d", found, i)
	}
}

// BenchmarkNewNetwork measures how long a network of about 5,800 legs takes to
// build and to check.
func BenchmarkNewNetwork(b *testing.B) {
	specs := synthetic(seeded(b), 467)
	for b.Loop() {
		if n := mustNetwork(b, specs); len(n.Faults()) != 0 {
			b.Fatal("faults")
		}
	}
}

// boxChordSq returns a bound from below on the squared chord from p to anything in a
// box of longitude and latitude.
func boxChordSq(p sphere.LonLat, low, high [2]float64) float64 {
	sin, cos := math.Sincos(p.Lat * math.Pi / 180)
	if p.Lon >= low[0] && p.Lon <= high[0] {
		d := 2 * math.Sin(max(0, low[1]-p.Lat, p.Lat-high[1])*math.Pi/360)
		return d * d
	}
	best := 4.0
	for _, lon := range [...]float64{low[0], high[0]} {
		c := math.Cos((lon - p.Lon) * math.Pi / 180)
		lat := min(max(math.Atan2(sin, cos*c)*180/math.Pi, low[1]), high[1])
		if math.Atan2(sin, cos*c) > math.Pi/2 || c < 0 { // the meridian's far half: an end is nearest
			lat = low[1]
			if p.Lat > -low[1] || p.Lat > 0 && high[1] > 0 {
				lat = high[1]
			}
		}
		s, k := math.Sincos(lat * math.Pi / 180)
		best = min(best, 2-2*(sin*s+cos*k*c))
	}
	return best * (1 - 1e-9)
}

// BenchmarkNearestRatio gives how many times S2's closest-edge query, and one on the
// boxes of tidwall/rtree alone, take of the search on the sphere, measured in turn, on
// networks of about 5,800 and 58,000 legs.
func BenchmarkNearestRatio(b *testing.B) {
	for _, perEdge := range []int{467, 4670} {
		r := seeded(b)
		n := mustNetwork(b, synthetic(r, perEdge))
		x := newS2Index(n)
		for _, near := range []bool{false, true} {
			b.Run(fmt.Sprintf("legs=%d/near=%t", n.NumLegs(), near), func(b *testing.B) {
				var places [4096]Place
				var points [len(places)]s2.Point
				var want [len(places)]float64
				for i := range places {
					v := anyVec(r)
					if near {
						v = n.legs[r.IntN(len(n.legs))].arc.At(r.Float64())
						rad := sphere.KmToRad(300) * math.Sqrt(r.Float64())
						v = v.Scale(math.Cos(rad)).Add(v.Cross(anyVec(r)).Unit().Scale(math.Sin(rad)))
					}
					places[i] = PlaceAt(v.LonLat())
					points[i] = s2Point(places[i].LonLat)
					want[i] = x.query.Distance(s2.NewMinDistanceToPointTarget(points[i])).Angle().Radians()
				}
				check := func(i int, got float64) {
					if math.Abs(got-want[i%len(want)]) > 1e-7 { // 0.6 m: S2 works with squared chords
						b.Fatalf("%g rad, want %g", got, want[i%len(want)])
					}
				}
				for b.Loop() {
					ns := rounds.Medians(101, rounds.Slice, func(i int) {
						f, _ := n.nearest(n.all, places[i%len(places)].Vec, filter{}, reachOf(maxChordSq))
						check(i, chordAngle(f.chordSq))
					}, func(i int) {
						check(i, x.query.Distance(s2.NewMinDistanceToPointTarget(points[i%len(points)])).Angle().Radians())
					}, func(i int) {
						p := &places[i%len(places)]
						n.boxes.Nearby(func(low, high [2]float64, leg int32, item bool) float64 {
							if item {
								d, _ := n.legs[leg].chordSq(p.Vec)
								return d
							}
							return boxChordSq(p.LonLat, low, high)
						}, func(_, _ [2]float64, _ int32, chordSq float64) bool {
							check(i, chordAngle(chordSq))
							return false
						})
					})
					b.ReportMetric(ns[2]/ns[0], "rtree/search")
					b.ReportMetric(ns[0], "ns/search")
					b.ReportMetric(ns[1], "ns/S2")
					b.ReportMetric(ns[1]/ns[0], "S2/search")
				}
			})
		}
	}
}

// BenchmarkIndexRatio gives how the building of the index for all legs compares
// with that of S2's, in turn, and how many bytes a leg it takes: trees, cells and
// the legs themselves.
func BenchmarkIndexRatio(b *testing.B) {
	for _, perEdge := range []int{467, 4670} {
		n := mustNetwork(b, synthetic(seeded(b), perEdge))
		b.Run(fmt.Sprintf("legs=%d", n.NumLegs()), func(b *testing.B) {
			every := make([]int32, len(n.legs))
			for i := range every {
				every[i] = int32(i)
			}
			size := int(unsafe.Sizeof(leg{})+unsafe.Sizeof(capsule{})) * len(n.legs)
			for _, t := range append(n.byType[:], n.all) {
				size += int(unsafe.Sizeof(branch{})) * cap(t.branches)
			}
			c := n.all.cells
			size += int(unsafe.Sizeof(point32{}))*len(c.centres) + 4*len(c.starts) + int(unsafe.Sizeof(cellEntry{}))*len(c.entries)
			for b.Loop() {
				ns := rounds.Medians(11, rounds.Slice, func(int) {
					t := newTree(n.legs, every)
					if t.cells = n.newCells(t, t.runs()); len(t.cells.entries) == 0 {
						b.Fatal("no entries")
					}
				}, func(int) {
					if newS2Index(n) == nil {
						b.Fatal("no index")
					}
				})
				b.ReportMetric(ns[0]/1e6, "ms/index")
				b.ReportMetric(ns[1]/1e6, "ms/S2index")
				b.ReportMetric(ns[0]/ns[1], "index/S2index")
				b.ReportMetric(float64(size)/float64(len(n.legs)), "B/leg")
			}
		})
	}
}
