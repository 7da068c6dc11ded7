package sphere

import (
	"cmp"
	"math"
	"slices"
)

// checkRings finds rings that have no area, that meet themselves, or that cross
// another.
func (p *Polygon) checkRings() error {
	for i := range p.rings {
		if p.straight(i) {
			return shapeError(i, -1, "the ring's positions all lie on one line and enclose no area")
		}
	}
	var parts []edgePart
	for k := range p.bands.num() {
		list := p.bands.list(k)
		cuts := 1 + min(15, len(list)/500)
		low, step := p.bands.low+float64(k)*p.bands.perBand, p.bands.perBand/float64(cuts)
		for i := range cuts {
			parts = p.partsBetween(list, low+float64(i)*step, low+float64(i+1)*step, parts[:0])
			if err := p.checkParts(parts); err != nil {
				return err
			}
		}
	}
	return nil
}

// edgePart is the part of an edge between two heights.
type edgePart struct {
	from, to float64 // lowest and highest x
	edge     int32
}

func (p *Polygon) partsBetween(list []int32, low, high float64, parts []edgePart) []edgePart {
	for _, i := range list {
		if from, to, ok := p.edges[i].between(low, high); ok {
			parts = append(parts, edgePart{from, to, i})
		}
	}
	return parts
}

// checkParts checks all pairs of edges whose parts overlap from left to right.
func (p *Polygon) checkParts(parts []edgePart) error {
	slices.SortFunc(parts, func(a, b edgePart) int { return cmp.Or(cmp.Compare(a.from, b.from), cmp.Compare(a.edge, b.edge)) })
	for n, e := range parts {
		for _, f := range parts[n+1:] {
			if f.from > e.to {
				break
			}
			if err := p.checkPair(min(e.edge, f.edge), max(e.edge, f.edge)); err != nil {
				return err
			}
		}
	}
	return nil
}

// straight reports whether all positions of a ring lie on one line.
func (p *Polygon) straight(ring int) bool {
	v := p.rings[ring]
	axis := flatEdge{a: p.flat(v[0])}
	far := 0.0
	for _, w := range v {
		q := p.flat(w)
		if d := math.Hypot(q.x-axis.a.x, q.y-axis.a.y); d > far {
			axis.b, far = q, d
		}
	}
	for _, w := range v {
		if off, _ := axis.offset(p.flat(w)); math.Abs(off) > onEdge {
			return false
		}
	}
	return true
}

// checkPair reports an error where two edges meet as they must not.
func (p *Polygon) checkPair(i, j int32) error {
	e, f := &p.edges[i], &p.edges[j]
	if e.beside(f) || f.beside(e) {
		return nil
	}
	if e.ring != f.ring {
		if q, ok := crossing(e, f); ok {
			at := p.round(q).LonLat()
			return shapeError(int(f.ring), int(f.from), "the edge to position %d crosses the edge from position %d to %d of ring %d, near %.6g, %.6g; rings may touch and not cross", f.to, e.from, e.to, e.ring, at.Lon, at.Lat)
		}
		return nil
	}
	var q planar
	var ok bool
	switch {
	case e.b == f.a: // one after the other
		q, ok = turnsBack(e, f)
	case f.b == e.a:
		q, ok = turnsBack(f, e)
	default:
		q, ok = contact(e, f)
	}
	if !ok {
		return nil
	}
	at := p.round(q).LonLat()
	return shapeError(int(f.ring), int(f.from), "the ring meets itself: the edge to position %d touches or crosses the edge from position %d to %d, near %.6g, %.6g; a ring must not cross or touch itself", f.to, e.from, e.to, at.Lon, at.Lat)
}

// turnsBack reports whether f, which follows e, runs back along it.
func turnsBack(e, f *flatEdge) (planar, bool) {
	if e.holds(f.b) {
		return f.b, true
	}
	return e.a, f.holds(e.a)
}

// contact reports whether two edges have a point in common.
func contact(e, f *flatEdge) (planar, bool) {
	switch {
	case e.holds(f.a):
		return f.a, true
	case e.holds(f.b):
		return f.b, true
	case f.holds(e.a):
		return e.a, true
	case f.holds(e.b):
		return e.b, true
	}
	return crossing(e, f)
}

