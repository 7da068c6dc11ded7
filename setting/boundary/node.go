package boundary

import (
	"cmp"
	"math"
	"slices"

	"nearmargin/setting/sphere"
)

// node is a place where ends of boundaries coincide.
type node struct {
	at     sphere.LonLat
	vec    sphere.Vec
	spokes []spoke // clockwise by azimuth, seen from above
}

// spoke is one boundary's end at a node.
type spoke struct {
	leg     int32
	outward bool // the leg starts at the node
	azimuth float64
	// the plates on the two sides of someone who walks away from the node
	left, right uint8
}

// linkNodes finds the nodes and sorts the spokes around each.
func (n *Network) linkNodes() {
	at := map[sphere.LonLat]int32{}
	join := func(p sphere.LonLat) int32 {
		k := nodeKey(p)
		i, ok := at[k]
		if !ok {
			i = int32(len(n.nodes)) // #nosec G115 -- indices of nodes, fewer than 2^31 in any memory
			at[k] = i
			n.nodes = append(n.nodes, node{at: k, vec: sphere.FromLonLat(k)})
		}
		return i
	}
	for i := range n.legs {
		l := &n.legs[i]
		path := n.boundaries[l.boundary].spec.Path
		if i == 0 || n.legs[i-1].boundary != l.boundary {
			l.nodeA = join(path[0])
			v := &n.nodes[l.nodeA]
			v.spokes = append(v.spokes, spoke{int32(i), true, v.vec.Azimuth(l.arc.Tangent(l.arc.A)), l.left, l.right})
		}
		if i == len(n.legs)-1 || n.legs[i+1].boundary != l.boundary {
			l.nodeB = join(path[len(path)-1])
			v := &n.nodes[l.nodeB]
			v.spokes = append(v.spokes, spoke{int32(i), false, v.vec.Azimuth(l.arc.Tangent(l.arc.B).Scale(-1)), l.right, l.left})
		}
	}
	for i := range n.nodes {
		slices.SortFunc(n.nodes[i].spokes, func(a, b spoke) int {
			return cmp.Or(cmp.Compare(a.azimuth, b.azimuth), cmp.Compare(a.leg, b.leg))
		})
	}
}

// nodeKey makes one key of the several ways to write one place.
func nodeKey(p sphere.LonLat) sphere.LonLat {
	if p.Lat == 90 || p.Lat == -90 {
		p.Lon = 0
	}
	return p
}

// sector returns the plate of the sector around the node in which p lies. At
// the node itself it is the sector clockwise from north.
func (v *node) sector(p sphere.Vec) uint8 {
	az := v.vec.Azimuth(p.Sub(v.vec))
	if math.IsNaN(az) {
		az = 0
	}
	last := &v.spokes[len(v.spokes)-1]
	plate := last.right // from the last spoke through north to the first
	for i := range v.spokes {
		if v.spokes[i].azimuth > az {
			break
		}
		plate = v.spokes[i].right
	}
	return plate
}

// onLineSq is the square of the chord below which a place counts as on a line.
const onLineSq = 1e-30

// side returns the plate that p lies on, given the leg nearest to it.
//
// Method: between the ends of a leg the sign of the distance from its great
// circle; at a vertex between two legs of a boundary the sign against the sum of
// both normals, which is right everywhere that the vertex is nearest (the
// two-dimensional case of Baerentzen & Aanaes 2005, Signed distance computation
// using the angle weighted pseudonormal, IEEE TVCG 11, 243); at a node the
// sector between the lines around it. A place on the line itself, within 6 nm,
// counts to the left plate.
func (n *Network) side(p sphere.Vec, f found) uint8 {
	l := &n.legs[f.leg]
	normal := l.arc.N
	switch {
	case f.where == sphere.AtA && l.nodeA >= 0:
		return n.nodes[l.nodeA].sector(p)
	case f.where == sphere.AtB && l.nodeB >= 0:
		return n.nodes[l.nodeB].sector(p)
	case f.chordSq <= onLineSq:
		return l.left
	case f.where == sphere.AtA:
		normal = normal.Add(n.legs[f.leg-1].arc.N)
	case f.where == sphere.AtB:
		normal = normal.Add(n.legs[f.leg+1].arc.N)
	}
	if normal.Dot(p) >= 0 {
		return l.left
	}
	return l.right
}

// Junction is a node at which three or more plates meet.
type Junction struct {
	At     sphere.LonLat
	Plates []string // sorted codes
}

// Junctions returns the triple (and higher) junctions, derived from the nodes.
func (n *Network) Junctions() []Junction {
	var out []Junction
	for i := range n.nodes {
		var codes []string
		for _, s := range n.nodes[i].spokes {
			codes = append(codes, n.plates[s.left], n.plates[s.right])
		}
		slices.Sort(codes)
		if codes = slices.Compact(codes); len(codes) >= 3 {
			out = append(out, Junction{n.nodes[i].at, codes})
		}
	}
	return out
}
