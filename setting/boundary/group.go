package boundary

import "fmt"

// Group is some of a network's boundaries, to be searched by themselves.
type Group struct {
	n *Network
	t *tree
}

// Group returns the boundaries of the ids given.
func (n *Network) Group(ids []string) (*Group, error) {
	in := map[int32]bool{}
	for _, id := range ids {
		i, ok := n.byID[id]
		if !ok {
			return nil, fmt.Errorf("there is no boundary %q", id)
		}
		in[i] = true
	}
	var legs []int32
	for i := range n.legs {
		if in[n.legs[i].boundary] {
			legs = append(legs, int32(i))
		}
	}
	return &Group{n, newTree(n.legs, legs)}, nil
}

// Nearest returns the boundary of the group that is nearest to a place, within
// maxKm, and whether there is one.
func (g *Group) Nearest(p Place, maxKm float64) (Hit, bool) {
	var s Sights
	return g.NearestWith(p, maxKm, &s)
}

// NearestWith is [Group.Nearest] that uses and adds to the sights from the place.
func (g *Group) NearestWith(p Place, maxKm float64, s *Sights) (Hit, bool) {
	return g.n.nearestIn(g.t, p, filter{noPlate, AnyRole}, maxKm, s)
}
