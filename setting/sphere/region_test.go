package sphere

import (
	"math"
	"strings"
	"testing"

	"pgregory.net/rapid"
)

func box(w, s, e, n float64) []LonLat {
	return []LonLat{{w, s}, {e, s}, {e, n}, {w, n}, {w, s}}
}

func reversed(r []LonLat) []LonLat {
	out := make([]LonLat, len(r))
	for i, p := range r {
		out[len(r)-1-i] = p
	}
	return out
}

func TestRegionContains(t *testing.T) {
	polar := []LonLat{{0, 70}, {72, 70}, {144, 70}, {-144, 70}, {-72, 70}, {0, 70}}
	south := []LonLat{{0, -60}, {90, -60}, {180, -60}, {-90, -60}, {0, -60}}
	tests := []struct {
		name  string
		rings [][]LonLat
		in    []LonLat
		out   []LonLat
	}{
		{
			"a square", [][]LonLat{box(-10, -10, 10, 10)},
			[]LonLat{{0, 0}, {9.9, 0}, {-9.9, -9.9}, {0, 10.1}}, // the top edge, a great circle, bulges north
			[]LonLat{{10.1, 0}, {0, 10.3}, {20, 20}, {180, 0}, {179, 1}, {0, 90}},
		},
		{
			"over the antimeridian", [][]LonLat{box(170, -5, -170, 5)},
			[]LonLat{{180, 0}, {-180, 0}, {171, 4}, {-171, -4}, {189, 0}},
			[]LonLat{{169, 0}, {-169, 0}, {0, 0}, {0, 4}},
		},
		{
			"over the antimeridian, east of 180 written as such", [][]LonLat{box(170, -5, 190, 5)},
			[]LonLat{{180, 0}, {-171, -4}},
			[]LonLat{{169, 0}, {-169, 0}, {0, 0}},
		},
		{
			"around the North Pole", [][]LonLat{polar},
			[]LonLat{{0, 90}, {123, 90}, {10, 80}, {-170, 75}, {0, 70.1}},
			[]LonLat{{0, 69.9}, {0, -90}, {180, -80}, {36, 60}},
		},
		{
			"around the South Pole", [][]LonLat{south},
			[]LonLat{{0, -90}, {45, -75}, {-135, -80}},
			[]LonLat{{45, -61}, {0, 90}, {0, -59}},
		},
		{
			"with a hole", [][]LonLat{box(-10, -10, 10, 10), box(-5, -5, 5, 5)},
			[]LonLat{{7, 0}, {0, 7}, {-9, -9}},
			[]LonLat{{0, 0}, {4, -4}, {11, 0}, {180, 0}},
		},
		{
			"with a hole around the Pole", [][]LonLat{polar, {{0, 85}, {120, 85}, {-120, 85}, {0, 85}}},
			[]LonLat{{0, 75}, {180, 80}, {90, 80}},
			[]LonLat{{0, 90}, {60, 89}, {0, -80}},
		},
		{
			"two holes", [][]LonLat{box(0, 0, 30, 10), box(2, 2, 8, 8), box(20, 2, 28, 8)},
			[]LonLat{{15, 5}, {1, 1}, {29, 5}},
			[]LonLat{{5, 5}, {24, 5}},
		},
		{
			"concave", [][]LonLat{{{0, 0}, {20, 0}, {20, 20}, {10, 5}, {0, 20}, {0, 0}}},
			[]LonLat{{10, 4}, {2, 12}, {18, 12}},
			[]LonLat{{10, 6}, {10, 15}},
		},
		{
			"a position twice", [][]LonLat{{{0, 0}, {10, 0}, {10, 0}, {10, 10}, {0, 10}, {0, 0}}},
			[]LonLat{{5, 5}},
			[]LonLat{{11, 5}, {5, -1}},
		},
	}
	for _, tt := range tests {
		for _, way := range []string{"as written", "the other way round"} {
			t.Run(tt.name+", "+way, func(t *testing.T) {
				rings := tt.rings
				if way != "as written" {
					rings = nil
					for _, r := range tt.rings {
						rings = append(rings, reversed(r))
					}
				}
				g, err := NewRegion(rings...)
				if err != nil {
					t.Fatal(err)
				}
				for _, p := range tt.in {
					if !g.Contains(FromLonLat(p)) {
						t.Errorf("%v counts as outside", p)
					}
				}
				for _, p := range tt.out {
					if g.Contains(FromLonLat(p)) {
						t.Errorf("%v counts as inside", p)
					}
				}
			})
		}
	}
}

