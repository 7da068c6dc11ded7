package sphere

import (
	"math"
	"slices"
	"testing"

	"pgregory.net/rapid"
)

// jumps reports a segment that spans more than 180° of longitude, which a reader that
// draws it on the plane takes around the wrong way.
func jumps(line []LonLat) bool {
	for i := 1; i < len(line); i++ {
		if math.Abs(line[i].Lon-line[i-1].Lon) > 180 {
			return true
		}
	}
	return false
}

// TestCutLinesDoNotJump: the parts of a path have no segment of more than 180°, and
// together they are the path with places on ±180° added.
func TestCutLinesDoNotJump(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		lon := rapid.OneOf(rapid.Float64Range(-180, 180), rapid.SampledFrom([]float64{180, 179.9999999, -179.9999999, 0, -0.5, 0.5}))
		var path []LonLat
		for range rapid.IntRange(2, 12).Draw(t, "n") {
			path = append(path, LonLat{WrapLon(lon.Draw(t, "lon")), rapid.Float64Range(-89, 89).Draw(t, "lat")})
		}
		var flat []LonLat
		for _, part := range CutAtAntimeridian(path) {
			if jumps(part) || len(part) < 2 {
				t.Fatalf("%v has the part %v", path, part)
			}
			for i := 1; i < len(part)-1; i++ {
				if a, b := part[i].Lon, part[i+1].Lon; a*b < -90*180 && math.Abs(a) < 180 && math.Abs(b) < 180 {
					t.Fatalf("%v crosses within the part %v", path, part)
				}
			}
			flat = append(flat, part...)
		}
		at := 0
		for _, p := range flat {
			if at < len(path) && (p == path[at] || path[at].Lon == 180 && p == LonLat{-180, path[at].Lat}) {
				at++
			} else if math.Abs(p.Lon) != 180 {
				t.Fatalf("%v: %v was added or moved", path, p)
			}
		}
		if at != len(path) {
			t.Fatalf("%v: only %d of its places are left in %v", path, at, flat)
		}
	})
}

// TestCutRings checks cuts that can be told by hand.
func TestCutRings(t *testing.T) {
	cap80 := []LonLat{{90, 80}, {180, 80}, {-90, 80}, {0, 80}, {90, 80}}
	for _, c := range []struct {
		name  string
		rings [][]LonLat
		want  [][][]LonLat
	}{
		{"clear of it", [][]LonLat{box(170, 0, 178, 5), box(172, 1, 174, 2)},
			[][][]LonLat{{box(170, 0, 178, 5), {{172, 1}, {172, 2}, {174, 2}, {174, 1}, {172, 1}}}}},
		{"east of it, with an edge on it", [][]LonLat{{{-170, -1}, {-170, 1}, {180, 1}, {180, -1}, {-170, -1}}},
			[][][]LonLat{{{{-170, -1}, {-170, 1}, {-180, 1}, {-180, -1}, {-170, -1}}}}},
		{"around the north pole", [][]LonLat{cap80},
			[][][]LonLat{{{{-180, 80}, {-90, 80}, {0, 80}, {90, 80}, {180, 80}, {180, 90}, {0, 90}, {-180, 90}, {-180, 80}}}}},
		{"around the south pole, clockwise", [][]LonLat{{{90, -80}, {0, -80}, {-90, -80}, {180, -80}, {90, -80}}},
			[][][]LonLat{{{{180, -80}, {90, -80}, {0, -80}, {-90, -80}, {-180, -80}, {-180, -90}, {0, -90}, {180, -90}, {180, -80}}}}},
		{"across it", [][]LonLat{{{175, 0}, {-175, 0}, {-175, 5}, {175, 5}, {175, 0}}}, nil},
		{"across it, with a hole that is across it and one that is not",
			[][]LonLat{{{170, -5}, {-170, -5}, {-170, 5}, {170, 5}, {170, -5}}, {{179, -1}, {-179, -1}, {-179, 1}, {179, 1}, {179, -1}}, box(-175, -1, -174, 1)}, nil},
		{"across it twice", [][]LonLat{{{175, 0}, {-175, 0}, {-175, 1}, {178, 1}, {178, 3}, {-175, 3}, {-175, 4}, {175, 4}, {175, 0}}}, nil},
	} {
		got := CutRingsAtAntimeridian(c.rings)
		for _, p := range got {
			for i, ring := range p {
				if jumps(ring) || ring[0] != ring[len(ring)-1] {
					t.Errorf("%s: the ring %v", c.name, ring)
				}
				if counterclockwise := slices.Equal(turned(slices.Clone(ring), true), ring); counterclockwise != (i == 0) {
					t.Errorf("%s: ring %d runs the wrong way round: %v", c.name, i, ring)
				}
			}
		}
		if c.want != nil && !slices.EqualFunc(got, c.want, func(a, b [][]LonLat) bool { return slices.EqualFunc(a, b, sameRing) }) {
			t.Errorf("%s: got %v, want %v", c.name, got, c.want)
		}
	}
	if got := CutRingsAtAntimeridian([][]LonLat{{{170, -5}, {-170, -5}, {-170, 5}, {170, 5}, {170, -5}}, {{179, -1}, {-179, -1}, {-179, 1}, {179, 1}, {179, -1}}, box(-175, -1, -174, 1)}); len(got) != 2 || len(got[0])+len(got[1]) != 3 {
		t.Errorf("a polygon whose hole cuts it in two on the edge: %v", got)
	}
	if got := CutRingsAtAntimeridian([][]LonLat{{{175, 0}, {-175, 0}, {-175, 1}, {178, 1}, {178, 3}, {-175, 3}, {-175, 4}, {175, 4}, {175, 0}}}); len(got) != 3 {
		t.Errorf("a C across the edge has one back and two arms, got %d parts: %v", len(got), got)
	}
}

