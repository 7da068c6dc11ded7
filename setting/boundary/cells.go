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
	centres [][3]float32
	kinds   [][NumTypes]float32 // least chord from the middle to a leg of each type, rounded down
	starts  []int32             // of a cell's entries, and one more
	entries []cellEntry
}

type cellEntry struct {
	branch int32
	chord  float32 // least from the cell's middle to a leg of the branch, rounded down
}

// cellsPerLeg trades the time of a search against that of building the index.
const cellsPerLeg = 0.5

// chordSlack covers what 32 bits lose in a chord and in a cell's middle.
const chordSlack = 1e-6

// newCells builds the lists over a tree that is not empty.
func (n *Network) newCells(t *tree) *cells {
	c := &cells{side: max(1, int(math.Sqrt(cellsPerLeg*float64(len(t.order))/6)))}
	c.starts = append(c.starts, 0)
	var list []cellEntry
	last := found{leg: -1, chordSq: maxChordSq}
	for face := range 6 {
		for j := range c.side {
			for i := range c.side {
				centre, chord := c.cap(face, i, j)
				c.centres = append(c.centres, [3]float32{float32(centre.X), float32(centre.Y), float32(centre.Z)})
				within := reachOf(maxChordSq)
				if last.leg >= 0 { // the leg found for the cell before is near this one as well
					d, _ := n.legs[last.leg].chordSq(centre)
					within = reachOf(d)
				}
				n.descend(t, 0, centre, filter{}, &last, &within)
				d := chordAngle(within.chordSq) + 2*math.Asin(chord/2)
				rad := 2 * math.Asin(chord/2)
				list = n.branchesWithin(t, centre, d*(1+nearTie)+rad+1e-9, rad*branchPerCell, list[:0])
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

// chordAngle returns the angle of a squared chord.
func chordAngle(chordSq float64) float64 { return 2 * math.Asin(math.Min(1, math.Sqrt(chordSq)/2)) }

// branchPerCell is the largest radius of a listed branch as a part of the cell's.
const branchPerCell = 0.5

// branchesWithin appends the branches that hold every leg within an angle of p,
// none of a larger radius than size unless it is a leaf.
func (n *Network) branchesWithin(t *tree, p sphere.Vec, rad, size float64, out []cellEntry) []cellEntry {
	within, cosSize := reachOfRad(rad), math.Cos(size)
	var stack [64]int32
	depth := 1
	for depth > 0 {
		depth--
		at := stack[depth]
		b := &t.branches[at]
		if within.beyond(b, p.Dot(b.centre)) {
			continue
		}
		if b.right != 0 && b.cosR < cosSize {
			stack[depth], stack[depth+1] = b.right, at+1
			depth += 2
			continue
		}
		// by the triangle inequality from the cap's middle
		chord := p.Sub(b.centre).Norm() - 2*math.Sin(math.Acos(b.cosR)/2)
		out = append(out, cellEntry{at, float32(math.Max(0, chord-1e-7))})
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
	return centre, chord + chordSlack
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

// nearest is the unfiltered search on the tree's cells.
func (c *cells) nearest(n *Network, t *tree, p sphere.Vec) found {
	cell := c.of(p)
	away := c.away(cell, p)
	best, within := found{leg: -1}, reachOf(maxChordSq)
	limit := math.Inf(1) // on an entry's chord
	for _, e := range c.entries[c.starts[cell]:c.starts[cell+1]] {
		if float64(e.chord) > limit {
			break
		}
		if b := &t.branches[e.branch]; !within.beyond(b, p.Dot(b.centre)) {
			n.descend(t, e.branch, p, filter{}, &best, &within)
			limit = math.Sqrt(within.chordSq) + away
		}
	}
	return best
}

// addKinds works out how far each type is from each cell.
func (c *cells) addKinds(n *Network) {
	c.kinds = make([][NumTypes]float32, len(c.centres))
	var last [NumTypes]found
	for i, m := range c.centres {
		p := sphere.Vec{X: float64(m[0]), Y: float64(m[1]), Z: float64(m[2])}.Unit()
		for k, t := range n.byType {
			if len(t.branches) == 0 {
				c.kinds[i][k] = 4 // farther than any chord
				continue
			}
			within := reachOf(maxChordSq)
			if i == 0 {
				last[k].leg = -1
			} else {
				d, _ := n.legs[last[k].leg].chordSq(p)
				within = reachOf(d)
			}
			n.descend(t, 0, p, filter{}, &last[k], &within)
			c.kinds[i][k] = float32(math.Max(0, math.Sqrt(within.chordSq)-chordSlack))
		}
	}
}

// away returns the chord from a cell's middle to a place in it, rounded up.
func (c *cells) away(cell int, p sphere.Vec) float64 {
	m := &c.centres[cell]
	return sphere.Vec{X: float64(m[0]) - p.X, Y: float64(m[1]) - p.Y, Z: float64(m[2]) - p.Z}.Norm() + chordSlack
}

// rivals gathers every leg that passes and lies within the reach of p, which must
// be no more than nearTie beyond the nearest of all.
func (c *cells) rivals(n *Network, t *tree, p sphere.Vec, f filter, within reach, out *rivals) {
	out.n = 0
	cell := c.of(p)
	limit := math.Sqrt(within.chordSq) + c.away(cell, p)
	for _, e := range c.entries[c.starts[cell]:c.starts[cell+1]] {
		if float64(e.chord) > limit {
			return
		}
		n.gather(t, e.branch, p, f, &within, out)
	}
}
