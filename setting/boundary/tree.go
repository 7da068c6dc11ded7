package boundary

import (
	"cmp"
	"math"
	"slices"

	"nearmargin/setting/sphere"
)

// tree is a flat bounding-volume tree over legs: every branch holds a spherical
// cap around what lies below it. Its children follow it in the array, the left
// one at once, the right one at skip.
//
// The bounds are caps rather than boxes in longitude and latitude because a cap
// has no seam at ±180° and no singular poles, and its lower bound on distance is
// one dot product.
type tree struct {
	branches []branch
	order    []int32 // leg numbers in the order of the leaves
	cells    *cells  // nil on a tree that has none
}

type branch struct {
	centre     sphere.Vec
	cosR, sinR float64 // of the cap's angular radius
	plates     uint64  // that bound the legs below, see plateBit
	over, sink uint64  // of them, those at trenches whose other plate goes down, and that go down
	right      int32   // index of the right child; 0 in a leaf
	from, to   int32   // of a leaf: its part of order
}

// leafLegs is the number of legs below which a branch is not split further; 4
// was the fastest of 2, 4, 8 and 16 in BenchmarkNearest.
const leafLegs = 4

// newTree builds the tree over the legs whose numbers are given.
func newTree(legs []leg, which []int32) *tree {
	t := &tree{order: slices.Clone(which)}
	if len(which) > 0 {
		middles := make([]sphere.Vec, len(legs))
		for _, i := range which {
			middles[i] = legs[i].arc.Midpoint()
		}
		t.branches = make([]branch, 0, 2*len(which)/(leafLegs/2))
		t.build(legs, middles, 0, len(which))
		t.branches = slices.Clip(t.branches)
	}
	return t
}

func (t *tree) build(legs []leg, middles []sphere.Vec, from, to int) {
	part := t.order[from:to]
	at := len(t.branches)
	t.branches = append(t.branches, capOver(legs, part))
	for _, i := range part {
		b, l := &t.branches[at], &legs[i]
		b.plates |= plateBit(l.left) | plateBit(l.right)
		switch l.sinks {
		case noPlate:
		case l.left:
			b.sink, b.over = b.sink|plateBit(l.left), b.over|plateBit(l.right)
		default:
			b.sink, b.over = b.sink|plateBit(l.right), b.over|plateBit(l.left)
		}
	}
	if len(part) <= leafLegs {
		t.branches[at].from, t.branches[at].to = int32(from), int32(to) // #nosec G115 -- indices of legs, fewer than 2^31 in any memory
		return
	}
	divide(part, middles, widestAxis(middles, part))
	mid := from + len(part)/2
	t.build(legs, middles, from, mid)
	t.branches[at].right = int32(len(t.branches)) // #nosec G115 -- indices of legs, fewer than 2^31 in any memory
	t.build(legs, middles, mid, to)
}

// divide orders the part so that no leg of its first half has its middle farther
// along the axis than one of the second (Hoare 1961, Algorithm 65: find, CACM 4,
// 321). Ties go by number, so that the result does not depend on the order given.
func divide(part []int32, middles []sphere.Vec, axis func(sphere.Vec) float64) {
	less := func(a, b int32) bool {
		x, y := axis(middles[a]), axis(middles[b])
		return x < y || x == y && a < b
	}
	lo, hi, k := 0, len(part)-1, len(part)/2
	for hi-lo > 8 {
		pivot := part[(lo+hi)/2]
		i, j := lo, hi
		for i <= j {
			for less(part[i], pivot) {
				i++
			}
			for less(pivot, part[j]) {
				j--
			}
			if i <= j {
				part[i], part[j] = part[j], part[i]
				i, j = i+1, j-1
			}
		}
		switch {
		case k <= j:
			hi = j
		case k >= i:
			lo = i
		default:
			return
		}
	}
	slices.SortFunc(part[lo:hi+1], func(a, b int32) int {
		return cmp.Or(cmp.Compare(axis(middles[a]), axis(middles[b])), cmp.Compare(a, b))
	})
}

// capOver returns a cap that holds the legs: around the mean of their middles,
// out to the farthest end. An arc shorter than a half turn lies within a cap of
// less than a quarter turn whenever both its ends do; larger caps take the whole
// sphere, which is right if not tight.
func capOver(legs []leg, part []int32) branch {
	var sum sphere.Vec
	for _, i := range part {
		sum = sum.Add(legs[i].arc.A).Add(legs[i].arc.B)
	}
	c := sum.Unit()
	chordSq := 0.0
	for _, i := range part {
		a, b := legs[i].arc.A.Sub(c), legs[i].arc.B.Sub(c)
		chordSq = max(chordSq, a.Dot(a), b.Dot(b))
	}
	r := chordAngle(chordSq) + 1e-9 // the largest chord is good to 1e-8 rad near the antipode only, where r is not used
	if c == (sphere.Vec{}) || r >= math.Pi/2 {
		return branch{centre: sphere.Vec{X: 1}, cosR: -1, sinR: 0}
	}
	return branch{centre: c, cosR: math.Cos(r), sinR: math.Sin(r)}
}

func widestAxis(middles []sphere.Vec, part []int32) func(sphere.Vec) float64 {
	axes := []func(sphere.Vec) float64{
		func(v sphere.Vec) float64 { return v.X },
		func(v sphere.Vec) float64 { return v.Y },
		func(v sphere.Vec) float64 { return v.Z },
	}
	best, widest := axes[0], -1.0
	for _, axis := range axes {
		lo, hi := math.Inf(1), math.Inf(-1)
		for _, i := range part {
			x := axis(middles[i])
			lo, hi = min(lo, x), max(hi, x)
		}
		if hi-lo > widest {
			best, widest = axis, hi-lo
		}
	}
	return best
}

// reach is a distance in the forms in which branches are compared with it.
type reach struct {
	chordSq    float64
	cosD, sinD float64
}

// slack keeps rounding from cutting off a branch that touches the reach.
const slack = 4e-15

// maxChordSq is the square of the longest chord, the diameter.
const maxChordSq = 4

func reachOf(chordSq float64) reach {
	if chordSq >= maxChordSq {
		return reach{maxChordSq, -1, 0}
	}
	return reach{chordSq, 1 - chordSq/2, math.Sqrt(chordSq * (1 - chordSq/4))}
}

// reachOfRad returns the reach of an angle in radians.
func reachOfRad(rad float64) reach {
	if rad >= math.Pi {
		return reachOf(maxChordSq)
	}
	c := 2 * math.Sin(rad/2)
	return reachOf(c * c)
}

// beyond reports whether the whole cap, whose centre is at the angle with the
// given cosine, lies farther away than the reach.
func (r *reach) beyond(b *branch, cosAngle float64) bool {
	// The cap is beyond where angle > d + radius. That cannot be where d + radius
	// is a half turn or more: then sin(d+radius) is not positive.
	if r.sinD*b.cosR+r.cosD*b.sinR <= 0 {
		return false
	}
	return cosAngle < r.cosD*b.cosR-r.sinD*b.sinR-slack
}
