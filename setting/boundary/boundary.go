package boundary

import (
	"fmt"
	"math"
	"slices"

	"nearmargin/setting/sphere"
)

// SourceStatus says how well the source of a line is known.
type SourceStatus string

// The states of a source.
const (
	// FromMemory: drawn from what is known of the feature; no publication was
	// opened for it.
	FromMemory SourceStatus = "memory"
	// Consulted: the publication named as the source was read for it.
	Consulted SourceStatus = "consulted"
)

// Spec is what a boundary is built from.
type Spec struct {
	ID, Name     string
	Type         Type
	Left, Right  string          // plate codes, seen when travelling along Path
	Subducting   string          // the plate that goes down: Left, Right, or "" where none or unknown
	SigmaKm      float64         // 1σ of the position, more than 0
	Source       string          // free text
	SourceStatus SourceStatus    // FromMemory or Consulted
	Path         []sphere.LonLat // at least two vertices; may cross ±180°
}

// Boundary is one run of one type along a plate boundary.
type Boundary struct {
	spec     Spec
	lengthKm float64
}

// New checks a specification and builds the boundary from it. The error names
// the boundary, the field and the fault.
func New(s Spec) (*Boundary, error) {
	fail := func(format string, args ...any) (*Boundary, error) {
		return nil, fmt.Errorf("boundary %q: "+format, append([]any{s.ID}, args...)...)
	}
	switch {
	case s.ID == "":
		return nil, fmt.Errorf("boundary %q: id is empty", s.Name)
	case s.Name == "":
		return fail("name is empty")
	case s.Type == Unknown || int(s.Type) >= NumTypes:
		return fail("type is missing; the types are %v", AllTypes)
	case s.Left == "" || s.Right == "":
		return fail("left_plate %q and right_plate %q must both be given", s.Left, s.Right)
	case s.Left == s.Right:
		return fail("left_plate and right_plate are both %q", s.Left)
	case s.Subducting != "" && s.Subducting != s.Left && s.Subducting != s.Right:
		return fail("subducting_plate %q is neither left_plate %q nor right_plate %q", s.Subducting, s.Left, s.Right)
	case s.Type == Subduction && s.Subducting == "":
		return fail("type subduction needs a subducting_plate")
	case !(s.SigmaKm > 0) || math.IsInf(s.SigmaKm, 0):
		return fail("sigma_km is %g; it must be more than 0", s.SigmaKm)
	case s.Source == "":
		return fail("source is empty")
	case s.SourceStatus != FromMemory && s.SourceStatus != Consulted:
		return fail("source_status is %q; it must be %q or %q", s.SourceStatus, FromMemory, Consulted)
	case len(s.Path) < 2:
		return fail("has %d vertices; at least 2 are needed", len(s.Path))
	}
	s.Path = slices.Clone(s.Path)
	b := &Boundary{}
	for i := range s.Path {
		p := &s.Path[i]
		if !(p.Lat >= -90 && p.Lat <= 90) || !(p.Lon >= -180 && p.Lon <= 360) {
			return fail("vertex %d (%g, %g) is not a longitude and a latitude in degrees", i+1, p.Lon, p.Lat)
		}
		p.Lon = sphere.WrapLon(p.Lon)
		if i == 0 {
			continue
		}
		a := s.Path[i-1]
		if _, ok := sphere.NewArc(sphere.FromLonLat(a), sphere.FromLonLat(*p)); !ok {
			return fail("vertices %d and %d (%g, %g) coincide or are antipodes", i, i+1, p.Lon, p.Lat)
		}
		km, _ := sphere.Inverse(a, *p)
		b.lengthKm += km
	}
	b.spec = s
	return b, nil
}

// ID returns the boundary's unique name in its network.
func (b *Boundary) ID() string { return b.spec.ID }

// Name returns the name that the trade uses.
func (b *Boundary) Name() string { return b.spec.Name }

// Type returns the boundary's type.
func (b *Boundary) Type() Type { return b.spec.Type }

// Left returns the code of the plate on the left of the path.
func (b *Boundary) Left() string { return b.spec.Left }

// Right returns the code of the plate on the right of the path.
func (b *Boundary) Right() string { return b.spec.Right }

// Subducting returns the code of the plate that goes down, "" if none is known.
func (b *Boundary) Subducting() string { return b.spec.Subducting }

// SigmaKm returns one standard deviation of the line's position.
func (b *Boundary) SigmaKm() float64 { return b.spec.SigmaKm }

// Source returns where the line comes from.
func (b *Boundary) Source() string { return b.spec.Source }

// SourceStatus returns how well the source is known.
func (b *Boundary) SourceStatus() SourceStatus { return b.spec.SourceStatus }

// Path returns a copy of the vertices; longitudes are within (-180, 180].
func (b *Boundary) Path() []sphere.LonLat { return slices.Clone(b.spec.Path) }

// LengthKm returns the length along WGS84 between the vertices.
func (b *Boundary) LengthKm() float64 { return b.lengthKm }

// Opposite returns the plate across the boundary from the plate given, and
// whether the plate given is one of the two.
func (b *Boundary) Opposite(plate string) (string, bool) {
	switch plate {
	case b.spec.Left:
		return b.spec.Right, true
	case b.spec.Right:
		return b.spec.Left, true
	}
	return "", false
}
