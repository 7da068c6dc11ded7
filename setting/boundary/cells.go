package boundary

import (
	"cmp"
	"math"
	"slices"

	"nearmargin/setting/sphere"
)

// cells divides the sphere into cells, each with a list of those branches of a
// tree that can hold the leg nearest to a place in the cell, or one that is
// farther by no more than nearTie. A search from there saves the way down from the
// root, and has a good bound after the first branch.
//
// Method: the faces of a cube, each with side × side cells, projected to the
// sphere. A list's branches are about half as large as the cell; for each its
// distance from the cell's middle is kept, and the list is sorted by it. A search
// goes down branch after branch until the distance of the next from the middle,
// less the place's own, is more than the best found: chords are straight lines in
// space, so the triangle inequality holds for them.
type cells struct {
	side    int
	centres []point32
	starts  []int32 // of a cell's entries, and one more
	entries []cellEntry
}

type cellEntry struct {
	branch int32
	chord  float32 // least from the cell's middle to a leg of the branch, rounded down
}

// cellsPerRun trades the time of a search against that of building the index.
const cellsPerRun = 0.72

// newCells builds the lists over a tree that is not empty, with as many cells as
// suit a tree of that many runs.
func (n *Network) newCells(t *tree, runs int) *cells {
	c := &cells{side: max(1, int(math.Sqrt(cellsPerRun*float64(runs)/6)))}
	c.starts = append(c.starts, 0)
	var list []cellEntry
	last := found{leg: -1}
	for face := range 6 {
		for j := range c.side {
			for i := range c.side {
				centre, chord := c.cap(face, i, j)
				c.centres = append(c.centres, round32(centre))
				within := reachOf(maxChordSq)
				if last.leg >= 0 { // the leg found for the cell before is near this one as well
					last.chordSq, last.where = n.legs[last.leg].chordSq(centre)
					within = reachOf(last.chordSq)
				}
				n.searchFrom(t, 0, centre, filter{}, &within, &last, nil)
				far := math.Sqrt(last.chordSq) + chord // of the leg nearest to any place in the cell
				list = t.branchesWithin(centre, far*(1+nearTie)+chord, chord*branchPerCell, list[:0])
				slices.SortFunc(list, func(a, b cellEntry) int {
					return cmp.Or(cmp.Compare(a.chord, b.chord), cmp.Compare(a.branch, b.branch))
				})
				c.entries = append(c.entries, list...)
				c.starts = append(c.starts, int32(len(c.entries))) // #nosec G115 -- indices of legs, fewer than 2^31 in any memory
			}
		}
	}
	c.entries = slices.Clip(c.entries)
	return c
}

// branchPerCell is the largest radius of a listed branch as a part of the cell's.
const branchPerCell = 1

// branchesWithin appends the branches that hold every leg within a chord of p, none
// larger than a radius unless it is a leaf.
func (t *tree) branchesWithin(p sphere.Vec, chord, size float64, out []cellEntry) []cellEntry {
	q, within := round32(p), float32(chord)
	lengthSq := float32(4 * size * size)
	var stack [maxDepth]int32
	depth := 1
	for depth > 0 {
		depth--
		at := stack[depth]
		b := &t.branches[at]
		axisSq := b.axisSq(&q)
		if b.beyond(axisSq, within) {
			continue
		}
		if b.legs == 0 && b.dx*b.dx+b.dy*b.dy+b.dz*b.dz > lengthSq {
			stack[depth], stack[depth+1] = b.at+1, b.at
			depth += 2
			continue
		}
		out = append(out, cellEntry{at, max(0, float32(math.Sqrt(float64(axisSq)))-b.w)})
	}
	return out
}

// cap returns the middle of a cell and the longest chord from it to a corner. The
// sides of a cell are arcs of great circles, so that no place in it is farther.
func (c *cells) cap(face, i, j int) (centre sphere.Vec, chord float64) {
	at := func(x, y float64) sphere.Vec {
		u, w := fromEven(2*x/float64(c.side)-1), fromEven(2*y/float64(c.side)-1)
		axis, sign := face>>1, 1-2*float64(face&1)
		switch axis {
		case 0:
			return sphere.Vec{X: sign, Y: u, Z: w}.Unit()
		case 1:
			return sphere.Vec{X: u, Y: sign, Z: w}.Unit()
		}
		return sphere.Vec{X: u, Y: w, Z: sign}.Unit()
	}
	x, y := float64(i), float64(j)
	centre = at(x+0.5, y+0.5)
	for _, v := range [...]sphere.Vec{at(x, y), at(x+1, y), at(x, y+1), at(x+1, y+1)} {
		chord = max(chord, v.Sub(centre).Norm())
	}
	return centre, chord + capsuleSlack
}

// evenness is that of toEven, which is within 1 % of 4/π·atan.
const evenness = 4/math.Pi - 1

// toEven spreads a coordinate on a cube's face, -1 to 1, so that cells are about
// equally large; fromEven is its inverse.
func toEven(u float64) float64 { return u * (1 + evenness*(1-math.Abs(u))) }

func fromEven(s float64) float64 {
	const k = 1 + evenness
	return math.Copysign((k-math.Sqrt(math.Max(0, k*k-4*evenness*math.Abs(s))))/(2*evenness), s)
}

// of returns the number of the cell that holds p.
func (c *cells) of(p sphere.Vec) int {
	x, y, z := math.Abs(p.X), math.Abs(p.Y), math.Abs(p.Z)
	face, m, u, w := 0, p.X, p.Y, p.Z
	if y > x && y >= z {
		face, m, u, w = 2, p.Y, p.X, p.Z
	} else if z > x {
		face, m, u, w = 4, p.Z, p.X, p.Y
	}
	if m < 0 {
		face, m = face+1, -m
	}
	half := float64(c.side) / 2
	i := min(c.side-1, int((toEven(u/m)+1)*half))
	j := min(c.side-1, int((toEven(w/m)+1)*half))
	return (face*c.side+j)*c.side + i
}

// away returns the chord from a cell's middle to a place in it, rounded up.
func (c *cells) away(cell int, q *point32) float32 {
	m := &c.centres[cell]
	x, y, z := m.x-q.x, m.y-q.y, m.z-q.z
	return float32(math.Sqrt(float64(x*x+y*y+z*z))) + capsuleSlack
}
