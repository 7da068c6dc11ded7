package boundary

import (
	"math"

	"nearmargin/setting/sphere"
)

// Sights are lengths of geodesics from one place that have been computed, so that
// several questions about the place pay for each once. The zero value is ready;
// with another place it starts anew. It must not be shared between goroutines.
type Sights struct {
	of      *Network
	from    sphere.LonLat
	feet    [maxSights]sphere.Vec
	at      [maxSights]sphere.LonLat // the same feet
	km      [maxSights]float64
	az      [maxSights]float64
	n       int
	plate   string // asked for last
	plateAt uint8  // its index
	rivals  rivals // room for the list, which is too large to be cleared each time
}

const maxSights = 16

// start makes the value that of a place.
func (s *Sights) start(n *Network, p Place) {
	if s.of == n && s.from == p.LonLat {
		return
	}
	s.of, s.from, s.n = n, p.LonLat, 0
	s.plate, s.plateAt = "", noPlate
}

// index is [Network.plateIndex], for the same plate as a rule.
func (s *Sights) index(plate string) uint8 {
	if plate != s.plate {
		s.plate, s.plateAt = plate, s.of.plateIndex(plate)
	}
	return s.plateAt
}

// to returns the foot's position, and the length and the azimuth of the geodesic
// from p to it.
func (s *Sights) to(p Place, foot sphere.Vec) (at sphere.LonLat, km, azimuthDeg float64) {
	for i := range s.feet[:s.n] {
		if s.feet[i] == foot {
			return s.at[i], s.km[i], s.az[i]
		}
	}
	at = foot.LonLat()
	km, azimuthDeg = sphere.Inverse(p.LonLat, at)
	if s.n < maxSights {
		s.feet[s.n], s.at[s.n], s.km[s.n], s.az[s.n] = foot, at, km, azimuthDeg
		s.n++
	}
	return at, km, azimuthDeg
}

// screen keeps those of the rivals that may be the nearest on the ellipsoid, or as
// near as that within coincideKm, by the bound of [sphere.ScreenKm]. The feet of
// those that are kept stand in the list's order.
func (n *Network) screen(p sphere.Vec, r *rivals) {
	same := true // most nearest points are a vertex that two legs share
	for i := range r.list[:r.n] {
		f := &r.list[i]
		r.feet[i] = n.legs[f.leg].foot(p, f.where)
		same = same && r.feet[i] == r.feet[0]
	}
	if same {
		return
	}
	least := math.Inf(1)
	for i := range r.list[:r.n] {
		f := &r.list[i]
		r.km[i] = 0 // cannot be screened
		if rad := chordAngle(f.chordSq); rad >= sphere.ScreenMinRad && rad <= sphere.ScreenMaxRad {
			if i > 0 && r.feet[i] == r.feet[i-1] {
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
