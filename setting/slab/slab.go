package slab

import (
	"fmt"
	"math"

	"nearmargin/setting/sphere"
)

// Kind says what a slab is part of.
type Kind uint8

// The kinds; the zero value is none.
const (
	NoKind     Kind = 0
	Subduction Kind = 1
	Collision  Kind = 2
)

// AllKinds lists the kinds.
var AllKinds = [...]Kind{Subduction, Collision}

var kindNames = [...]string{"none", "subduction", "collision"}

// String returns the kind as model files and answers spell it.
func (k Kind) String() string {
	if int(k) < len(kindNames) {
		return kindNames[k]
	}
	return fmt.Sprintf("Kind(%d)", uint8(k))
}

// ParseKind returns the kind of that name.
func ParseKind(s string) (Kind, error) {
	for _, k := range AllKinds {
		if kindNames[k] == s {
			return k, nil
		}
	}
	return NoKind, fmt.Errorf("slab kind %q is unknown; the kinds are %v", s, AllKinds)
}

// Reading is what a surface says below one place.
type Reading struct {
	DepthKm       float64 // of the slab's top
	SigmaKm       float64 // 1σ of the depth, NaN where unknown
	DipDeg        float64 // 0…90
	DipAzimuthDeg float64 // [0, 360); NaN where the surface is flat
	ThicknessKm   float64 // square to the surface, NaN where unknown
}

// Beyond says in which direction a place lies outside of a surface's footprint.
type Beyond uint8

// The directions.
const (
	NotBeyond   Beyond = 0 // inside
	PastRim     Beyond = 1 // down the dip, past where the slab is known to end
	PastEnd     Beyond = 2 // to the side
	BeforeStart Beyond = 3 // up the dip, towards the trench
)

// Outside is a place's relation to a footprint that it lies outside of.
type Outside struct {
	Beyond  Beyond
	Km      float64 // distance to the footprint
	Reading Reading // at the nearest point of the footprint
}

// Surface is the top of a slab.
type Surface interface {
	// Cap returns a cap that holds the footprint.
	Cap() (centre sphere.Vec, rad float64)
	// At returns the reading below p, and whether p lies within the footprint.
	At(p sphere.Vec) (Reading, bool)
	// Outside says how a place that is not within the footprint lies to it, and
	// whether it is within the given distance.
	Outside(p sphere.Vec, withinKm float64) (Outside, bool)
}

// Spec is what a slab is built from.
type Spec struct {
	ID, Name               string
	Kind                   Kind
	BoundaryIDs            []string // the boundaries that it goes down from; none for a slab within one plate
	Subducting, Overriding string   // plate codes; the same for a slab within one plate
	ArcMinDepthKm          float64  // depth of its top below which a volcanic arc may stand
	Source, SourceStatus   string
	Surface                Surface
}

// Slab is one limb of a subducting or colliding slab.
type Slab struct {
	Spec
	near sphere.Cap
}

// NearKm is the distance that [Slab.Near] is about.
const NearKm = 150

// Near reports whether a place may be less than NearKm away from the slab's
// footprint: false only where it is not.
func (s *Slab) Near(p sphere.Vec) bool { return s.near.Holds(p) }

// New checks a specification and builds the slab from it.
func New(s Spec) (*Slab, error) {
	fail := func(format string, args ...any) (*Slab, error) {
		return nil, fmt.Errorf("slab %q: "+format, append([]any{s.ID}, args...)...)
	}
	switch {
	case s.ID == "":
		return fail("id is empty")
	case s.Name == "":
		return fail("name is empty")
	case s.Kind == NoKind || int(s.Kind) >= len(kindNames):
		return fail("kind is missing; the kinds are %v", AllKinds)
	case s.Subducting == "" || s.Overriding == "":
		return fail("subducting_plate %q and overriding_plate %q must both be given", s.Subducting, s.Overriding)
	case !(s.ArcMinDepthKm >= 60 && s.ArcMinDepthKm <= 100):
		return fail("arc_min_depth_km is %g; it must be within 60 and 100", s.ArcMinDepthKm)
	case s.Source == "":
		return fail("source is empty")
	case s.SourceStatus != "memory" && s.SourceStatus != "consulted":
		return fail(`source_status is %q; it must be "memory" or "consulted"`, s.SourceStatus)
	case s.Surface == nil:
		return fail("has neither contours nor a grid")
	}
	s.BoundaryIDs = append([]string(nil), s.BoundaryIDs...)
	centre, rad := s.Surface.Cap()
	return &Slab{s, sphere.NewCap(centre, rad+sphere.KmToRad(NearKm))}, nil
}

// outward classifies the direction from a point q of the rim to a place p
// outside, by its angle to the direction of dip at q.
func outward(q, p sphere.Vec, r Reading) Beyond {
	az := q.Azimuth(p.Sub(q))
	if math.IsNaN(az) || math.IsNaN(r.DipAzimuthDeg) {
		return PastEnd
	}
	const down = 50 // degrees off the dip within which a place is past the rim
	off := math.Abs(math.Mod(az-r.DipAzimuthDeg+540, 360) - 180)
	switch {
	case off <= down:
		return PastRim
	case off >= 180-down:
		return BeforeStart
	}
	return PastEnd
}
