package sphere

import (
	"errors"
	"math"
	"strings"
	"testing"
)

func TestPolygonRefusals(t *testing.T) {
	square := closed(places(0, 0, 10, 0, 10, 10, 0, 10))
	for _, c := range []struct {
		name           string
		rings          [][]LonLat
		ring, position int
		form           bool
		says           string
	}{
		{"no rings", nil, 0, -1, true, "needs an outer ring"},
		{"an empty ring", [][]LonLat{{}}, 0, -1, true, "has 0 positions"},
		{"three positions", [][]LonLat{places(0, 0, 1, 1, 0, 0)}, 0, -1, true, "at least 4"},
		{"not closed", [][]LonLat{places(0, 0, 1, 0, 1, 1, 0, 1)}, 0, 3, true, "must end where it starts, at 0, 0"},
		{"latitude 100", [][]LonLat{closed(places(0, 0, 1, 0, 1, 100))}, 0, 2, true, "-90 to 90"},
		{"longitude 400", [][]LonLat{closed(places(0, 0, 400, 0, 1, 1))}, 0, 1, true, "-180 to 360"},
		{"latitude NaN", [][]LonLat{closed(places(0, 0, 1, math.NaN(), 1, 1))}, 0, 1, true, "-90 to 90"},
		{"one place", [][]LonLat{places(3, 3, 3, 3, 3, 3, 3, 3)}, 0, -1, false, "1 distinct"},
		{"two places", [][]LonLat{places(0, 0, 3, 3, 0, 0, 3, 3, 0, 0)}, 0, -1, false, "one line"},
		{"there and back", [][]LonLat{closed(places(0, 0, 3, 0, 7, 0, 5, 0))}, 0, -1, false, "one line"},
		{"one position six times around", [][]LonLat{places(0, 90, 60, 90, 120, 90, 180, 90, 0, 90)}, 0, -1, false, "1 distinct"},
		{"smaller than a square metre", [][]LonLat{closed(places(0, 0, 1e-6, 0, 1e-6, 1e-6, 0, 1e-6))}, 0, -1, false, "less than 1 m²"},
		{"a bow-tie", [][]LonLat{closed(places(0, 0, 1, 1, 0, 1, 1, 0))}, 0, 2, false, "from position 0 to 1, near 0.5, 0.5"},
		{"a spike", [][]LonLat{closed(places(0, 0, 10, 0, 10, 10, 20, 10, 10, 10, 0, 10))}, 0, 4, false, "meets itself"},
		{"a position on an edge", [][]LonLat{closed(places(0, 0, 10, 0, 10, 10, 5, 0, 0, 10))}, 0, 3, false, "meets itself"},
		{"through a position twice", [][]LonLat{closed(places(0, 0, 1, 1, 2, 0, 2, 2, 1, 1, 0, 2))}, 0, 4, false, "meets itself"},
		{"crosses itself on ±180°", [][]LonLat{closed(places(179, 0, -179, 1, 179, 1, -179, 0))}, 0, 2, false, "meets itself"},
		{"the equator", [][]LonLat{closed(places(0, 0, 90, 0, 180, 0, -90, 0))}, 0, -1, false, "hemisphere"},
		{"around the Earth in zigzag", [][]LonLat{closed(places(0, 30, 60, -30, 120, 30, 180, -30, -120, 30, -60, -30))}, 0, -1, false, "hemisphere"},
		{"antipodes", [][]LonLat{closed(places(0, 0, 180, 0, 90, 45))}, 0, -1, false, "hemisphere"},
		{"a hole outside", [][]LonLat{square, closed(places(20, 2, 24, 2, 24, 4))}, 1, 0, false, "outside"},
		{"a hole on the other side of the Earth", [][]LonLat{square, closed(places(180, 2, -175, 2, -175, 4))}, 1, 0, false, "outside"},
		{"a hole that crosses the ring", [][]LonLat{square, closed(places(5, 5, 15, 5, 15, 6))}, 1, 2, false, "crosses"},
		{"a hole that holds the ring", [][]LonLat{square, closed(places(-5, -5, 15, -5, 15, 15, -5, 15))}, 1, 0, false, "outside"},
		{"a hole that crosses itself", [][]LonLat{square, closed(places(2, 2, 3, 3, 2, 3, 3, 2))}, 1, 2, false, "meets itself"},
		{"two holes that cross", [][]LonLat{square, closed(places(2, 2, 4, 2, 4, 4, 2, 4)), closed(places(3, 3, 5, 3, 5, 5, 3, 5))}, 2, 3, false, "crosses"},
		{"a hole in a hole", [][]LonLat{square, closed(places(2, 2, 8, 2, 8, 8, 2, 8)), closed(places(4, 4, 5, 4, 5, 5))}, 2, 0, false, "overlaps"},
		{"a hole twice", [][]LonLat{square, closed(places(2, 2, 8, 2, 8, 8)), closed(places(2, 2, 8, 2, 8, 8))}, 1, 0, false, "overlaps"},
		{"nothing left", [][]LonLat{square, square}, 0, -1, false, "no area"},
		{"a hole of three positions", [][]LonLat{square, places(2, 2, 3, 3, 2, 2)}, 1, -1, true, "at least 4"},
		{"a hole that is not closed", [][]LonLat{square, places(2, 2, 3, 2, 3, 3, 2, 3)}, 1, 3, true, "not closed"},
	} {
		t.Run(c.name, func(t *testing.T) {
			p, err := NewPolygon(c.rings...)
			var e *RingError
			if !errors.As(err, &e) {
				t.Fatalf("%v, %v; want a *RingError", p, err)
			}
			if e.Ring != c.ring || e.Position != c.position || e.Form != c.form || !strings.Contains(e.Detail, c.says) {
				t.Errorf("ring %d, position %d, form %v: %s\nwant %d, %d, %v, with %q", e.Ring, e.Position, e.Form, e.Detail, c.ring, c.position, c.form, c.says)
			}
		})
	}
}

