package sphere

import (
	"math"
	"slices"
)

// onEdge is the distance in the plane below which a place counts as on an edge:
// 60 µm where the plane touches the Earth.
const onEdge = 1e-11

// flatEdge is one edge of a polygon in gnomonic projection.
type flatEdge struct {
	a, b planar
	ring int32
	from int32 // index of the position it starts at, in the ring as it was given
	to   int32
}

func (e *flatEdge) minY() float64 { return min(e.a.y, e.b.y) }
func (e *flatEdge) maxY() float64 { return max(e.a.y, e.b.y) }
func (e *flatEdge) minX() float64 { return min(e.a.x, e.b.x) }
func (e *flatEdge) maxX() float64 { return max(e.a.x, e.b.x) }

// xAt returns where the edge's line has the height y.
func (e *flatEdge) xAt(y float64) float64 {
	return float64((e.b.x-e.a.x)*((y-e.a.y)/(e.b.y-e.a.y))) + e.a.x
}

// spans reports whether the edge crosses the height y; of two edges that meet at
// a height one does, so that crossings can be counted.
func (e *flatEdge) spans(y float64) bool { return (e.a.y > y) != (e.b.y > y) }

// offset returns the distance of p from the line of the edge, positive to the
// left, and how far along the edge its foot lies, 0 at a and 1 at b.
func (e *flatEdge) offset(p planar) (off, along float64) {
	dx, dy := e.b.x-e.a.x, e.b.y-e.a.y
	px, py := p.x-e.a.x, p.y-e.a.y
	l2 := float64(dx*dx) + float64(dy*dy)
	return (float64(dx*py) - float64(dy*px)) / math.Sqrt(l2), (float64(dx*px) + float64(dy*py)) / l2
}

// holds reports whether p lies on the edge.
func (e *flatEdge) holds(p planar) bool {
	off, along := e.offset(p)
	if math.Abs(off) > onEdge {
		return false
	}
	if along >= 0 && along <= 1 {
		return true
	}
	return near2(p, e.a) || near2(p, e.b)
}

func near2(p, q planar) bool { return math.Hypot(p.x-q.x, p.y-q.y) <= onEdge }

// beside reports whether both ends of f lie clearly on one side of e's line.
func (e *flatEdge) beside(f *flatEdge) bool {
	dx, dy := e.b.x-e.a.x, e.b.y-e.a.y
	a := float64(dx*(f.a.y-e.a.y)) - float64(dy*(f.a.x-e.a.x))
	b := float64(dx*(f.b.y-e.a.y)) - float64(dy*(f.b.x-e.a.x))
	least := onEdge * (math.Abs(dx) + math.Abs(dy)) // no less than onEdge times the length
	return a > least && b > least || a < -least && b < -least
}

// bands finds edges by height: a list of edges for each of many equal bands.
type bands struct {
	low, perBand float64 // lower end, and height of a band
	start        []int32 // of each band's list in items; one more for the end
	items        []int32
}

// maxPerEdge bounds how many bands an edge may stand in, on average.
const maxPerEdge = 16

func newBands(edges []flatEdge) bands {
	low, high := math.Inf(1), math.Inf(-1)
	for i := range edges {
		low, high = min(low, edges[i].minY()), max(high, edges[i].maxY())
	}
	n := max(1, len(edges)/2)
	b := bands{low: low}
	for {
		b.perBand = (high - low) / float64(n)
		total := 0
		for i := range edges {
			from, to := b.span(edges[i].minY(), edges[i].maxY(), n)
			total += to - from + 1
		}
		if n == 1 || total <= maxPerEdge*len(edges) {
			b.fill(edges, n, total)
			return b
		}
		n /= 2
	}
}

func (b *bands) fill(edges []flatEdge, n, total int) {
	b.start, b.items = make([]int32, n+1), make([]int32, total)
	for i := range edges {
		from, to := b.span(edges[i].minY(), edges[i].maxY(), n)
		for k := from; k <= to; k++ {
			b.start[k+1]++
		}
	}
	for k := range n {
		b.start[k+1] += b.start[k]
	}
	next := slices.Clone(b.start)
	for i := range edges {
		from, to := b.span(edges[i].minY(), edges[i].maxY(), n)
		for k := from; k <= to; k++ {
			b.items[next[k]] = int32(i)
			next[k]++
		}
	}
}

// span returns the first and last band that heights between lo and hi fall into,
// with what counts as on an edge to spare.
func (b *bands) span(lo, hi float64, n int) (from, to int) {
	return b.clamp((lo-b.low-2*onEdge)/b.perBand, n), b.clamp((hi-b.low+2*onEdge)/b.perBand, n)
}

// between returns the lowest and highest x of the part of an edge that lies
// between two heights, with what counts as on an edge to spare; false where none
// does.
func (e *flatEdge) between(low, high float64) (from, to float64, ok bool) {
	low, high = low-4*onEdge, high+4*onEdge
	p, q := e.a, e.b
	if p.y > q.y {
		p, q = q, p
	}
	if q.y < low || p.y > high {
		return 0, 0, false
	}
	from, to = p.x, q.x
	if p.y < low {
		from = e.xAt(low)
	}
	if q.y > high {
		to = e.xAt(high)
	}
	return min(from, to) - 2*onEdge, max(from, to) + 2*onEdge, true
}

func (b *bands) clamp(x float64, n int) int {
	if !(x > 0) { // NaN where all lie at one height
		return 0
	}
	return min(int(min(x, float64(n))), n-1)
}

func (b *bands) num() int { return len(b.start) - 1 }

// at returns the edges that may reach the height y.
func (b *bands) at(y float64) []int32 {
	k := b.clamp((y-b.low)/b.perBand, b.num())
	return b.items[b.start[k]:b.start[k+1]]
}

// list returns the edges of a band.
func (b *bands) list(k int) []int32 { return b.items[b.start[k]:b.start[k+1]] }