// crossing reports whether two edges cross between their ends.
func crossing(e, f *flatEdge) (planar, bool) {
	a, _ := e.offset(f.a)
	b, _ := e.offset(f.b)
	if !(a > onEdge && b < -onEdge || a < -onEdge && b > onEdge) {
		return planar{}, false
	}
	c, _ := f.offset(e.a)
	d, _ := f.offset(e.b)
	if !(c > onEdge && d < -onEdge || c < -onEdge && d > onEdge) {
		return planar{}, false
	}
	u := a / (a - b)
	return planar{f.a.x + u*(f.b.x-f.a.x), f.a.y + u*(f.b.y-f.a.y)}, true
}

// checkHoles finds holes that are not inside the outer ring, and holes that
// overlap.
//
// Method: rings do not cross, so that a ring lies on one side of another; which,
// its positions and the middles of its edges say, where they are not on the
// other ring, and a place inside it where all are.
func (p *Polygon) checkHoles() error {
	if len(p.rings) == 1 {
		return nil
	}
	c := ringCount{p: p, in: make([]bool, len(p.rings)), on: make([]bool, len(p.rings))}
	for i := range p.edges {
		e := &p.edges[i]
		if e.ring == 0 {
			continue
		}
		for _, q := range [...]planar{e.a, {(e.a.x + e.b.x) / 2, (e.a.y + e.b.y) / 2}} {
			if err := c.check(q, e.ring, e.from); err != nil {
				return err
			}
		}
	}
	for ring := 1; ring < len(p.rings); ring++ {
		if err := c.check(p.insideOf(int32(ring)), int32(ring), 0); err != nil {
			return err
		}
	}
	return nil
}

func holeOutside(ring int, position int32, v Vec) error {
	at := v.LonLat()
	return shapeError(ring, int(position), "the hole lies outside of the polygon's outer ring, near %.6g, %.6g; a hole must be inside it", at.Lon, at.Lat)
}

// ringCount says of a place which rings it is inside of, and which it is on.
type ringCount struct {
	p      *Polygon
	in, on []bool
	seen   []int32
}

func (c *ringCount) check(q planar, ring, position int32) error {
	for _, r := range c.seen {
		c.in[r], c.on[r] = false, false
	}
	c.seen = append(c.seen[:0], 0)
	c.in[0], c.on[0] = false, false
	for _, i := range c.p.bands.at(q.y) {
		e := &c.p.edges[i]
		c.seen = append(c.seen, e.ring)
		if e.spans(q.y) && q.x < e.xAt(q.y) {
			c.in[e.ring] = !c.in[e.ring]
		}
		if e.holds(q) {
			c.on[e.ring] = true
		}
	}
	if !c.in[0] && !c.on[0] {
		return holeOutside(int(ring), position, c.p.round(q))
	}
	at := c.p.round(q).LonLat()
	for _, r := range c.seen {
		if r != 0 && r != ring && c.in[r] && !c.on[r] {
			return shapeError(int(ring), int(position), "the hole overlaps the hole of ring %d, near %.6g, %.6g; make one hole of the two", r, at.Lon, at.Lat)
		}
	}
	return nil
}

// inside returns a place inside the polygon and off its edges.
func (p *Polygon) inside() planar { return p.insideOf(-1) }

// insideOf returns a place inside one ring; inside the polygon for ring -1. Of
// many heights the one with the longest stretch inside is taken, at its middle.
func (p *Polygon) insideOf(ring int32) planar {
	low, high := math.Inf(1), math.Inf(-1)
	for i := range p.edges {
		if e := &p.edges[i]; ring < 0 || e.ring == ring {
			low, high = min(low, e.minY()), max(high, e.maxY())
		}
	}
	var best planar
	var xs []float64
	longest := 0.0
	const heights = 32
	for k := range heights {
		y := low + (high-low)*(float64(k)+golden(k))/heights
		xs = p.crossings(y, ring, xs[:0])
		for i := 1; i < len(xs); i += 2 {
			if l := xs[i] - xs[i-1]; l > longest {
				best, longest = planar{(xs[i] + xs[i-1]) / 2, y}, l
			}
		}
	}
	return best
}

// crossings appends, in order, where the line of height y meets the edges of one
// ring, or of all for ring -1.
func (p *Polygon) crossings(y float64, ring int32, xs []float64) []float64 {
	for _, i := range p.bands.at(y) {
		if e := &p.edges[i]; (ring < 0 || e.ring == ring) && e.spans(y) {
			xs = append(xs, e.xAt(y))
		}
	}
	slices.Sort(xs)
	return xs
}
