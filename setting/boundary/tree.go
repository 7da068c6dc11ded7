package boundary

import (
	"cmp"
	"math"
	"slices"

	"nearmargin/setting/sphere"
)

// tree finds legs by their place. Its leaves are short runs of legs of one
// boundary, and every branch holds a capsule around what lies below it.
//
// Method: a strip tree (Ballard 1981, Strip trees: a hierarchical representation
// for curves, CACM 24, 310, doi:10.1145/358645.358661), in space instead of the
// plane, so that it has no seam at ±180° and no singular poles, and with ends that
// are round. Above the runs it is a bounding-volume tree, divided at the median.
type tree struct {
	branches []branch // the root first; none in an empty tree
	cells    *cells   // nil on a tree that has none
}

// branch is a leaf or has two children.
type branch struct {
	capsule
	over, sink uint64 // the plates at trenches below whose other plate goes down, and that go down; see plateBit
	at         int32  // the first of its legs, or the first of its two children
	legs       int32  // in a leaf how many, else 0
}

// runLegs is the largest number of legs in a leaf: 12 was the fastest of 6, 8, 12
// and 16 in BenchmarkNearestRatio.
const runLegs = 12

// newTree builds the tree over the legs whose numbers are given, in rising order.
func newTree(legs []leg, which []int32) *tree {
	b := builder{legs: legs}
	for from := 0; from < len(which); {
		to := from + 1
		for to < len(which) && which[to] == which[to-1]+1 && legs[which[to]].boundary == legs[which[from]].boundary {
			to++
		}
		runs := (to - from + runLegs - 1) / runLegs
		for i := range runs {
			b.addRun(which[from+i*(to-from)/runs : from+(i+1)*(to-from)/runs])
		}
		from = to
	}
	t := &tree{}
	if len(b.rods) > 0 {
		b.order = make([]int32, len(b.rods))
		for i := range b.order {
			b.order[i] = int32(i)
		}
		b.part = make([]rod, len(b.rods))
		b.branches = make([]branch, 1, 2*len(b.rods))
		b.build(0, 0, len(b.rods))
		t.branches = b.branches
	}
	return t
}

// runs is the number of leaves.
func (t *tree) runs() int { return (len(t.branches) + 1) / 2 }

// builder is a tree under construction.
type builder struct {
	legs     []leg
	rods     []rod        // around each run
	middles  []sphere.Vec // of each run
	runs     []run
	order    []int32 // of the runs
	part     []rod   // room for the rods of a branch
	branches []branch
}

// run is a leaf to be: its first leg, and how many.
type run struct {
	first int32
	legs  int32
}

func (b *builder) addRun(which []int32) {
	var rods [runLegs]rod
	for i, k := range which {
		rods[i] = rodOfArc(&b.legs[k].arc)
	}
	r := rodAround(rods[:len(which)])
	b.rods = append(b.rods, r)
	b.middles = append(b.middles, r.a.Add(r.b))
	b.runs = append(b.runs, run{which[0], int32(len(which))}) // #nosec G115 -- no more than runLegs
}

func (b *builder) build(at int, from, to int) {
	part := b.order[from:to]
	rods := b.part[:len(part)]
	for i, k := range part {
		rods[i] = b.rods[k]
	}
	r := rodAround(rods)
	out := branch{capsule: newCapsule(r.a, r.b, r.w)}
	if len(part) == 1 {
		out.at, out.legs = b.runs[part[0]].first, b.runs[part[0]].legs
		out.addPlates(&b.legs[out.at])
		b.branches[at] = out
		return
	}
	divide(part, b.middles, widestAxis(b.middles, part))
	child := len(b.branches)
	out.at = int32(child) // #nosec G115 -- indices of legs, fewer than 2^31 in any memory
	b.branches = append(b.branches, branch{}, branch{})
	mid := from + len(part)/2
	b.build(child, from, mid)
	b.build(child+1, mid, to)
	for _, c := range b.branches[child : child+2] {
		out.over, out.sink = out.over|c.over, out.sink|c.sink
	}
	b.branches[at] = out
}

// addPlates notes the plates at the trench of a run, which are those of any of its legs.
func (b *branch) addPlates(l *leg) {
	switch l.sinks {
	case noPlate:
	case l.left:
		b.sink, b.over = plateBit(l.left), plateBit(l.right)
	default:
		b.sink, b.over = plateBit(l.right), plateBit(l.left)
	}
}

// divide orders the part so that none of its first half has its middle farther
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
