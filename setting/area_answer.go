package setting

import (
	"nearmargin/setting/boundary"
	"nearmargin/setting/slab"
)

// AreaAnswer is what is known of an area. Shares are of the area, 0 to 1.
type AreaAnswer struct {
	AreaKm2    float64
	Plates     []PlateShare     // from the largest share; they add up to 1
	Settings   []SettingShare   // from the largest share; they add up to 1
	Boundaries []BoundaryInside // from the longest
	// Nearest is the boundary nearest to the area: at distance 0, that with the
	// greatest length inside where one crosses. Its motion is seen from the plate at
	// the place of the area that is nearest to it.
	Nearest     BoundaryAnswer
	Slabs       []SlabShare // from the largest share
	Sampling    Sampling
	Notes       List[Note]
	Model       *Model
	MotionModel string // the motion model asked for
}

// PlateShare is the part of an area that lies on a plate.
type PlateShare struct {
	Plate    *Plate
	Fraction float64
}

// SettingShare is the part of an area that has a label. A deforming zone's family
// follows its kind, so that this label may stand with several families.
type SettingShare struct {
	Label    Label
	Family   Family
	Fraction float64
}

// BoundaryInside is the part of a boundary that lies inside an area.
type BoundaryInside struct {
	Boundary *boundary.Boundary
	LengthKm float64 // along WGS84
	Motion   MotionRange
	longest  boundary.Piece
}

// MotionRange is how the motion across a boundary varies along the part of it
// inside an area: of its right plate as seen from its left. A quantity that the
// model cannot give is NaN.
type MotionRange struct {
	Known             bool // false: the other fields mean nothing
	Plate, RelativeTo string
	Model             string // the motion model's name
	RateMmYr          Range
	RateSigmaMmYr     Range
	AzimuthDeg        Range // clockwise from Min to Max, each [0, 360); Max may be less than Min
	OpeningMmYr       Range
	ShearMmYr         Range
	ObliquityDeg      Range
}

// Range is the least and the greatest value of a quantity.
type Range struct{ Min, Max float64 }

// SlabShare is the part of an area that lies above a slab. Depths are those met
// at the sampling's places.
type SlabShare struct {
	Slab                                  *slab.Slab
	Fraction                              float64
	MinDepthKm, MedianDepthKm, MaxDepthKm float64
}

// Sampling says on how many places an area's shares rest.
//
// The standard error is that of one random place in each cell of the sampling's
// lattice: the number n of pairs of neighbours of which one lies in the share and
// one does not is counted, and √(n/6)/N taken, with N places; never less than
// 1/2N. It is an upper bound for a lattice, and the largest of all shares is
// given.
type Sampling struct {
	PlatePoints        int     // places at which the plate was looked up
	PlateSpacingKm     float64 // the side of a square of the area that each stands for
	PlateStandardError float64
	Points             int // places at which setting and slabs were looked up
	SpacingKm          float64
	StandardError      float64
}
