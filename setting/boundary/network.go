package boundary

import (
	"cmp"
	"fmt"
	"slices"

	"github.com/tidwall/rtree"

	"nearmargin/setting/sphere"
)

// Network is a set of boundaries with their nodes and search trees.
type Network struct {
	boundaries []*Boundary
	byID       map[string]int32
	plates     []string  // sorted codes; legs hold indices into it
	legs       []leg     // in the order of the boundaries and their paths
	strips     []capsule // around each leg
	nodes      []node
	all        *tree
	byType     [NumTypes]*tree
	byPlate    [][NumTypes]*tree   // of the boundaries of each plate
	boxes      rtree.RTreeG[int32] // legs, by longitude and latitude
}

// NewNetwork builds a network. The order of the boundaries does not matter: they
// are kept sorted by id. Two boundaries with one id are an error, as are more
// than 250 plates; a network that is open or inconsistent is not (see
// [Network.Faults]).
func NewNetwork(boundaries []*Boundary) (*Network, error) {
	n := &Network{boundaries: slices.Clone(boundaries), byID: map[string]int32{}}
	if len(boundaries) == 0 {
		return nil, fmt.Errorf("the network has no boundaries")
	}
	slices.SortFunc(n.boundaries, func(a, b *Boundary) int { return cmp.Compare(a.ID(), b.ID()) })
	for i, b := range n.boundaries {
		if _, twice := n.byID[b.ID()]; twice {
			return nil, fmt.Errorf("boundary %q: the id stands twice", b.ID())
		}
		n.byID[b.ID()] = int32(i)
		n.plates = append(n.plates, b.Left(), b.Right())
	}
	slices.Sort(n.plates)
	n.plates = slices.Compact(n.plates)
	if len(n.plates) > 250 {
		return nil, fmt.Errorf("the network names %d plates; 250 are the limit", len(n.plates))
	}
	n.addLegs()
	n.linkNodes()
	n.index()
	return n, nil
}

func (n *Network) addLegs() {
	for i, b := range n.boundaries {
		path := b.spec.Path
		for j := 1; j < len(path); j++ {
			arc, _ := sphere.NewArc(sphere.FromLonLat(path[j-1]), sphere.FromLonLat(path[j])) // New has seen to it
			l := newLeg(arc)
			l.boundary, l.kind = int32(i), b.Type()
			l.nodeA, l.nodeB = -1, -1
			l.left, l.right, l.sinks = n.plateIndex(b.Left()), n.plateIndex(b.Right()), noPlate
			if b.Subducting() != "" {
				l.sinks = n.plateIndex(b.Subducting())
			}
			n.legs = append(n.legs, l)
			r := rodOfArc(&arc)
			n.strips = append(n.strips, newCapsule(r.a, r.b, r.w))
		}
	}
}

func (n *Network) index() {
	var every []int32
	var of [NumTypes][]int32
	for i := range n.legs {
		every = append(every, int32(i))
		of[n.legs[i].kind] = append(of[n.legs[i].kind], int32(i))
	}
	n.all = newTree(n.legs, every)
	n.all.cells = n.newCells(n.all, n.all.runs())
	for t := range of {
		n.byType[t] = newTree(n.legs, of[t])
		if len(of[t]) > 0 {
			n.byType[t].cells = n.newCells(n.byType[t], n.all.runs())
		}
	}
	n.byPlate = make([][NumTypes]*tree, len(n.plates))
	for p := range n.byPlate {
		for t := range of {
			var bounding []int32
			for _, i := range of[t] {
				if l := &n.legs[i]; int(l.left) == p || int(l.right) == p {
					bounding = append(bounding, i)
				}
			}
			n.byPlate[p][t] = newTree(n.legs, bounding)
		}
	}
	for i := range n.legs {
		for _, box := range boxes(&n.legs[i].arc) {
			n.boxes.Insert(box.Min, box.Max, int32(i))
		}
	}
}

// plateIndex returns the plate's index, noPlate where the network has none of
// that code.
func (n *Network) plateIndex(code string) uint8 {
	i, ok := slices.BinarySearch(n.plates, code)
	if !ok {
		return noPlate
	}
	return uint8(i) // #nosec G115 -- NewNetwork takes no more than 250 plates
}

// Boundaries returns the boundaries, sorted by id. The slice is the caller's.
func (n *Network) Boundaries() []*Boundary { return slices.Clone(n.boundaries) }

// Boundary returns the boundary of that id.
func (n *Network) Boundary(id string) (*Boundary, bool) {
	i, ok := n.byID[id]
	if !ok {
		return nil, false
	}
	return n.boundaries[i], true
}

// Plates returns the codes of all plates that bound something, sorted.
func (n *Network) Plates() []string { return slices.Clone(n.plates) }

// NumLegs returns the number of great-circle arcs in the network.
func (n *Network) NumLegs() int { return len(n.legs) }
