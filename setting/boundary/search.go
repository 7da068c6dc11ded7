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

// skips reports whether no leg below a branch passes, as far as its plates tell.
func (f filter) skips(b *branch) bool {
	switch f.role {
	case AnyRole:
		return false
	case Overriding:
		return b.over&plateBit(f.plate) == 0
	case Subducting:
		return b.sink&plateBit(f.plate) == 0
	}
	return b.plates&plateBit(f.plate) == 0
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

// nearest returns the leg nearest to p among those that pass, within the reach.
// Ties go by squareness of the line of sight, then by the boundary's id.
func (n *Network) nearest(t *tree, p sphere.Vec, f filter, within reach) (found, bool) {
	best := found{leg: -1}
	if len(t.branches) == 0 {
		return best, false
	}
	if t.cells != nil && f.role == AnyRole {
		best = t.cells.nearest(n, t, p)
		return best, best.chordSq <= within.chordSq
	}
	if !f.skips(&t.branches[0]) && !within.beyond(&t.branches[0], p.Dot(t.branches[0].centre)) {
		n.descend(t, 0, p, f, &best, &within)
	}
	return best, best.leg >= 0
}

// descend searches the tree from a branch on that is not beyond the reach. It
// replaces the best found and shortens the reach.
func (n *Network) descend(t *tree, at int32, p sphere.Vec, f filter, best *found, within *reach) {
	var stack [64]int32
	depth := 0
	for {
		b := &t.branches[at]
		if b.right == 0 {
			for _, i := range t.order[b.from:b.to] {
				l := &n.legs[i]
				d, w := l.chordSq(p)
				if d > within.chordSq || !f.passes(l) {
					continue
				}
				if best.leg >= 0 && d == best.chordSq && !n.squarer(p, found{i, w, d}, *best) {
					continue
				}
				*best = found{i, w, d}
				*within = reachOf(d)
			}
		} else {
			// the nearer child first, so that the reach shrinks soon
			left, right := at+1, b.right
			cl, cr := p.Dot(t.branches[left].centre), p.Dot(t.branches[right].centre)
			if cr > cl {
				left, right, cl, cr = right, left, cr, cl
			}
			if !f.skips(&t.branches[right]) && !within.beyond(&t.branches[right], cr) {
				stack[depth] = right
				depth++
			}
			if !f.skips(&t.branches[left]) && !within.beyond(&t.branches[left], cl) {
				at = left
				continue
			}
		}
		for {
			if depth == 0 {
				return
			}
			depth--
			at = stack[depth]
			if b := &t.branches[at]; !within.beyond(b, p.Dot(b.centre)) {
				break
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

// collect gathers every leg of the tree that passes and lies within the reach of
// p. Where there are more than maxRivals, the nearest of those met are kept.
func (n *Network) collect(t *tree, p sphere.Vec, f filter, within reach, out *rivals) {
	out.n = 0
	if len(t.branches) > 0 {
		n.gather(t, 0, p, f, &within, out)
	}
}

// gather is collect from a branch on, without clearing the list.
func (n *Network) gather(t *tree, at int32, p sphere.Vec, f filter, within *reach, out *rivals) {
	var stack [64]int32
	stack[0] = at
	depth := 1
	for depth > 0 {
		depth--
		at := stack[depth]
		b := &t.branches[at]
		if f.skips(b) || within.beyond(b, p.Dot(b.centre)) {
			continue
		}
		if b.right != 0 {
			stack[depth], stack[depth+1] = b.right, at+1
			depth += 2
			continue
		}
		for _, i := range t.order[b.from:b.to] {
			if d, w := n.legs[i].chordSq(p); d <= within.chordSq && f.passes(&n.legs[i]) {
				out.add(found{i, w, d})
			}
		}
	}
}

func (r *rivals) add(f found) {
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
