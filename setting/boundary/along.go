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
	east, north := p.Vec.EastNorth()
	sin, cos := math.Sincos(azimuthDeg * math.Pi / 180)
	forward := east.Scale(sin).Add(north.Scale(cos)).Scale(math.Sin(rad))
	ahead := p.Vec.Scale(math.Cos(rad))
	front, ok := sphere.NewArc(p.Vec, ahead.Add(forward))
	if !ok {
		return 0, false
	}
	back, _ := sphere.NewArc(p.Vec, ahead.Sub(forward))
	within, q, plane := reachOfRad(rad), round32(p.Vec), round32(front.N)
	best := math.Inf(1)
	n.each(n.byPlate[f.plate][t], f, func(c *capsule) bool {
		return c.besides(&plane) || c.beyond(c.axisSq(&q), within.chord)
	}, func(i int32) {
		for _, line := range [...]*sphere.Arc{&front, &back} {
			if at, crosses := line.Cross(&n.legs[i].arc); crosses {
				best = min(best, sphere.Angle(p.Vec, at))
			}
		}
	})
	return sphere.RadToKm(best), !math.IsInf(best, 1)
}
