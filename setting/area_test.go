package setting_test

import (
	"context"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"nearmargin/setting"
	"nearmargin/setting/boundary"
	"nearmargin/setting/builtin"
	"nearmargin/setting/motion"
	"nearmargin/setting/sphere"
)

// octants is a model of eight plates that three great circles make.
func octants() *setting.Model {
	c := setting.Contents{ID: "octants", Edition: "1", SHA256: "none", DefaultMotion: "none"}
	name := func(north bool, quarter int) string {
		return string([]byte{map[bool]byte{true: 'N', false: 'S'}[north], "ABCD"[(quarter+4)%4]})
	}
	var entries []motion.Entry
	add := func(id string, from, to sphere.LonLat, left, right string) {
		c.Boundaries = append(c.Boundaries, must(boundary.New(boundary.Spec{
			ID: id, Name: id, Type: boundary.SpreadingRidge, Left: left, Right: right, SigmaKm: 5,
			Source: "made up", SourceStatus: boundary.FromMemory, Path: []sphere.LonLat{from, to},
		})))
	}
	for q := range 4 {
		lon := sphere.WrapLon(90 * float64(q))
		for _, north := range []bool{true, false} {
			c.Plates = append(c.Plates, setting.Plate{Code: name(north, q), Name: name(north, q)})
			entries = append(entries, motion.Entry{Plate: name(north, q), Vector: sphere.Vec{Z: float64(q) * 1e-3}, Basis: motion.Published})
		}
		corner := sphere.LonLat{Lon: lon}
		add(fmt.Sprint("equator-", q), corner, sphere.LonLat{Lon: sphere.WrapLon(lon + 90)}, name(true, q), name(false, q))
		add(fmt.Sprint("north-", q), corner, sphere.LonLat{Lat: 90}, name(true, q-1), name(true, q))
		add(fmt.Sprint("south-", q), corner, sphere.LonLat{Lat: -90}, name(false, q), name(false, q-1))
	}
	c.Motions = []*motion.Model{must(motion.NewModel(motion.Info{Name: "none"}, entries))}
	return must(setting.NewModel(c))
}

// ringAround draws a star-shaped ring of n positions, anticlockwise.
func ringAround(r *rand.Rand, c sphere.Vec, n int, rad float64) []sphere.LonLat {
	east, north := c.EastNorth()
	var ring []sphere.LonLat
	for i := range n {
		sin, cos := math.Sincos(2 * math.Pi * float64(i) / float64(n))
		d := rad * (0.5 + 0.5*r.Float64())
		ring = append(ring, c.Scale(math.Cos(d)).Add(east.Scale(math.Sin(d)*cos)).Add(north.Scale(math.Sin(d)*sin)).LonLat())
	}
	return append(ring, ring[0])
}

// underArc is the area in km² between an arc and the equator, by Snyder's (1987,
// equation 3-12) formula for zones of the ellipsoid on many small steps; positive
// where a ring that holds the arc has it on its left.
func underArc(a sphere.Arc) float64 {
	const equatorKm, flattening = 6378.137, 1 / 298.257223563
	e2 := flattening * (2 - flattening)
	e := math.Sqrt(e2)
	zone := func(s float64) float64 {
		return equatorKm * equatorKm / 2 * (1 - e2) * (s/(1-e2*s*s) - math.Log((1-e*s)/(1+e*s))/(2*e))
	}
	const steps = 60
	sum := 0.0
	for i := range steps {
		p, q, m := a.At(float64(i)/steps), a.At(float64(i+1)/steps), a.At((float64(i)+0.5)/steps)
		dLon := math.Remainder(math.Atan2(q.Y, q.X)-math.Atan2(p.Y, p.X), 2*math.Pi)
		sum -= dLon * (zone(p.Z) + 4*zone(m.Z) + zone(q.Z)) / 6
	}
	return sum
}

// areaOf answers for an area.
func areaOf(l *setting.Lookup, a *setting.Area, out *setting.AreaAnswer) {
	if err := l.Area(context.Background(), a, out); err != nil {
		panic(err) // the context does not end
	}
}

// ending is a context that ends after it has been asked a number of times.
type ending struct {
	context.Context
	left int
}

func (e *ending) Err() error {
	if e.left--; e.left < 0 {
		return context.Canceled
	}
	return nil
}

