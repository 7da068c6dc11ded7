package motion

import (
	"fmt"
	"math"

	"nearmargin/setting/sphere"
)

const (
	radPerDeg = math.Pi / 180
	degPerRad = 180 / math.Pi
	// radPerMas is a thousandth of an arc second in radians; one mas/yr is 1e6 mas/Myr.
	radPerMas = math.Pi / (180 * 3600 * 1000)
)

// Pole is an Euler pole: where the axis of rotation meets the surface, and the
// rate of rotation about it.
type Pole struct {
	Lat, Lon   float64 // degrees
	RateDegMyr float64 // degrees per million years, anticlockwise seen from above
}

// Vector returns the pole as an angular velocity vector in rad/Myr.
func (p Pole) Vector() sphere.Vec {
	return sphere.FromLonLat(sphere.LonLat{Lon: p.Lon, Lat: p.Lat}).Scale(p.RateDegMyr * radPerDeg)
}

// PoleOf returns the Euler pole of an angular velocity vector in rad/Myr. The
// zero vector gives the zero Pole.
func PoleOf(w sphere.Vec) Pole {
	rate := w.Norm()
	if rate == 0 {
		return Pole{}
	}
	at := w.LonLat()
	return Pole{Lat: at.Lat, Lon: at.Lon, RateDegMyr: rate * degPerRad}
}

// FromMasYr returns the angular velocity vector in rad/Myr of Cartesian
// components in milliarcseconds per year, as geodetic tables give them.
func FromMasYr(x, y, z float64) sphere.Vec {
	return sphere.Vec{X: x, Y: y, Z: z}.Scale(radPerMas * 1e6)
}

// Compose returns the angular velocity of a plate that keeps its velocity
// relative to an anchor plate, in one model, but is carried on the anchor's own
// angular velocity in another: anchorHere + (plateThere - anchorThere).
func Compose(anchorHere, plateThere, anchorThere sphere.Vec) sphere.Vec {
	return anchorHere.Add(plateThere.Sub(anchorThere))
}

// Spread says how an angular velocity's uncertainty is known.
type Spread struct {
	kind spreadKind
	// rateSigma: of the rate alone, as a fraction of it
	rateSigma float64
	// components: σ of x, y, z in rad/Myr
	components sphere.Vec
	// cov: covariance in (rad/Myr)²
	cov [3][3]float64
}

type spreadKind uint8

const (
	spreadUnknown    spreadKind = 0
	spreadRate       spreadKind = 1
	spreadComponents spreadKind = 2
	spreadCovariance spreadKind = 3
)

// NoSpread is the spread of an angular velocity published without uncertainty.
func NoSpread() Spread { return Spread{} }

// RateSpread is a spread of which only the σ of the rate is published, in
// degrees per million years; rateDegMyr is the rate itself.
func RateSpread(rateSigmaDegMyr, rateDegMyr float64) (Spread, error) {
	if !(rateSigmaDegMyr >= 0) || !(rateDegMyr > 0) {
		return Spread{}, fmt.Errorf("rate σ %g must be 0 or more and the rate %g more than 0", rateSigmaDegMyr, rateDegMyr)
	}
	return Spread{kind: spreadRate, rateSigma: rateSigmaDegMyr / rateDegMyr}, nil
}

// ComponentSpread is a spread given as the σ of each Cartesian component in
// rad/Myr, their correlations unknown.
func ComponentSpread(sigma sphere.Vec) (Spread, error) {
	if !(sigma.X >= 0 && sigma.Y >= 0 && sigma.Z >= 0) {
		return Spread{}, fmt.Errorf("component σ %v must be 0 or more", sigma)
	}
	return Spread{kind: spreadComponents, components: sigma}, nil
}

// CovarianceSpread is a spread given as the full covariance in (rad/Myr)². It
// must be symmetric with a diagonal of 0 or more.
func CovarianceSpread(cov [3][3]float64) (Spread, error) {
	for i := range 3 {
		if !(cov[i][i] >= 0) {
			return Spread{}, fmt.Errorf("covariance: diagonal element %d is %g; it must be 0 or more", i+1, cov[i][i])
		}
		for j := range i {
			if cov[i][j] != cov[j][i] {
				return Spread{}, fmt.Errorf("covariance is not symmetric: elements (%d,%d) %g and (%d,%d) %g", i+1, j+1, cov[i][j], j+1, i+1, cov[j][i])
			}
		}
	}
	return Spread{kind: spreadCovariance, cov: cov}, nil
}

// along returns an upper bound of σ, in mm/yr, of the component of the velocity
// w×r·R in the direction u (a unit vector tangent at the unit vector r).
func (s *Spread) along(w, r, u sphere.Vec) float64 {
	// (w×r)·u = w·(r×u): the component is linear in w with the gradient g
	g := r.Cross(u).Scale(sphere.MeanRadiusKm)
	switch s.kind {
	case spreadRate:
		return math.Abs(w.Dot(g)) * s.rateSigma
	case spreadComponents:
		return math.Abs(g.X)*s.components.X + math.Abs(g.Y)*s.components.Y + math.Abs(g.Z)*s.components.Z
	case spreadCovariance:
		v := [3]float64{g.X, g.Y, g.Z}
		sum := 0.0
		for i := range 3 {
			for j := range 3 {
				sum += v[i] * s.cov[i][j] * v[j]
			}
		}
		return math.Sqrt(math.Max(0, sum))
	}
	return math.NaN()
}
