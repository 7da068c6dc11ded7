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
	tieReachKm   = 100  // how far the up-dip rim may lie from the boundary
	tieSeawardKm = 30   // how far of that on the side of the plate that goes down
	tieMinPlaces = 2    // how many places of the rim a boundary must be nearest to
	tieMinShare  = 0.05 // and which share of all that are near to any
	// tieEnoughShare is the share of the rim that must be near to a subduction
	// boundary, or other convergent ones are candidates as well.
	tieEnoughShare = 0.2
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
// nearest subduction boundary that lies within 100 km, from which the slab dips
// away under the plate that stays up, and on whose side of that plate the place
// lies, or at most 30 km on the other. Boundaries with at least two votes and 5 % of
// all are tied, and the plates are those of most votes. Where less than a fifth of the
// rim votes, and for a slab of a collision, boundaries of continental and oceanic
// convergence are candidates too. Plates that are known of the slab (the zero Tie
// where none are) keep a boundary from a vote that would exchange their parts.
func (t Ties) Of(s slab.Surface, kind slab.Kind, known Tie) Tie {
	rim := slab.UpDipRim(s)
	wide := []boundary.Type{boundary.Subduction, boundary.ContinentalConvergent, boundary.OceanicConvergent}
	if kind == slab.Subduction {
		if tie, share := t.vote(rim, wide[:1], known); share >= tieEnoughShare {
			return tie
		}
	}
	if tie, share := t.vote(rim, wide, known); share > 0 {
		return tie
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

// vote returns the tie that a rim votes for, and the share of its places that vote;
// 0 where there is no tie.
func (t Ties) vote(rim []slab.RimPoint, types []boundary.Type, known Tie) (Tie, float64) {
	votes := map[string]int{}
	plates := map[[2]string]int{}
	all := 0
	for _, r := range rim {
		if c, ok := t.nearest(boundary.PlaceAt(r.At.LonLat()), r.DipAzimuthDeg, types, known); ok {
			votes[c.id]++
			plates[c.plates]++
			all++
		}
	}
	least := max(tieMinPlaces, int(math.Ceil(tieMinShare*float64(all))))
	maps.DeleteFunc(votes, func(_ string, n int) bool { return n < least })
	if len(votes) == 0 {
		return Tie{}, 0
	}
	best := [2]string{}
	for _, pair := range slices.SortedFunc(maps.Keys(plates), func(a, b [2]string) int { return slices.Compare(a[:], b[:]) }) {
		if plates[pair] > plates[best] {
			best = pair
		}
	}
	return Tie{slices.Sorted(maps.Keys(votes)), best[0], best[1]}, float64(all) / float64(len(rim))
}

// against reports whether what is known of a slab's plates speaks against a pair.
func (k Tie) against(down, up string) bool {
	return k.Subducting != k.Overriding && (k.Subducting == up || k.Overriding == down)
}

// candidate is a boundary that a slab may go down from.
type candidate struct {
	id     string
	plates [2]string // the one that goes down, and the other
	km     float64
}

// nearest returns the nearest boundary of the types that fits a place of a rim.
func (t Ties) nearest(r boundary.Place, dip float64, types []boundary.Type, known Tie) (best candidate, ok bool) {
	consider := func(h boundary.Hit) {
		down, up := dipping(dip, h)
		if down == "" || known.against(down, up) || ok && h.DistanceKm >= best.km {
			return
		}
		best, ok = candidate{h.Boundary.ID(), [2]string{down, up}, h.DistanceKm}, true
	}
	for _, kind := range types {
		if _, any := t.network.NearestOf(r, kind, "", boundary.AnyRole, tieReachKm); !any {
			continue
		}
		// the nearest of all may dip the other way: that of every plate is asked
		for _, code := range t.network.Plates() {
			for _, role := range [...]boundary.Role{boundary.Overriding, boundary.Bounding} {
				if h, found := t.network.NearestOf(r, kind, code, role, tieReachKm); found {
					consider(h)
				}
			}
		}
	}
	return best, ok
}

// dipping returns the plates of a boundary that a slab with this dip at this place
// would take down and leave up, "" where the place or the dip speaks against it.
func dipping(dip float64, h boundary.Hit) (down, up string) {
	b := h.Boundary
	if math.IsNaN(dip) {
		return "", ""
	}
	// the azimuth square to the boundary, to its left
	left := sphere.Wrap360(h.PathAzimuthDeg - 90)
	toLeft := math.Cos((dip-left)*math.Pi/180) > 0
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
