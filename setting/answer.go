package setting

import (
	"nearmargin/setting/boundary"
	"nearmargin/setting/motion"
	"nearmargin/setting/sphere"
)

// Answer is what is known of one site. It holds no reference to anything that
// changes and may be used again for the next site.
type Answer struct {
	Site          Site // longitude within (-180, 180]
	Plate         *Plate
	SideUncertain bool // the nearest boundary is within 2σ

	Label        Label
	Family       Family
	Confidence   Confidence
	Reasons      List[Reason] // the rule that decided first, then what limits confidence
	Alternatives List[Alternative]

	Nearest      BoundaryAnswer
	Controlling  BoundaryAnswer   // the boundary that decides the label
	IsControlled bool             // false in an interior: Controlling means nothing
	Slabs        List[SlabAnswer] // every slab below the site, the one that decides first
	Nearby       List[Nearby]     // the nearest boundary of every other type; empty in a brief answer
	Junction     JunctionAnswer
	NearJunction bool // Junction means something; always false in a brief answer
	Zone         *Zone
	Hotspot      *Hotspot
	HotspotKm    float64
	Notes        List[Note]
	Model        *Model
	MotionModel  string // the motion model asked for
	plateAcross  string
	sights       boundary.Sights
	scratch      [2]evidence // what the rules compare, for the site's plate and the one across
}

// BoundaryAnswer is a boundary near the site, and the motion across it.
type BoundaryAnswer struct {
	boundary.Hit
	// SigmaKm is 1σ of the distance: of the line and of the site together.
	SigmaKm float64
	Motion  Motion
}

// Motion is the velocity of the plate across as seen from the site's plate.
type Motion struct {
	Known             bool // false: the other fields mean nothing
	Plate, RelativeTo string
	Model             string // the motion model's name
	motion.Relative
}

// Nearby is the nearest boundary of one type.
type Nearby struct {
	Boundary   *boundary.Boundary
	DistanceKm float64
	AzimuthDeg float64
}

// JunctionAnswer is the nearest triple junction.
type JunctionAnswer struct {
	Junction   *Junction
	DistanceKm float64
}

// maxList bounds every list in an answer: one entry a label, rule or note.
const maxList = 16

// List is a short list that lives within its owner, so that filling it
// allocates nothing.
type List[T any] struct {
	items [maxList]T
	n     int
}

// All returns the items. The slice is valid until the owner is used again.
func (l *List[T]) All() []T { return l.items[:l.n] }

// Len returns the number of items.
func (l *List[T]) Len() int { return l.n }

func (l *List[T]) add(v T) {
	if l.n < maxList {
		l.items[l.n] = v
		l.n++
	}
}

func (l *List[T]) clear() { l.n = 0 }

// NoteCode names what a note says.
type NoteCode string

// The codes of notes.
const (
	NotePresentDay    NoteCode = "present_day"          // an age was given
	NoteScreening     NoteCode = "screening_aid"        // what the answer is not for
	NoteSideUncertain NoteCode = "side_uncertain"       // either plate is possible
	NoteNoMotion      NoteCode = "motion_unknown"       // the motion model lacks a plate
	NoteOtherMotion   NoteCode = "motion_from_fallback" // from the model asked for as fallback
	NoteSigmaBound    NoteCode = "sigma_upper_bound"    // correlation between poles unknown
	NoteComposed      NoteCode = "composed_pole"        // a small plate carried on a large one
	NoteZoneTotal     NoteCode = "rate_total_across_zone"
	NoteZeroZero      NoteCode = "zero_coordinates" // 0, 0 is often a missing value
	NoteNoSlabs       NoteCode = "no_slabs_in_model"
	NoteOtherPlates   NoteCode = "controlling_boundary_of_other_plates"
	NoteFixedDepth    NoteCode = "depth_may_be_fixed" // 10 and 33 km
)

// Note is a remark on an answer: a code and what it speaks of.
type Note struct {
	Code NoteCode
	A, B string
}

func lonLatOf(s Site) sphere.LonLat { return sphere.LonLat{Lon: s.Lon, Lat: s.Lat} }
