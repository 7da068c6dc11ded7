package boundary

import (
	"math"

	"nearmargin/setting/sphere"
)

// Role says which part a plate must play at a boundary that is looked for.
type Role uint8

// The roles.
const (
	AnyRole    Role = iota
	Bounding        // the plate is on one side of the boundary
	Overriding      // the other plate goes down
	Subducting      // the plate goes down
)

// plays reports whether the plate has the role at the boundary.
func (b *Boundary) plays(plate string, role Role) bool {
	_, bounds := b.Opposite(plate)
	switch role {
	case AnyRole:
		return true
	case Overriding:
		return bounds && b.Subducting() != "" && b.Subducting() != plate
	case Subducting:
		return b.Subducting() == plate
	}
	return bounds
}

// Answers reports whether a hit of [Network.Locate] on the plate's own side is the
// answer of [Network.NearestOf] as well, but for the distance allowed.
func (h *Hit) Answers(t Type, plate string, role Role) bool {
	return h.Boundary != nil && h.Boundary.Type() == t && h.Boundary.plays(plate, role)
}

// filter is what a leg must meet to be found.
type filter struct {
	plate uint8
	role  Role
}

func (f filter) passes(l *leg) bool {
	if f.role == AnyRole {
		return true
	}
	if l.left != f.plate && l.right != f.plate {
		return false
	}
	switch f.role {
	case Overriding:
		return l.sinks != noPlate && l.sinks != f.plate
	case Subducting:
		return l.sinks == f.plate
	}
	return true
}

// skips reports whether no leg below a branch passes, as far as the branch tells: of
// the plates at trenches. What else bounds a plate stands in a tree of its own.
func (f filter) skips(b *branch) bool {
	switch f.role {
	case Overriding:
		return b.over&plateBit(f.plate) == 0
	case Subducting:
		return b.sink&plateBit(f.plate) == 0
	}
	return false
}

// plateBit is the bit of a plate in the plates of a branch. Where a network has
// more than 64 plates some share a bit.
func plateBit(plate uint8) uint64 { return 1 << (plate & 63) }

// found is a leg that was found, and where on it the nearest point lies.
type found struct {
	leg     int32
	where   sphere.Where
	chordSq float64
}

// nearest returns the leg of a tree nearest to p among those that pass, within the
// reach, and whether there is one. Ties go by squareness of the line of sight, then
// by the boundary's id.
func (n *Network) nearest(t *tree, p sphere.Vec, f filter, within reach) (found, bool) {
	best := found{leg: -1}
	n.search(t, p, f, within, &best, nil)
	return best, best.leg >= 0
}

// rivalChordSq returns the squared chord within which a leg counts as a rival of
// the nearest: nearTie of its distance, and a thousandth of a nanometre where that
// is none.
func rivalChordSq(nearestSq float64) float64 {
	return nearestSq*(1+nearTie)*(1+nearTie) + 1e-24
}

// search finds the leg that passes, lies within the reach and is nearest to p.
// Where a list is given it gathers there all that pass and are rivals of the
// nearest.
func (n *Network) search(t *tree, p sphere.Vec, f filter, within reach, best *found, r *rivals) {
	if r != nil {
		r.n = 0
	}
	switch {
	case len(t.branches) == 0:
	case t.cells != nil && f.role == AnyRole:
		q, c := round32(p), t.cells
		cell := c.of(p)
		away := c.away(cell, &q)
		for _, e := range c.entries[c.starts[cell]:c.starts[cell+1]] {
			if e.chord > within.chord+away {
				break
			}
			if b := &t.branches[e.branch]; !b.beyond(b.axisSq(&q), within.chord) {
				n.searchFrom(t, e.branch, p, f, &within, best, r)
			}
		}
	default:
		q, b := round32(p), &t.branches[0]
		if !f.skips(b) && !b.beyond(b.axisSq(&q), within.chord) {
			n.searchFrom(t, 0, p, f, &within, best, r)
		}
	}
	if r != nil {
		r.keepWithin(within.chordSq)
	}
}

// maxDepth is more than a tree of 2^31 legs is deep, its two halves being equal.
const maxDepth = 32

