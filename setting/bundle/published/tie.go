package published

import (
	"maps"
	"math"
	"slices"

	"nearmargin/setting/boundary"
	"nearmargin/setting/slab"
	"nearmargin/setting/sphere"
)

// The rule by which slabs are tied to boundaries, see [Ties.Of].
const (
	tieReachKm   = 100 // how far the up-dip rim may lie from the boundary
	tieSeawardKm = 30  // how far of that on the side of the plate that goes down
	tieMinPlaces = 2   // how many places of the rim a boundary must be nearest to
)

// Ties ties slabs to the boundaries that they go down from.
type Ties struct{ network *boundary.Network }

// Tie is what a slab is tied to. BoundaryIDs is empty where no boundary is near;
// both plates are then the one above the slab.
type Tie struct {
	BoundaryIDs            []string
	Subducting, Overriding string
}

// Of ties a surface. Each place of its up-dip rim ([slab.UpDipRim]) votes for the
// subduction boundary nearest to it, if that lies within 100 km, and if the place
// is on the side of the plate that stays up or at most 30 km on the other, and if
// the slab dips away from the boundary towards that side. Boundaries with two votes
// are tied, and their plates are those of most votes. Where that gives none, and
// first for a slab of a collision, convergent boundaries of any type are tried.
func (t Ties) Of(s slab.Surface, kind slab.Kind) Tie {
	rim := slab.UpDipRim(s)
	sets := [][]boundary.Type{
		{boundary.Subduction},
		{boundary.Subduction, boundary.ContinentalConvergent, boundary.OceanicConvergent},
	}
	if kind == slab.Collision {
		sets = sets[1:]
	}
	for _, types := range sets {
		if tie, ok := t.vote(rim, types); ok {
			return tie
		}
	}
	// within one plate: that of the middle of the slab
	spots := slab.Spots(s)
	var sum sphere.Vec
	for _, v := range spots {
		sum = sum.Add(v)
	}
	code, _ := t.network.Locate(boundary.PlaceAt(sum.Unit().LonLat()))
	return Tie{Subducting: code, Overriding: code}
}

func (t Ties) vote(rim []slab.RimPoint, types []boundary.Type) (Tie, bool) {
	votes := map[string]int{}
	plates := map[[2]string]int{}
	for _, r := range rim {
		h, ok := t.nearest(r.At, types)
		if !ok {
			continue
		}
		down, up := dipping(r, h)
		if down == "" {
			continue
		}
		votes[h.Boundary.ID()]++
		plates[[2]string{down, up}]++
	}
	maps.DeleteFunc(votes, func(_ string, n int) bool { return n < tieMinPlaces })
	if len(votes) == 0 {
		return Tie{}, false
	}
	best := [2]string{}
	for _, pair := range slices.SortedFunc(maps.Keys(plates), func(a, b [2]string) int { return slices.Compare(a[:], b[:]) }) {
		if plates[pair] > plates[best] {
			best = pair
		}
	}
	return Tie{slices.Sorted(maps.Keys(votes)), best[0], best[1]}, true
}

func (t Ties) nearest(at sphere.Vec, types []boundary.Type) (best boundary.Hit, ok bool) {
	p := boundary.PlaceAt(at.LonLat())
	for _, kind := range types {
		if h, found := t.network.NearestOf(p, kind, "", boundary.AnyRole, tieReachKm); found && (!ok || h.DistanceKm < best.DistanceKm) {
			best, ok = h, true
		}
	}
	return best, ok
}

// dipping returns the plates of a boundary that a slab with this place on its rim
// would take down and leave up, "" where the place or its dip speaks against it.
func dipping(r slab.RimPoint, h boundary.Hit) (down, up string) {
	b := h.Boundary
	if math.IsNaN(r.DipAzimuthDeg) {
		return "", ""
	}
	// the azimuth square to the boundary, to its left
	left := sphere.Wrap360(h.PathAzimuthDeg - 90)
	toLeft := math.Cos((r.DipAzimuthDeg-left)*math.Pi/180) > 0
	down, up = b.Left(), b.Right()
	if toLeft {
		down, up = up, down
	}
	if b.Subducting() != "" && b.Subducting() != down {
		return "", ""
	}
	// left of the path where the nearest point is seen to the right
	leftSide := math.Cos((h.AzimuthDeg-left)*math.Pi/180) < 0
	if leftSide != toLeft && h.DistanceKm > tieSeawardKm {
		return "", ""
	}
	return down, up
}