func TestNewRegionErrors(t *testing.T) {
	belt := []LonLat{{0, 0}, {120, 0}, {-120, 0}, {0, 0}}
	tests := []struct {
		name  string
		rings [][]LonLat
		want  string
	}{
		{"no ring", nil, "needs a ring"},
		{"too short", [][]LonLat{{{0, 0}, {1, 1}, {0, 0}}}, "ring 1 has 3 positions"},
		{"open", [][]LonLat{{{0, 0}, {1, 0}, {1, 1}, {0, 1}}}, "ring 1 is not closed: it starts at 0, 0 and ends at 0, 1"},
		{"hole open", [][]LonLat{box(0, 0, 9, 9), {{1, 1}, {2, 1}, {2, 2}, {1, 2}}}, "ring 2 is not closed"},
		{"around the whole Earth", [][]LonLat{belt}, "hemisphere"},
		{"latitude", [][]LonLat{{{0, 0}, {1, 0}, {1, 91}, {0, 0}}}, "ring 1, position 3 (1, 91)"},
		{"not a number", [][]LonLat{{{0, 0}, {1, 0}, {math.NaN(), 1}, {0, 0}}}, "ring 1, position 3 (NaN, 1)"},
		{"infinite", [][]LonLat{{{0, 0}, {math.Inf(1), 0}, {1, 1}, {0, 0}}}, "ring 1, position 2"},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			g, err := NewRegion(tt.rings...)
			if err == nil || !strings.Contains(err.Error(), tt.want) {
				t.Fatalf("error %v, want one with %q", err, tt.want)
			}
			if g != nil {
				t.Error("a region comes with the error")
			}
		})
	}
}

// TestRegionAgainstHalfSpaces builds convex regions, whose inside is also the
// side of every edge's great circle on which the middle lies.
func TestRegionAgainstHalfSpaces(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		centre := genVec().Draw(t, "centre")
		radius := rapid.Float64Range(0.01, 1.4).Draw(t, "radius")
		n := rapid.IntRange(3, 12).Draw(t, "corners")
		east, north := centre.EastNorth()
		var ring []LonLat
		var corners []Vec
		for i := range n {
			sin, cos := math.Sincos(2 * math.Pi * float64(i) / float64(n))
			v := centre.Scale(math.Cos(radius)).Add(east.Scale(math.Sin(radius) * sin)).Add(north.Scale(math.Sin(radius) * cos))
			ring = append(ring, v.LonLat())
			corners = append(corners, FromLonLat(v.LonLat()))
		}
		g, err := NewRegion(append(ring, ring[0]))
		if err != nil {
			t.Fatal(err)
		}
		p := genVec().Draw(t, "p")
		if rapid.Bool().Draw(t, "close by") {
			p = centre.Add(p.Scale(rapid.Float64Range(0, 2).Draw(t, "off") * math.Tan(radius/2))).Unit()
		}
		inside, margin := true, 1.0
		for i := range corners {
			s, _ := NewArc(corners[i], corners[(i+1)%n])
			h := s.Side(p) * math.Copysign(1, s.Side(centre))
			inside = inside && h > 0
			margin = min(margin, math.Abs(h))
		}
		if margin > 1e-9 && g.Contains(p) != inside {
			t.Fatalf("Contains = %v, by half spaces %v (%g from an edge)", !inside, inside, margin)
		}
		if inside && margin > 1e-9 && g.Contains(p.Scale(-1)) {
			t.Fatal("the antipode of a place inside counts as inside")
		}
	})
}
