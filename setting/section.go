package setting

import (
	"fmt"
	"math"

	"nearmargin/setting/boundary"
	"nearmargin/setting/slab"
	"nearmargin/setting/sphere"
)

// Section is a cross-section of a slab along a line through a site. Distances
// along it are km from the trench, positive down the dip.
type Section struct {
	Site   Site       // longitude within (-180, 180]
	SiteKm float64    // where the site lies on the line
	Below  SlabAnswer // the section's slab below the site
	// IsBelow is false where the slab does not reach below the site: Below then means
	// nothing, and OutsideKm is how far it is to the slab's footprint.
	IsBelow   bool
	OutsideKm float64

	Slab   *slab.Slab
	Line   SectionLine
	Trench SectionTrench
	// HasTrench is false where the slab has no boundary in the model, or the line
	// meets none: Trench then means nothing, and distances count from the up-dip edge
	// of the slab.
	HasTrench bool
	Arc       ArcBand
	Samples   []SectionSample
	Profiles  []SlabProfile // the section's slab, then any other that the line passes over

	Notes       List[Note]
	Model       *Model
	MotionModel string // the motion model asked for
}

// SectionStepKm is the distance from one sample to the next.
const SectionStepKm = 5

// SectionLine is the WGS84 geodesic along which a section runs.
type SectionLine struct {
	Origin     sphere.LonLat // the site's place
	OriginKm   float64       // its distance from the trench, Section.SiteKm
	AzimuthDeg float64       // down the dip, at the site, [0, 360)
	From       AzimuthSource
	FromKm     float64 // the first sample, a multiple of SectionStepKm
	ToKm       float64 // the last sample, a multiple of SectionStepKm
}

// At returns the place on the line at a distance from the trench.
func (l *SectionLine) At(km float64) sphere.LonLat {
	return sphere.Direct(l.Origin, l.AzimuthDeg, km-l.OriginKm)
}

// AzimuthSource says what gave a section its direction.
type AzimuthSource uint8

// The sources of a section's direction.
const (
	NoAzimuth AzimuthSource = 0
	// FromDip: the slab's own dip below the site, or at the nearest point of its
	// footprint.
	FromDip AzimuthSource = 1
	// FromTrench: the direction from the nearest point of the trench, where the line
	// along the local dip meets the trench at less than 30° or not at all.
	FromTrench AzimuthSource = 2
)

// AllAzimuthSources lists the sources of a section's direction.
var AllAzimuthSources = [...]AzimuthSource{FromDip, FromTrench}

var azimuthSourceNames = [...]string{"none", "dip", "trench"}

// String returns the source as answers spell it.
func (s AzimuthSource) String() string {
	if int(s) < len(azimuthSourceNames) {
		return azimuthSourceNames[s]
	}
	return fmt.Sprintf("AzimuthSource(%d)", uint8(s))
}

// SectionTrench is where the line meets the boundary that the slab goes down from,
// at distance 0.
type SectionTrench struct {
	Boundary    *boundary.Boundary
	At          sphere.LonLat
	CrossingDeg float64 // the angle between line and boundary, 0…90
	// Motion is the velocity of the plate that goes down as seen from the other.
	Motion Motion
}

// ArcBand is the part of a section over which a volcanic arc may stand.
type ArcBand struct {
	MinDepthKm, MaxDepthKm float64   // depths of the slab's top
	Ranges                 []KmRange // none where the section's slab has no such depth
}

// KmRange is a range of distances along a section.
type KmRange struct{ FromKm, ToKm float64 }

// SectionSample is one of the places along a section, SectionStepKm apart.
type SectionSample struct {
	Km float64
	At sphere.LonLat
}

// SlabProfile is a slab along a section.
type SlabProfile struct {
	Slab *slab.Slab
	// Readings has one entry a sample; DepthKm is NaN where the slab is not.
	Readings []slab.Reading
}

// Has reports whether the slab is below sample i.
func (p *SlabProfile) Has(i int) bool { return !math.IsNaN(p.Readings[i].DepthKm) }

// Section returns the cross-section of the slab that decides for a site: of those
// below it the one that At lists first, else the nearest within SectionReachKm
// whose line of dip leads over the site. The error is a *FieldError, or a
// *NoSlabError where there is none.
func (l *Lookup) Section(s Site) (*Section, error) {
	var a Answer
	if err := l.At(s, &a); err != nil {
		return nil, err
	}
	out := &Section{Site: a.Site, Model: l.m, MotionModel: l.motion.Name()}
	place := boundary.PlaceAt(lonLatOf(a.Site))
	cut, err := l.sectionSlab(place, &a)
	if err != nil {
		return nil, err
	}
	out.Slab = cut.slab
	if out.IsBelow = a.Slabs.Len() > 0; out.IsBelow {
		out.Below = a.Slabs.All()[0]
	}
	out.OutsideKm = cut.outKm
	out.SiteKm = -cut.zero + 0 // never minus zero
	out.Line = cut.line()
	if out.HasTrench = cut.trench.Boundary != nil; out.HasTrench {
		out.Trench = l.sectionTrench(cut)
	}
	out.sample(l.m)
	out.findArc()
	l.sectionNotes(&a, out)
	return out, nil
}