// TestAreaStops: wherever the context ends, the work stops there, and is not taken
// for an answer.
func TestAreaStops(t *testing.T) {
	m := octants()
	l := must(m.Lookup(setting.Options{}))
	a := must(setting.NewBoxArea(boundary.Box{West: -30, South: -30, East: 40, North: 30}))
	var out setting.AreaAnswer
	all := &ending{context.Background(), 1 << 30}
	if err := l.Area(all, a, &out); err != nil || len(out.Notes.All()) == 0 {
		t.Fatal(err)
	}
	asked := 1<<30 - all.left
	for _, at := range []int{0, 1, 2, asked / 2, asked - 2, asked - 1} {
		e := &ending{context.Background(), at}
		if err := l.Area(e, a, &out); err != context.Canceled || e.left < -4 {
			t.Errorf("ends at question %d of %d: %v, asked %d times more", at+1, asked, err, -e.left-1)
		}
	}
}

// exactPlates returns the area in km² of each plate within a ring that is written
// anticlockwise and holds no pole: what is bounded by the parts of the network
// inside the ring and by the parts of the ring on the plate.
func exactPlates(n *boundary.Network, p sphere.Shape, ring []sphere.LonLat) map[string]float64 {
	out := map[string]float64{}
	for x := range n.Inside(p) {
		km2 := underArc(x.Arc)
		out[x.Boundary.Left()] += km2
		out[x.Boundary.Right()] -= km2
	}
	var legs []sphere.Arc
	for _, b := range n.Boundaries() {
		path := b.Path()
		for i := 1; i < len(path); i++ {
			arc, _ := sphere.NewArc(sphere.FromLonLat(path[i-1]), sphere.FromLonLat(path[i]))
			legs = append(legs, arc)
		}
	}
	for i := 1; i < len(ring); i++ {
		edge, _ := sphere.NewArc(sphere.FromLonLat(ring[i-1]), sphere.FromLonLat(ring[i]))
		var cuts []float64
		for j := range legs {
			if q, ok := edge.Cross(&legs[j]); ok {
				cuts = append(cuts, sphere.Angle(edge.A, q))
			}
		}
		for part := range edge.Between(cuts) {
			plate, _ := n.PlateAt(part.Midpoint())
			out[plate] += underArc(*part)
		}
	}
	return out
}

// TestPlateFractionsAgainstTheExactClip: within 0.3 % of the area, and on average
// within the standard error stated.
func TestPlateFractionsAgainstTheExactClip(t *testing.T) {
	for name, m := range map[string]*setting.Model{"octants": octants(), "built-in": must(builtin.Load()).Model} {
		r := rand.New(rand.NewPCG(11, 4))
		l := must(m.Lookup(setting.Options{}))
		var worst, sumSq, sumSE float64
		count, areas := 0, 150
		if testing.Short() {
			areas = 40
		}
		for range areas {
			c := sphere.FromLonLat(sphere.LonLat{Lon: 360*r.Float64() - 180, Lat: 100*r.Float64() - 50})
			ring := ringAround(r, c, 5+r.IntN(60), 0.4*math.Pow(10, -1.5*r.Float64()))
			shape := must(sphere.NewPolygon(ring))
			exact := exactPlates(m.Network(), shape, ring)
			var out setting.AreaAnswer
			areaOf(l, must(setting.NewArea([][]sphere.LonLat{ring})), &out)
			sum := 0.0
			for _, p := range out.Plates {
				want := exact[p.Plate.Code] / out.AreaKm2
				delete(exact, p.Plate.Code)
				d := p.Fraction - want
				worst = max(worst, math.Abs(d))
				sum += p.Fraction
				if want < 0.999 {
					sumSq, sumSE, count = sumSq+d*d, sumSE+out.Sampling.PlateStandardError*out.Sampling.PlateStandardError, count+1
				}
			}
			for code, km2 := range exact {
				worst = max(worst, math.Abs(km2/out.AreaKm2))
				if math.Abs(km2/out.AreaKm2) > 2e-3 {
					t.Errorf("%s: %g of plate %s is not seen; ring %v", name, km2/out.AreaKm2, code, ring)
				}
			}
			if math.Abs(sum-1) > 1e-9 {
				t.Errorf("%s: plate fractions add up to %.12f", name, sum)
			}
		}
		rms, se := math.Sqrt(sumSq/float64(count)), math.Sqrt(sumSE/float64(count))
		t.Logf("%s: %d fractions off by %.5f rms, %.5f at most; stated %.5f", name, count, rms, worst, se)
		if count < areas/3 || worst > 0.003 || rms > se || rms < se/10 {
			t.Errorf("%s: %d fractions off by %.5f rms, %.5f at most; stated %.5f", name, count, rms, worst, se)
		}
	}
}