// searchFrom is search from a branch on that is not left out. It replaces the best
// found, shortens the reach and adds to the list.
func (n *Network) searchFrom(t *tree, at int32, p sphere.Vec, f filter, within *reach, best *found, r *rivals) {
	type pending struct {
		at     int32
		axisSq float32
	}
	var stack [maxDepth]pending
	q := round32(p)
	depth := 0
	b := &t.branches[at]
	for {
		if b.legs > 0 {
			for i := b.at; i < b.at+b.legs; i++ {
				if c := &n.strips[i]; c.beyond(c.axisSq(&q), within.chord) {
					continue
				}
				l := &n.legs[i]
				d, w := l.chordSq(p)
				if d > within.chordSq || !f.passes(l) {
					continue
				}
				this := found{i, w, d}
				if best.leg < 0 || d < best.chordSq || d == best.chordSq && n.squarer(p, this, *best) {
					*best = this
					if r == nil {
						*within = reachOf(d)
					} else if rival := rivalChordSq(d); rival < within.chordSq {
						*within = reachOf(rival)
					}
				}
				if r != nil {
					r.add(this, within.chordSq)
				}
			}
		} else {
			// the nearer child first, so that the reach shrinks soon
			left, right := &t.branches[b.at], &t.branches[b.at+1]
			dl, dr := left.axisSq(&q), right.axisSq(&q)
			inLeft := !left.beyond(dl, within.chord) && !f.skips(left)
			inRight := !right.beyond(dr, within.chord) && !f.skips(right)
			switch {
			case inLeft && inRight:
				if dl <= dr {
					stack[depth] = pending{b.at + 1, dr}
					b = left
				} else {
					stack[depth] = pending{b.at, dl}
					b = right
				}
				depth++
				continue
			case inLeft:
				b = left
				continue
			case inRight:
				b = right
				continue
			}
		}
		for {
			if depth == 0 {
				return
			}
			depth--
			if b = &t.branches[stack[depth].at]; !b.beyond(stack[depth].axisSq, within.chord) {
				break
			}
		}
	}
}

// each calls visit with every leg of the tree that passes and lies in a branch or
// strip that is not left out.
func (n *Network) each(t *tree, f filter, leaveOut func(*capsule) bool, visit func(leg int32)) {
	var stack [maxDepth]int32
	depth := 1
	if len(t.branches) == 0 {
		return
	}
	for depth > 0 {
		depth--
		b := &t.branches[stack[depth]]
		if f.skips(b) || leaveOut(&b.capsule) {
			continue
		}
		if b.legs == 0 {
			stack[depth], stack[depth+1] = b.at+1, b.at
			depth += 2
			continue
		}
		for i := b.at; i < b.at+b.legs; i++ {
			if !leaveOut(&n.strips[i]) && f.passes(&n.legs[i]) {
				visit(i)
			}
		}
	}
}

// squareTie is the difference in squareness that counts as none: what rounding
// makes of two lines that are met equally squarely.
const squareTie = 1e-9

// squarer reports whether a wins a tie against b at the same distance from p.
func (n *Network) squarer(p sphere.Vec, a, b found) bool {
	la, lb := &n.legs[a.leg], &n.legs[b.leg]
	sa, sb := la.squareness(p, la.foot(p, a.where)), lb.squareness(p, lb.foot(p, b.where))
	if math.Abs(sa-sb) > squareTie {
		return sa > sb
	}
	ia, ib := n.boundaries[la.boundary].ID(), n.boundaries[lb.boundary].ID()
	if ia != ib {
		return ia < ib
	}
	return a.leg < b.leg
}

// maxRivals bounds how many legs are compared on the ellipsoid.
const maxRivals = 96

// rivals is a list of legs that lie about as near as the nearest.
type rivals struct {
	list [maxRivals]found
	feet [maxRivals]sphere.Vec // filled by screen
	km   [maxRivals]float64
	n    int
}

// add notes a leg. Where there is no room for more than maxRivals, those beyond the
// squared chord make room, else the farthest.
func (r *rivals) add(f found, withinSq float64) {
	if r.n == maxRivals {
		r.keepWithin(withinSq)
	}
	if r.n < maxRivals {
		r.list[r.n] = f
		r.n++
		return
	}
	worst := 0
	for i := range r.list {
		if r.list[i].chordSq > r.list[worst].chordSq {
			worst = i
		}
	}
	if f.chordSq < r.list[worst].chordSq {
		r.list[worst] = f
	}
}

// keepWithin drops what lies beyond the squared chord.
func (r *rivals) keepWithin(chordSq float64) {
	kept := 0
	for i := range r.list[:r.n] {
		if r.list[i].chordSq <= chordSq {
			r.list[kept] = r.list[i]
			kept++
		}
	}
	r.n = kept
}

// keepPassing drops what does not pass.
func (r *rivals) keepPassing(n *Network, f filter) {
	kept := 0
	for i := range r.list[:r.n] {
		if f.passes(&n.legs[r.list[i].leg]) {
			r.list[kept] = r.list[i]
			kept++
		}
	}
	r.n = kept
}
