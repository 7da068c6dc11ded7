package setting

import (
	"math"

	"nearmargin/setting/boundary"
	"nearmargin/setting/sphere"
)

// motionRange collects the motion at places along one boundary.
type motionRange struct {
	r         MotionRange
	azimuth   float64 // of the first place with a direction
	least     float64 // offsets from it, degrees
	most      float64
	direction bool
}

func newMotionRange() motionRange {
	none := Range{math.NaN(), math.NaN()}
	return motionRange{r: MotionRange{RateMmYr: none, RateSigmaMmYr: none, AzimuthDeg: none, OpeningMmYr: none, ShearMmYr: none, ObliquityDeg: none}}
}

// add takes in the motion at both ends and the middle of a piece.
func (m *motionRange) add(l *Lookup, p *boundary.Piece) {
	for _, v := range [...]sphere.Vec{p.Arc.A, p.Arc.Midpoint(), p.Arc.B} {
		h := boundary.Hit{Boundary: p.Boundary, NearestVec: v, Along: p.Arc.Tangent(v)}
		x := l.relative(p.Boundary.Right(), p.Boundary.Left(), &h)
		if !x.Known {
			return
		}
		m.r.Known, m.r.Plate, m.r.RelativeTo, m.r.Model = true, x.Plate, x.RelativeTo, x.Model
		m.r.RateMmYr.include(x.RateMmYr)
		m.r.RateSigmaMmYr.include(x.RateSigmaMmYr)
		m.r.OpeningMmYr.include(x.OpeningMmYr)
		m.r.ShearMmYr.include(x.ShearMmYr)
		m.r.ObliquityDeg.include(x.ObliquityDeg)
		m.turn(x.AzimuthDeg)
	}
}

// turn takes in an azimuth, as an offset within ±180° from the first.
func (m *motionRange) turn(azimuth float64) {
	switch {
	case math.IsNaN(azimuth):
		return
	case !m.direction:
		m.direction, m.azimuth = true, azimuth
	default:
		off := math.Mod(azimuth-m.azimuth+540, 360) - 180
		m.least, m.most = min(m.least, off), max(m.most, off)
	}
	m.r.AzimuthDeg = Range{sphere.Wrap360(m.azimuth + m.least), sphere.Wrap360(m.azimuth + m.most)}
}

// include widens the range to a value; NaN is passed over.
func (r *Range) include(x float64) {
	if !(x >= r.Min) && !math.IsNaN(x) {
		r.Min = x
	}
	if !(x <= r.Max) && !math.IsNaN(x) {
		r.Max = x
	}
}