// TestOctantsByBox: boxes whose shares are known by symmetry.
func TestOctantsByBox(t *testing.T) {
	l := must(octants().Lookup(setting.Options{}))
	for _, c := range []struct {
		name string
		box  boundary.Box
		km2  float64
		want map[string]float64
		km   float64 // of boundaries inside
	}{
		{"one octant", boundary.Box{West: 1, South: 1, East: 89, North: 89}, 0, map[string]float64{"NA": 1}, 0},
		{"four around a corner", boundary.Box{West: -10, South: -10, East: 10, North: 10}, 0, map[string]float64{"NA": .25, "ND": .25, "SA": .25, "SD": .25}, 4435.2}, // 20° of the equator, 2226.4 km, and of the meridian, 2211.7 km less 3
		{"the Earth", boundary.Box{West: -180, South: -90, East: 180, North: 90}, 510065621.724, map[string]float64{"NA": .125, "NB": .125, "NC": .125, "ND": .125, "SA": .125, "SB": .125, "SC": .125, "SD": .125}, 3 * 40030},
		{"the Arctic", boundary.Box{West: 0, South: 66, East: 360, North: 90}, 0, map[string]float64{"NA": .25, "NB": .25, "NC": .25, "ND": .25}, 4 * 2679.5},
		{"across ±180°", boundary.Box{West: 170, South: 10, East: -160, North: 20}, 0, map[string]float64{"NB": 1. / 3, "NC": 2. / 3}, 1106.5},
	} {
		var out setting.AreaAnswer
		areaOf(l, must(setting.NewBoxArea(c.box)), &out)
		if c.km2 != 0 && math.Abs(out.AreaKm2-c.km2) > 1e-3 {
			t.Errorf("%s: %.4f km², want %.4f", c.name, out.AreaKm2, c.km2)
		}
		if len(out.Plates) != len(c.want) {
			t.Errorf("%s: %d plates, want %d", c.name, len(out.Plates), len(c.want))
		}
		for _, p := range out.Plates {
			if math.Abs(p.Fraction-c.want[p.Plate.Code]) > 0.002 {
				t.Errorf("%s: %.5f of %s, want %.5f", c.name, p.Fraction, p.Plate.Code, c.want[p.Plate.Code])
			}
		}
		km := 0.0
		for _, b := range out.Boundaries {
			km += b.LengthKm
		}
		if math.Abs(km-c.km) > 0.002*c.km {
			t.Errorf("%s: %.1f km of boundaries, want %.1f", c.name, km, c.km)
		}
		if (out.Nearest.DistanceKm == 0) != (c.km > 0) {
			t.Errorf("%s: the nearest boundary is %g km away", c.name, out.Nearest.DistanceKm)
		}
	}
}