// sameRing reports whether two closed rings are one, wherever they start.
func sameRing(a, b []LonLat) bool {
	if len(a) != len(b) {
		return false
	}
	n := len(a) - 1
	for s := range n {
		if slices.EqualFunc(a[:n], append(slices.Clone(b[s:n]), b[:s]...), func(p, q LonLat) bool {
			return math.Abs(p.Lon-q.Lon) < 1e-6 && math.Abs(p.Lat-q.Lat) < 1e-6
		}) {
			return true
		}
	}
	return false
}

// TestCutRingsHoldTheSamePlaces: a place is inside the cut polygons, on the plane of
// longitude and latitude, just where it is inside the region on the sphere.
func TestCutRingsHoldTheSamePlaces(t *testing.T) {
	star := func(t *rapid.T, centre Vec, least, most float64) []LonLat {
		n := rapid.IntRange(3, 9).Draw(t, "corners")
		var corners []Vec
		for i := range n {
			az := (float64(i) + rapid.Float64Range(0.1, 0.9).Draw(t, "turn")) / float64(n) * 2 * math.Pi
			e, no := centre.EastNorth()
			r := rapid.Float64Range(least, most).Draw(t, "reach")
			corners = append(corners, centre.Scale(math.Cos(r)).Add(e.Scale(math.Sin(r)*math.Sin(az))).Add(no.Scale(math.Sin(r)*math.Cos(az))).Unit())
		}
		var ring []LonLat // with short edges, so that arcs and straight lines on the plane agree
		for i := range n {
			arc, _ := NewArc(corners[i], corners[(i+1)%n])
			for k := range 400 {
				ring = append(ring, arc.At(float64(k)/400).LonLat())
			}
		}
		return append(ring, ring[0])
	}
	rapid.Check(t, func(t *rapid.T) {
		centre := FromLonLat(LonLat{rapid.Float64Range(150, 210).Draw(t, "lon"), rapid.Float64Range(-90, 90).Draw(t, "lat")})
		rings := [][]LonLat{star(t, centre, 0.2, 1.2)}
		if rapid.Bool().Draw(t, "hole") {
			rings = append(rings, star(t, centre, 0.02, 0.09))
		}
		region, err := NewRegion(rings...)
		if err != nil {
			t.Skip(err)
		}
		parts := CutRingsAtAntimeridian(rings)
		for _, p := range parts {
			for _, ring := range p {
				if jumps(ring) || ring[0] != ring[len(ring)-1] {
					t.Fatalf("a ring jumps or is open: %v", ring)
				}
			}
		}
		for range 40 {
			at := genLonLat().Draw(t, "place")
			v := FromLonLat(at)
			if slices.ContainsFunc(rings, func(r []LonLat) bool {
				return slices.ContainsFunc(r, func(p LonLat) bool { return Angle(FromLonLat(p), v) < 0.02 })
			}) || math.Abs(at.Lat) > 89 || math.Abs(at.Lon) > 179.9 { // on an edge or on the cut
				continue
			}
			in := 0
			for _, p := range parts {
				if around(p[0], at) && !slices.ContainsFunc(p[1:], func(h []LonLat) bool { return around(h, at) }) {
					in++
				}
			}
			if want := region.Contains(v); in > 1 || want != (in == 1) {
				t.Fatalf("%v is inside %d parts; inside the region: %v", at, in, want)
			}
		}
	})
}
