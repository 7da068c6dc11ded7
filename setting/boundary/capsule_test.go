package boundary

import (
	"math"
	"testing"

	"pgregory.net/rapid"

	"nearmargin/setting/sphere"
)

// vec draws a unit vector.
func vec(t *rapid.T, label string) sphere.Vec {
	return sphere.FromLonLat(sphere.LonLat{Lon: rapid.Float64Range(-180, 180).Draw(t, label+" lon"), Lat: rapid.Float64Range(-90, 90).Draw(t, label+" lat")})
}

// TestCapsuleIsNoFartherThanItsArc: what is left out by a capsule must be out of reach.
func TestCapsuleIsNoFartherThanItsArc(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		a := vec(t, "a")
		b := vec(t, "b")
		if rapid.Bool().Draw(t, "short") {
			b = a.Add(b.Scale(math.Pow(10, -rapid.Float64Range(0, 8).Draw(t, "length")))).Unit()
		}
		arc, ok := sphere.NewArc(a, b)
		if !ok {
			t.Skip("no arc")
		}
		l := newLeg(arc)
		p := vec(t, "p")
		if rapid.Bool().Draw(t, "near") {
			p = arc.At(rapid.Float64Range(0, 1).Draw(t, "along")).Add(p.Scale(math.Pow(10, -rapid.Float64Range(0, 9).Draw(t, "off")))).Unit()
		}
		r := rodOfArc(&arc)
		c, q := newCapsule(r.a, r.b, r.w), round32(p)
		d, _ := l.chordSq(p)
		if within := reachOf(d); c.beyond(c.axisSq(&q), within.chord) {
			t.Fatalf("the arc is %g away, its capsule more: axis %g, w %g", math.Sqrt(d), math.Sqrt(float64(c.axisSq(&q))), c.w)
		}
	})
}

// TestBranchesHoldTheirLegs goes down every tree of a network.
func TestBranchesHoldTheirLegs(t *testing.T) {
	n := mustNetwork(t, synthetic(seeded(t), 40))
	trees := []*tree{n.all}
	for i := range n.byType {
		trees = append(trees, n.byType[i])
	}
	for _, p := range n.byPlate {
		trees = append(trees, p[:]...)
	}
	legs := 0
	var below func(tr *tree, at int32, over []capsule)
	below = func(tr *tree, at int32, over []capsule) {
		b := &tr.branches[at]
		over = append(over, b.capsule)
		if b.legs == 0 {
			below(tr, b.at, over)
			below(tr, b.at+1, over)
			return
		}
		for i := b.at; i < b.at+b.legs; i++ {
			legs++
			for k := range 9 {
				q := round32(n.legs[i].arc.At(float64(k) / 8))
				for j := range over {
					if c := &over[j]; c.beyond(c.axisSq(&q), 0) {
						t.Fatalf("leg %d sticks out of the branch %d levels up, by %g of %g", i, len(over)-1-j, math.Sqrt(float64(c.axisSq(&q)))-float64(c.w), c.w)
					}
				}
			}
		}
	}
	for _, tr := range trees {
		if len(tr.branches) > 0 {
			below(tr, 0, nil)
		}
	}
	if want := 4 * n.NumLegs(); legs != want { // in the whole, by type, and of either plate
		t.Errorf("%d legs in the trees, want %d", legs, want)
	}
}

// TestBesidesOnlyWhatDoesNotCross compares with arcs that cross a great circle.
func TestBesidesOnlyWhatDoesNotCross(t *testing.T) {
	crossed := 0
	rapid.Check(t, func(t *rapid.T) {
		arc, ok := sphere.NewArc(vec(t, "a"), vec(t, "b"))
		if !ok {
			t.Skip("no arc")
		}
		n := vec(t, "n")
		r := rodOfArc(&arc)
		c, plane := newCapsule(r.a, r.b, r.w), round32(n)
		if n.Dot(arc.A)*n.Dot(arc.B) <= 0 {
			if crossed++; c.besides(&plane) {
				t.Fatal("the arc crosses the plane, its capsule does not")
			}
		}
	})
	if crossed == 0 {
		t.Error("no arc crossed")
	}
}