// TestAreaPartsAddUp divides boxes in two and makes one area of both halves.
func TestAreaPartsAddUp(t *testing.T) {
	l := must(must(builtin.Load()).Model.Lookup(setting.Options{}))
	r := rand.New(rand.NewPCG(3, 9))
	for range 25 {
		c := sphere.FromLonLat(sphere.LonLat{Lon: 360*r.Float64() - 180, Lat: 120*r.Float64() - 60})
		ring := ringAround(r, c, 20, 0.05+0.2*r.Float64())
		mid := c.LonLat()
		halves := [2][]sphere.LonLat{append(slices.Clone(ring[:11]), mid, ring[0]), append(slices.Clone(ring[10:]), mid, ring[10])}
		var whole, both setting.AreaAnswer
		var part [2]setting.AreaAnswer
		areaOf(l, must(setting.NewArea([][]sphere.LonLat{ring})), &whole)
		areaOf(l, must(setting.NewArea([][]sphere.LonLat{halves[0]}, [][]sphere.LonLat{halves[1]})), &both)
		for i, h := range halves {
			areaOf(l, must(setting.NewArea([][]sphere.LonLat{h})), &part[i])
		}
		if sum := part[0].AreaKm2 + part[1].AreaKm2; math.Abs(sum-whole.AreaKm2) > 1e-6*sum || math.Abs(both.AreaKm2-sum) > 1e-9*sum {
			t.Errorf("%g and %g km² make %g, as one area %g", part[0].AreaKm2, part[1].AreaKm2, whole.AreaKm2, both.AreaKm2)
		}
		lengths := func(as ...*setting.AreaAnswer) map[string]float64 {
			out := map[string]float64{}
			for _, a := range as {
				for _, b := range a.Boundaries {
					out[b.Boundary.ID()] += b.LengthKm
				}
			}
			return out
		}
		want := lengths(&whole)
		for _, got := range []map[string]float64{lengths(&both), lengths(&part[0], &part[1])} {
			for id, km := range got {
				if math.Abs(km-want[id]) > 0.01+1e-4*km { // a geodesic's two parts are not quite its length
					t.Errorf("%s: %.4f km in the parts, %.4f in the whole", id, km, want[id])
				}
			}
			if len(got) != len(want) {
				t.Errorf("%d boundaries in the parts, %d in the whole", len(got), len(want))
			}
		}
		shares := func(as ...*setting.AreaAnswer) map[string]float64 {
			out := map[string]float64{}
			total := 0.0
			for _, a := range as {
				total += a.AreaKm2
			}
			for _, a := range as {
				for _, p := range a.Plates {
					out[p.Plate.Code] += p.Fraction * a.AreaKm2 / total
				}
				for _, s := range a.Settings {
					out[s.Label.String()+s.Family.String()] += s.Fraction * a.AreaKm2 / total
				}
			}
			return out
		}
		se := whole.Sampling.StandardError + both.Sampling.StandardError
		for what, got := range map[string]map[string]float64{"one area of both": shares(&both), "the parts": shares(&part[0], &part[1])} {
			want := shares(&whole)
			for k := range want {
				if math.Abs(got[k]-want[k]) > 4*se+0.004 {
					t.Errorf("%s: %s has %.4f, in the whole %.4f; standard error %.4f", what, k, got[k], want[k], se)
				}
			}
		}
	}
}

// TestAreaAgreesWithSites compares with the answers for many sites thrown at the
// area.
func TestAreaAgreesWithSites(t *testing.T) {
	l := must(must(builtin.Load()).Model.Lookup(setting.Options{Brief: true}))
	r := rand.New(rand.NewPCG(5, 5))
	for _, c := range []sphere.LonLat{{Lon: -71, Lat: -34}, {Lon: 140, Lat: 36}, {Lon: 179, Lat: -21}, {Lon: 78, Lat: 33}, {Lon: -14, Lat: -20}, {Lon: 40, Lat: 5}, {Lon: -98, Lat: 40}, {Lon: 25, Lat: 37}} {
		ring := ringAround(r, sphere.FromLonLat(c), 30, 0.08)
		shape := must(sphere.NewPolygon(ring))
		var out setting.AreaAnswer
		areaOf(l, must(setting.NewArea([][]sphere.LonLat{ring})), &out)
		got := map[string]float64{}
		sum := 0.0
		for _, s := range out.Settings {
			got[s.Label.String()+s.Family.String()] += s.Fraction
			sum += s.Fraction
		}
		if math.Abs(sum-1) > 1e-9 {
			t.Errorf("%v: settings add up to %.12f", c, sum)
		}
		for _, s := range out.Slabs {
			got[s.Slab.ID] += s.Fraction
			if !(s.MinDepthKm <= s.MedianDepthKm && s.MedianDepthKm <= s.MaxDepthKm) {
				t.Errorf("%v: slab %s lies at %g, %g, %g km", c, s.Slab.ID, s.MinDepthKm, s.MedianDepthKm, s.MaxDepthKm)
			}
		}
		// the same places, one by one, must have the same labels
		var a setting.Answer
		same, total := map[string]float64{}, 0.0
		for _, x := range shape.Sample(out.Sampling.Points, nil) {
			p := x.At.LonLat()
			if err := l.At(setting.SiteAt(p.Lon, p.Lat), &a); err != nil {
				t.Fatal(err)
			}
			total += x.Weight
			same[a.Label.String()+a.Family.String()] += x.Weight
			for _, s := range a.Slabs.All() {
				same[s.Slab.ID] += x.Weight
			}
		}
		for k, w := range same {
			if math.Abs(got[k]-w/total) > 1e-9 {
				t.Errorf("%v: %s has %.6f, by the same sites %.6f", c, k, got[k], w/total)
			}
		}
		const n = 4000
		want := map[string]float64{}
		depth := map[string][]float64{}
		for _, x := range shape.Sample(n, nil) {
			p := x.At.LonLat()
			if err := l.At(setting.SiteAt(p.Lon, p.Lat), &a); err != nil {
				t.Fatal(err)
			}
			want[a.Label.String()+a.Family.String()] += 1. / n
			for _, s := range a.Slabs.All() {
				want[s.Slab.ID] += 1. / n
				depth[s.Slab.ID] = append(depth[s.Slab.ID], s.DepthKm)
			}
		}
		for k := range want {
			if d := math.Abs(got[k] - want[k]); d > 3*out.Sampling.StandardError {
				t.Errorf("%v: %s has %.4f, by sites %.4f; standard error %.4f", c, k, got[k], want[k], out.Sampling.StandardError)
			}
		}
		for _, s := range out.Slabs {
			ds := depth[s.Slab.ID]
			slices.Sort(ds)
			if len(ds) > n/10 && math.Abs(s.MedianDepthKm-ds[len(ds)/2]) > 12 {
				t.Errorf("%v: slab %s has its median depth at %.1f km, by sites %.1f", c, s.Slab.ID, s.MedianDepthKm, ds[len(ds)/2])
			}
			if len(ds) > 0 && (s.MinDepthKm < ds[0]-15 || s.MaxDepthKm > ds[len(ds)-1]+15) {
				t.Errorf("%v: slab %s lies at %g to %g km, by sites %g to %g", c, s.Slab.ID, s.MinDepthKm, s.MaxDepthKm, ds[0], ds[len(ds)-1])
			}
		}
	}
}