// sectionTrench describes the crossing of the line and the trench.
func (l *Lookup) sectionTrench(c *cut) SectionTrench {
	b := c.trench.Boundary
	sinking := b.Subducting()
	if sinking == "" {
		sinking = b.Left()
		if c.slab.Overriding == sinking {
			sinking = b.Right()
		}
	}
	from, _ := b.Opposite(sinking)
	return SectionTrench{
		Boundary: b, At: c.trench.Nearest,
		CrossingDeg: math.Asin(math.Min(1, c.square)) * 180 / math.Pi,
		Motion:      l.relative(sinking, from, &c.trench),
	}
}

// sample reads every slab that the line passes over, each SectionStepKm.
func (s *Section) sample(m *Model) {
	for km := s.Line.FromKm; km <= s.Line.ToKm; km += SectionStepKm {
		s.Samples = append(s.Samples, SectionSample{km, s.Line.At(km)})
	}
	vecs := make([]sphere.Vec, len(s.Samples))
	for i := range s.Samples {
		vecs[i] = sphere.FromLonLat(s.Samples[i].At)
	}
	read := func(sl *slab.Slab) (p SlabProfile, any bool) {
		p = SlabProfile{sl, make([]slab.Reading, len(vecs))}
		for i, v := range vecs {
			r, in := sl.Surface.At(v)
			if !in {
				nan := math.NaN()
				r = slab.Reading{DepthKm: nan, SigmaKm: nan, DipDeg: nan, DipAzimuthDeg: nan, ThicknessKm: nan}
			}
			p.Readings[i] = r
			any = any || in
		}
		return p, any
	}
	first, _ := read(s.Slab)
	s.Profiles = append(s.Profiles, first)
	for _, other := range m.c.Slabs {
		if other == s.Slab {
			continue
		}
		if p, any := read(other); any {
			s.Profiles = append(s.Profiles, p)
		}
	}
}

// findArc finds where the section's slab lies between the depths of an arc. The
// ends of each range are found by halving between samples.
//
// Accuracy: 0.05 km; a range shorter than SectionStepKm between two samples is
// missed.
func (s *Section) findArc() {
	if s.Slab.Kind != slab.Subduction {
		s.Arc = ArcBand{MinDepthKm: math.NaN(), MaxDepthKm: math.NaN()}
		return
	}
	s.Arc = ArcBand{MinDepthKm: s.Slab.ArcMinDepthKm, MaxDepthKm: Limits[limitSlabArc].Value}
	in := func(km float64) bool {
		r, ok := s.Slab.Surface.At(sphere.FromLonLat(s.Line.At(km)))
		return ok && r.DepthKm >= s.Arc.MinDepthKm && r.DepthKm <= s.Arc.MaxDepthKm
	}
	edge := func(out, inside float64) float64 {
		for math.Abs(out-inside) > 0.05 {
			if mid := (out + inside) / 2; in(mid) {
				inside = mid
			} else {
				out = mid
			}
		}
		return inside
	}
	open := false
	last := len(s.Samples) - 1
	for i := range s.Samples {
		km := s.Samples[i].Km
		now := in(km)
		switch {
		case now && !open:
			from := km
			if i > 0 {
				from = edge(km-SectionStepKm, km)
			}
			s.Arc.Ranges = append(s.Arc.Ranges, KmRange{from, km})
		case open && !now:
			s.Arc.Ranges[len(s.Arc.Ranges)-1].ToKm = edge(km, km-SectionStepKm)
		}
		if open = now; open && i == last {
			s.Arc.Ranges[len(s.Arc.Ranges)-1].ToKm = km
		}
	}
}

// sectionNotes adds the notes on the section's motion and on the site's depth.
func (l *Lookup) sectionNotes(a *Answer, s *Section) {
	a.Notes.clear()
	if s.HasTrench {
		l.motionNotes(a, &s.Trench.Motion)
	}
	if d := a.Site.DepthKm; s.IsBelow && (d == 10 || d == 33) {
		a.note(Note{Code: NoteFixedDepth})
	}
	a.note(Note{Code: NoteScreening})
	s.Notes = a.Notes
}
