package sphere

import (
	"cmp"
	"math"
	"slices"
)

// CutRingsAtAntimeridian returns a polygon cut where it crosses ±180°, as RFC 7946,
// section 3.1.9, wants it: as polygons that each stay on one side, outer rings
// counterclockwise and holes clockwise on the map. The outer ring comes first, then
// holes; rings are closed, their longitudes within (-180, 180], and the outer one fits
// into a hemisphere, as a [Region]. Around a pole the outline runs along ±180° to it.
//
// Method: rings are cut into pieces that end on ±180°. Along the antimeridian the
// inside changes at each crossing, so that sorted by latitude the ends of pieces pair
// up, on either side alike. A region in a hemisphere holds at most one pole; it does
// where the number of crossings is odd.
func CutRingsAtAntimeridian(rings [][]LonLat) [][][]LonLat {
	c := ringCut{}
	var whole [][]LonLat // rings that do not cross
	firstWhole := false
	for i, ring := range rings {
		parts := CutAtAntimeridian(startOffEdge(ring))
		last := len(parts) - 1
		if last == 0 {
			whole, firstWhole = append(whole, parts[0]), firstWhole || i == 0
			continue
		}
		c.pieces = append(c.pieces, append(parts[last], parts[0][1:]...))
		c.pieces = append(c.pieces, parts[1:last]...)
	}
	outer := c.join(rings[0])
	if firstWhole {
		outer, whole = whole[:1], append(whole[1:], outer...)
	}
	var out [][][]LonLat
	for _, ring := range outer {
		out = append(out, [][]LonLat{turned(ring, true)})
	}
	for _, hole := range whole {
		at := max(0, slices.IndexFunc(out, func(p [][]LonLat) bool { return around(p[0], hole[0]) }))
		out[at] = append(out[at], turned(hole, false))
	}
	return out
}

// startOffEdge returns a closed ring that starts at a vertex which is not on ±180°.
func startOffEdge(ring []LonLat) []LonLat {
	n := len(ring) - 1
	at := max(0, slices.IndexFunc(ring[:n], func(p LonLat) bool { return p.Lon != 180 }))
	out := append(slices.Clone(ring[at:n]), ring[:at]...)
	return append(out, out[0])
}

// ringCut joins pieces of rings along ±180°.
type ringCut struct {
	pieces [][]LonLat
	ends   [2][]pieceEnd // on -180° and on 180°, from south to north
}

type pieceEnd struct {
	piece int
	last  bool // the piece's last position, else its first
	lat   float64
}

func sideOf(lon float64) int {
	if lon > 0 {
		return 1
	}
	return 0
}

// join returns the closed rings that the pieces make.
func (c *ringCut) join(outer []LonLat) (rings [][]LonLat) {
	for i, p := range c.pieces {
		first, last := p[0], p[len(p)-1]
		c.ends[sideOf(first.Lon)] = append(c.ends[sideOf(first.Lon)], pieceEnd{i, false, first.Lat})
		c.ends[sideOf(last.Lon)] = append(c.ends[sideOf(last.Lon)], pieceEnd{i, true, last.Lat})
	}
	for _, e := range c.ends {
		slices.SortStableFunc(e, func(a, b pieceEnd) int { return cmp.Compare(a.lat, b.lat) })
	}
	poleLat := 0.0 // of the pole inside
	if len(c.ends[0])%2 == 1 {
		var middle Vec
		for _, p := range outer[1:] {
			middle = middle.Add(FromLonLat(p))
		}
		poleLat = math.Copysign(90, middle.Z)
	}
	used := make([]bool, len(c.pieces))
	for i := range c.pieces {
		if used[i] {
			continue
		}
		var ring []LonLat
		for at := (pieceEnd{piece: i}); !used[at.piece]; {
			used[at.piece] = true
			run := slices.Clone(c.pieces[at.piece])
			if at.last {
				slices.Reverse(run)
			}
			ring = append(ring, run...)
			var over []LonLat
			at, over = c.partner(pieceEnd{piece: at.piece, last: !at.last}, poleLat)
			ring = append(ring, over...)
		}
		rings = append(rings, append(ring, ring[0]))
	}
	return rings
}

// partner returns the end at the other end of the stretch along ±180° that starts at
// an end, and the positions between where the stretch leads over a pole.
func (c *ringCut) partner(from pieceEnd, poleLat float64) (to pieceEnd, over []LonLat) {
	p := c.pieces[from.piece]
	side := sideOf(p[0].Lon)
	if from.last {
		side = sideOf(p[len(p)-1].Lon)
	}
	k := slices.IndexFunc(c.ends[side], func(e pieceEnd) bool { return e.piece == from.piece && e.last == from.last })
	shift := 0 // the south pole takes the place before the first
	if poleLat < 0 {
		shift = 1
	}
	if j := (k + shift) ^ 1 - shift; j >= 0 && j < len(c.ends[side]) {
		return c.ends[side][j], nil
	}
	lon := [2]float64{-180, 180}
	return c.ends[1-side][k], []LonLat{{lon[side], poleLat}, {0, poleLat}, {lon[1-side], poleLat}}
}

// turned returns a ring the way round that is asked for on the map.
func turned(ring []LonLat, counterclockwise bool) []LonLat {
	sum := 0.0
	for i := 1; i < len(ring); i++ {
		a, b := ring[i-1], ring[i]
		sum += (a.Lon-ring[0].Lon)*(b.Lat-ring[0].Lat) - (b.Lon-ring[0].Lon)*(a.Lat-ring[0].Lat)
	}
	if sum > 0 != counterclockwise {
		slices.Reverse(ring)
	}
	return ring
}

// around reports whether a ring on the map goes around a position.
func around(ring []LonLat, p LonLat) bool {
	in := false
	for i := 1; i < len(ring); i++ {
		a, b := ring[i-1], ring[i]
		if (a.Lat > p.Lat) != (b.Lat > p.Lat) && p.Lon < a.Lon+(b.Lon-a.Lon)*(p.Lat-a.Lat)/(b.Lat-a.Lat) {
			in = !in
		}
	}
	return in
}