// TestAreaNearestBoundary: outside of the area, on the shortest way.
func TestAreaNearestBoundary(t *testing.T) {
	l := must(octants().Lookup(setting.Options{}))
	for _, c := range []struct {
		name string
		ring []sphere.LonLat
		at   sphere.LonLat
		to   sphere.LonLat
	}{
		{"a position is nearest", []sphere.LonLat{{Lon: 40, Lat: 5}, {Lon: 50, Lat: 20}, {Lon: 30, Lat: 20}, {Lon: 40, Lat: 5}}, sphere.LonLat{Lon: 40, Lat: 5}, sphere.LonLat{Lon: 40, Lat: 0}},
		{"across ±180°, from the west", []sphere.LonLat{{Lon: 170, Lat: 45}, {Lon: 178, Lat: 50}, {Lon: 170, Lat: 55}, {Lon: 170, Lat: 45}}, sphere.LonLat{Lon: 178, Lat: 50}, sphere.LonLat{Lon: 180, Lat: 50}},
	} {
		var out setting.AreaAnswer
		areaOf(l, must(setting.NewArea([][]sphere.LonLat{c.ring})), &out)
		km, _ := sphere.Inverse(c.at, c.to)
		if math.Abs(out.Nearest.DistanceKm-km) > 0.01*km || len(out.Boundaries) != 0 {
			t.Errorf("%s: %.3f km, want about %.3f; %d boundaries inside", c.name, out.Nearest.DistanceKm, km, len(out.Boundaries))
		}
		if !out.Nearest.Motion.Known || math.IsNaN(out.Nearest.AzimuthDeg) {
			t.Errorf("%s: motion %+v, azimuth %g", c.name, out.Nearest.Motion, out.Nearest.AzimuthDeg)
		}
	}
}