func TestPolygonsThatAreTaken(t *testing.T) {
	for _, c := range []struct {
		name    string
		ring    []LonLat
		in, out LonLat
	}{
		{"a square metre and more", closed(places(0, 0, 2e-5, 0, 2e-5, 2e-5, 0, 2e-5)), LonLat{1e-5, 1e-5}, LonLat{3e-5, 1e-5}},
		{"closed by the other name of ±180°", places(180, 0, -170, 0, -170, 10, -180, 0), LonLat{-172, 2}, LonLat{170, 2}},
		{"closed by another longitude of the pole", places(0, 90, 10, 60, 60, 60, 45, 90), LonLat{30, 80}, LonLat{90, 80}},
		{"longitudes beyond 180", closed(places(170, 0, 190, 0, 190, 10, 170, 10)), LonLat{-175, 5}, LonLat{165, 5}},
		{"a cap of 80°", closed(places(0, 12, 60, 10, 120, 10, 180, 10, 240, 10, 300, 10)), LonLat{77, 89}, LonLat{77, -5}},
		{"an edge of 170°", closed(places(0, 1, 170, 2, 85, 60)), LonLat{85, 40}, LonLat{85, 10}},
		{"uneven positions around a pole", closed(places(0, 5, 1, 5, 2, 5, 3, 5, 4, 5, 120, 5, 240, 5)), LonLat{10, 85}, LonLat{10, -5}},
		{"doubled positions", places(0, 0, 0, 0, 10, 0, 10, 0, 10, 10, 0, 0, 0, 0), LonLat{8, 2}, LonLat{2, 8}},
	} {
		t.Run(c.name, func(t *testing.T) {
			p := mustPolygon(t, c.ring)
			if !p.Contains(FromLonLat(c.in)) || p.Contains(FromLonLat(c.out)) {
				t.Errorf("%v inside: %v; %v inside: %v", c.in, p.Contains(FromLonLat(c.in)), c.out, p.Contains(FromLonLat(c.out)))
			}
		})
	}
}

func TestOverlaps(t *testing.T) {
	a := closed(places(0, 0, 10, 0, 10, 10, 0, 10))
	for _, c := range []struct {
		name string
		b    [][]LonLat
		want bool
	}{
		{"the same", [][]LonLat{a}, true},
		{"within", [][]LonLat{closed(places(2, 2, 3, 2, 3, 3))}, true},
		{"around", [][]LonLat{closed(places(-5, -5, 15, -5, 15, 15, -5, 15))}, true},
		{"across", [][]LonLat{closed(places(-5, 4, 15, 4, 15, 6, -5, 6))}, true},
		{"over half, along the equator", [][]LonLat{closed(places(5, 0, 15, 0, 15, 10, 5, 10))}, true},
		{"beside, with an edge in common", [][]LonLat{closed(places(10, 0, 20, 0, 20, 10, 10, 10))}, false},
		{"beside, with a part of an edge in common", [][]LonLat{closed(places(10, 2, 20, 2, 20, 12, 10, 12))}, false},
		{"with a corner in common", [][]LonLat{closed(places(10, 10, 20, 10, 20, 20))}, false},
		{"far away", [][]LonLat{closed(places(100, 0, 110, 0, 110, 10))}, false},
		{"in the hole", [][]LonLat{closed(places(-5, -5, 15, -5, 15, 15, -5, 15)), a}, false},
	} {
		p, q := mustPolygon(t, a), mustPolygon(t, c.b...)
		_, pq := p.Overlaps(q)
		_, qp := q.Overlaps(p)
		if pq != c.want || qp != c.want {
			t.Errorf("%s: %v and %v, want %v", c.name, pq, qp, c.want)
		}
	}
}
