package motion

import (
	"math"

	"nearmargin/setting/sphere"
)

// Relative is the velocity of one plate as seen from another at one place, and
// its components across and along a boundary there. A quantity that the model
// cannot give is NaN.
type Relative struct {
	RateMmYr        float64
	RateSigmaMmYr   float64 // an upper bound; NaN where the source gives none
	AzimuthDeg      float64 // [0, 360); NaN at rate 0
	AzimuthSigmaDeg float64 // an upper bound; NaN where only rate σ is published
	OpeningMmYr     float64 // positive where the plates part
	ShearMmYr       float64 // positive right-lateral
	ObliquityDeg    float64 // 0 square to the boundary, 90 along it; NaN at rate 0
}

// zeroRateMmYr is the rate below which a velocity has no direction.
const zeroRateMmYr = 1e-9

// Relative returns the velocity of a plate relative to another at the unit
// vector at, on a boundary that runs along the unit vector along (tangent at
// at), with the reference plate on its left or right hand. It reports false
// where the model lacks either plate.
//
// Method: v = (ω_plate - ω_reference) × r on a sphere (Cox & Hart 1986, Plate
// Tectonics: How It Works, chapter 4). Opening is v's component away from the
// reference plate; shear its component to the right, looking across the
// boundary from the reference plate.
func (m *Model) Relative(plate, reference string, at, along sphere.Vec, referenceLeft bool) (Relative, bool) {
	a, b := m.entry(plate), m.entry(reference)
	if a == nil || b == nil {
		return Relative{}, false
	}
	w := a.Vector.Sub(b.Vector)
	v := w.Cross(at).Scale(sphere.MeanRadiusKm)
	away := along.Cross(at) // to the right of the path: away from a plate on its left
	right := along.Scale(-1)
	if !referenceLeft {
		away, right = away.Scale(-1), along
	}
	out := Relative{
		RateMmYr:        v.Norm(),
		RateSigmaMmYr:   math.NaN(),
		AzimuthSigmaDeg: math.NaN(),
		OpeningMmYr:     v.Dot(away),
		ShearMmYr:       v.Dot(right),
	}
	if out.RateMmYr < zeroRateMmYr {
		out.AzimuthDeg, out.ObliquityDeg = math.NaN(), math.NaN()
		return out, true
	}
	out.AzimuthDeg = at.Azimuth(v)
	out.ObliquityDeg = math.Atan2(math.Abs(out.ShearMmYr), math.Abs(out.OpeningMmYr)) * degPerRad
	if a.Basis != Published || b.Basis != Published {
		return out, true // the source of a composed velocity has no σ
	}
	u := v.Scale(1 / out.RateMmYr)
	out.RateSigmaMmYr = a.Spread.along(a.Vector, at, u) + b.Spread.along(b.Vector, at, u)
	if a.Spread.full() && b.Spread.full() {
		side := at.Cross(u)
		out.AzimuthSigmaDeg = math.Atan2(a.Spread.along(a.Vector, at, side)+b.Spread.along(b.Vector, at, side), out.RateMmYr) * degPerRad
	}
	return out, true
}

// full reports whether the spread says anything about the direction.
func (s *Spread) full() bool { return s.kind == spreadComponents || s.kind == spreadCovariance }