// TestAreaMotionRange: along a meridian, around a pole of rotation at the pole,
// the rate goes with the cosine of latitude and the direction is square to it.
func TestAreaMotionRange(t *testing.T) {
	l := must(octants().Lookup(setting.Options{}))
	var out setting.AreaAnswer
	areaOf(l, must(setting.NewBoxArea(boundary.Box{West: 80, South: 20, East: 100, North: 60})), &out)
	if len(out.Boundaries) != 1 {
		t.Fatalf("%d boundaries inside, want 1", len(out.Boundaries))
	}
	m := out.Boundaries[0].Motion
	rate := func(lat float64) float64 { return 1e-3 * sphere.MeanRadiusKm * math.Cos(lat*math.Pi/180) }
	near := func(what string, got setting.Range, low, high float64) {
		t.Helper()
		if math.Abs(got.Min-low) > 1e-6 || math.Abs(got.Max-high) > 1e-6 {
			t.Errorf("%s: %g to %g, want %g to %g", what, got.Min, got.Max, low, high)
		}
	}
	if !m.Known || m.Plate != "NB" || m.RelativeTo != "NA" || m.Model != "none" {
		t.Errorf("%+v", m)
	}
	near("rate", m.RateMmYr, rate(60), rate(20))
	near("opening", m.OpeningMmYr, rate(60), rate(20))
	near("shear", m.ShearMmYr, 0, 0)
	near("azimuth", m.AzimuthDeg, 90, 90)
	near("obliquity", m.ObliquityDeg, 0, 0)
	if !math.IsNaN(m.RateSigmaMmYr.Min) || !math.IsNaN(m.RateSigmaMmYr.Max) {
		t.Errorf("σ is %v, want none", m.RateSigmaMmYr)
	}
}

func TestAreaErrors(t *testing.T) {
	square := func(w, s float64) [][]sphere.LonLat {
		return [][]sphere.LonLat{{{Lon: w, Lat: s}, {Lon: w + 2, Lat: s}, {Lon: w + 2, Lat: s + 2}, {Lon: w, Lat: s + 2}, {Lon: w, Lat: s}}}
	}
	open := square(30, 0)
	open[0] = open[0][:4]
	bow := square(30, 0)
	bow[0][1], bow[0][2] = bow[0][2], bow[0][1]
	long := make([]sphere.LonLat, setting.MaxAreaPositions+1)
	var many [][][]sphere.LonLat
	for i := range setting.MaxAreaRings + 1 {
		many = append(many, square(float64(i%100)*3, float64(i/100)*3))
	}
	for _, c := range []struct {
		name                    string
		polygons                [][][]sphere.LonLat
		fault                   setting.AreaFault
		polygon, ring, position int
		says                    string
	}{
		{"nothing", nil, setting.AreaForm, -1, -1, -1, "no polygon"},
		{"an empty polygon", [][][]sphere.LonLat{square(0, 0), nil}, setting.AreaForm, 1, -1, -1, "empty"},
		{"an open ring", [][][]sphere.LonLat{square(0, 0), open}, setting.AreaForm, 1, 0, 3, "not closed"},
		{"a bow-tie", [][][]sphere.LonLat{square(0, 0), bow}, setting.AreaGeometry, 1, 0, 2, "meets itself"},
		{"overlap", [][][]sphere.LonLat{square(0, 0), square(10, 0), square(1, 1)}, setting.AreaGeometry, 2, -1, -1, "polygon 2 overlaps polygon 0"},
		{"too many positions", [][][]sphere.LonLat{square(0, 0), {long}}, setting.AreaTooLarge, 1, 0, -1, "20000"},
		{"too many rings", many, setting.AreaTooLarge, 1000, -1, -1, "1000"},
	} {
		a, err := setting.NewArea(c.polygons...)
		var e *setting.AreaError
		if !errors.As(err, &e) {
			t.Fatalf("%s: %v, %v; want an *AreaError", c.name, a, err)
		}
		if e.Fault != c.fault || e.Polygon != c.polygon || e.Ring != c.ring || e.Position != c.position || !strings.Contains(e.Error(), c.says) {
			t.Errorf("%s: %+v", c.name, e)
		}
	}
	if _, err := setting.NewArea(many[:setting.MaxAreaRings]...); err != nil {
		t.Errorf("as many rings as the limit: %v", err)
	}
	for name, b := range map[string]boundary.Box{"south of the pole": {West: 0, South: -91, East: 1, North: 0}, "NaN": {West: math.NaN(), South: 0, East: 1, North: 1}} {
		var e *setting.AreaError
		if _, err := setting.NewBoxArea(b); !errors.As(err, &e) || e.Fault != setting.AreaForm {
			t.Errorf("%s: %v", name, err)
		}
	}
	var e *setting.AreaError
	if _, err := setting.NewBoxArea(boundary.Box{West: 1, South: 1, East: 1, North: 2}); !errors.As(err, &e) || e.Fault != setting.AreaGeometry {
		t.Errorf("no width: %v", err)
	}
}
