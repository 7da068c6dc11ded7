package boundary

import (
	"math"

	"nearmargin/setting/sphere"
)

// Sights are lengths of geodesics from one place that have been computed, so that
// several questions about the place pay for each once. The zero value is ready;
// with another place it starts anew. It must not be shared between goroutines.
type Sights struct {
	from   sphere.LonLat
	feet   [maxSights]sphere.Vec
	km     [maxSights]float64
	az     [maxSights]float64
	n      int
	rivals rivals // room for the list, which is too large to be cleared each time
}

const maxSights = 16

// to returns the length and the azimuth of the geodesic from p to the foot.
func (s *Sights) to(p Place, foot sphere.Vec) (km, azimuthDeg float64) {
	if s.from != p.LonLat {
		s.from, s.n = p.LonLat, 0
	}
	for i := range s.feet[:s.n] {
		if s.feet[i] == foot {
			return s.km[i], s.az[i]
		}
	}
	km, azimuthDeg = sphere.Inverse(p.LonLat, foot.LonLat())
	if s.n < maxSights {
		s.feet[s.n], s.km[s.n], s.az[s.n] = foot, km, azimuthDeg
		s.n++
	}
	return km, azimuthDeg
}

// screen keeps those of the rivals that may be the nearest on the ellipsoid, or as
// near as that within coincideKm, by the bound of [sphere.ScreenKm]. The feet of
// those that are kept stand in the list's order.
func (n *Network) screen(p sphere.Vec, r *rivals) {
	least := math.Inf(1)
	for i := range r.list[:r.n] {
		f := &r.list[i]
		r.feet[i] = n.legs[f.leg].foot(p, f.where)
		r.km[i] = 0 // cannot be screened
		if rad := chordAngle(f.chordSq); rad >= sphere.ScreenMinRad && rad <= sphere.ScreenMaxRad {
			if i > 0 && r.feet[i] == r.feet[i-1] { // two legs share most nearest points: a vertex
				r.km[i] = r.km[i-1]
			} else {
				r.km[i] = sphere.ScreenKm(p, r.feet[i], rad)
			}
			least = min(least, r.km[i])
		}
	}
	kept := 0
	most := least*(1+2.1*sphere.ScreenRelative) + 2*coincideKm
	for i := range r.list[:r.n] {
		if r.km[i] <= most {
			r.list[kept], r.feet[kept] = r.list[i], r.feet[i]
			kept++
		}
	}
	r.n = kept
}
