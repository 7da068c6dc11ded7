package boundary

import (
	"math"

	"nearmargin/setting/sphere"
)

// AlongTo returns the distance in km on the sphere from a place, along the great
// circle through it with an azimuth, to the nearest boundary of a type that the
// circle crosses on either side and that bounds the plate, and whether there is
// one within maxKm.
func (n *Network) AlongTo(p Place, azimuthDeg float64, t Type, plate string, maxKm float64) (float64, bool) {
	f := filter{n.plateIndex(plate), Bounding}
	if f.plate == noPlate {
		return 0, false
	}
	rad := sphere.KmToRad(maxKm)
	var r rivals
	n.collect(n.byType[t], p.Vec, f, reachOfRad(rad), &r)
	east, north := p.Vec.EastNorth()
	sin, cos := math.Sincos(azimuthDeg * math.Pi / 180)
	forward := east.Scale(sin).Add(north.Scale(cos)).Scale(math.Sin(rad))
	ahead := p.Vec.Scale(math.Cos(rad))
	best := math.Inf(1)
	for _, end := range [...]sphere.Vec{ahead.Add(forward), ahead.Sub(forward)} {
		line, ok := sphere.NewArc(p.Vec, end)
		if !ok {
			continue
		}
		for i := range r.n {
			if q, crosses := line.Cross(&n.legs[r.list[i].leg].arc); crosses {
				best = min(best, sphere.Angle(p.Vec, q))
			}
		}
	}
	return sphere.RadToKm(best), !math.IsInf(best, 1)
}
