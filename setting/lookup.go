package setting

import (
	"fmt"
	"math"
	"strings"

	"nearmargin/setting/boundary"
	"nearmargin/setting/motion"
	"nearmargin/setting/sphere"
)

// Options are choices that hold for many sites.
type Options struct {
	Motion   string // name of a motion model; "" for the model's default
	Fallback string // name of the motion model to use where the first lacks a plate; "" for none
	Brief    bool   // leave out the nearby boundaries and the triple junction
}

// Lookup answers for sites on one model with fixed options. It is immutable and
// safe for concurrent use.
type Lookup struct {
	m        *Model
	brief    bool
	motion   *motion.Model
	fallback *motion.Model
}

// Lookup returns a look-up with the options, or a *FieldError that names the
// motion models there are.
func (m *Model) Lookup(o Options) (*Lookup, error) {
	l := &Lookup{m: m, brief: o.Brief}
	if o.Motion == "" {
		o.Motion = m.c.DefaultMotion
	}
	var ok bool
	if l.motion, ok = m.motions[o.Motion]; !ok {
		return nil, m.noMotion("motion", o.Motion)
	}
	if o.Fallback != "" {
		if l.fallback, ok = m.motions[o.Fallback]; !ok {
			return nil, m.noMotion("motion_fallback", o.Fallback)
		}
	}
	return l, nil
}

func (m *Model) noMotion(field, name string) error {
	return &FieldError{field, fmt.Sprintf("%q is not a motion model of %s; there are %s", name, m.Ref(), strings.Join(m.MotionNames(), ", "))}
}

// Model returns the model that the look-up answers from.
func (l *Lookup) Model() *Model { return l.m }

// At answers for one site with the model's default motion. Callers with many
// sites use [Model.Lookup] and [Lookup.At].
func (m *Model) At(s Site) (*Answer, error) {
	l, err := m.Lookup(Options{})
	if err != nil {
		return nil, err
	}
	a := &Answer{}
	return a, l.At(s, a)
}

// At answers for one site into a. The error is a *FieldError; a then means
// nothing.
func (l *Lookup) At(s Site, a *Answer) error {
	if err := s.Validate(); err != nil {
		return err
	}
	s.Lon = sphere.WrapLon(s.Lon)
	l.reset(s, a)
	place := boundary.PlaceAt(lonLatOf(s))

	code, hit := l.m.network.LocateWith(place, &a.sights)
	a.Plate = l.m.plates[code]
	a.plateAcross, _ = hit.Boundary.Opposite(code)
	a.Nearest = l.boundaryAnswer(a, hit)
	a.SideUncertain = hit.DistanceKm <= 2*a.Nearest.SigmaKm

	a.Zone = l.m.zoneAt(place.Vec)
	a.Hotspot, a.HotspotKm = l.m.hotspotNear(place)
	if !l.brief {
		l.nearby(place, a)
		l.junction(place, a)
	}
	l.classify(place, a)
	l.addNotes(a)
	return nil
}

func (l *Lookup) reset(s Site, a *Answer) {
	a.Site, a.Model, a.MotionModel = s, l.m, l.motion.Name()
	a.Reasons.clear()
	a.Alternatives.clear()
	a.Nearby.clear()
	a.Slabs.clear()
	a.Notes.clear()
	a.NearJunction, a.IsControlled = false, false
}

// boundaryAnswer adds σ and the motion to a hit on a boundary. The motion is seen
// from the site's plate; where the boundary does not bound that, as may be with
// the trench of a slab, from the plate that does not go down.
func (l *Lookup) boundaryAnswer(a *Answer, h boundary.Hit) BoundaryAnswer {
	out := BoundaryAnswer{Hit: h, SigmaKm: math.Hypot(h.Boundary.SigmaKm(), a.Site.sigmaKm())}
	from := a.Plate.Code
	across, ok := h.Boundary.Opposite(from)
	if !ok {
		from = h.Boundary.Left()
		if from == h.Boundary.Subducting() {
			from = h.Boundary.Right()
		}
		across, _ = h.Boundary.Opposite(from)
	}
	out.Motion = l.relative(across, from, &h)
	return out
}

func (l *Lookup) relative(plate, reference string, h *boundary.Hit) Motion {
	m := Motion{Plate: plate, RelativeTo: reference}
	for _, mm := range [...]*motion.Model{l.motion, l.fallback} {
		if mm == nil {
			break
		}
		if m.Relative, m.Known = mm.Relative(plate, reference, h.NearestVec, h.Along, h.Boundary.Left() == reference); m.Known {
			m.Model = mm.Name()
			break
		}
	}
	return m
}

// nearbyReachKm is how far the nearest boundary of another type may be.
const nearbyReachKm = 1000

func (l *Lookup) nearby(p boundary.Place, a *Answer) {
	for _, t := range boundary.AllTypes {
		if t == a.Nearest.Boundary.Type() {
			continue
		}
		if h, ok := l.m.network.NearestOfWith(p, t, "", boundary.AnyRole, nearbyReachKm, &a.sights); ok {
			a.Nearby.add(Nearby{h.Boundary, h.DistanceKm, h.AzimuthDeg})
		}
	}
	// by distance: a list of six at the most
	items := a.Nearby.All()
	for i := 1; i < len(items); i++ {
		for j := i; j > 0 && items[j].DistanceKm < items[j-1].DistanceKm; j-- {
			items[j], items[j-1] = items[j-1], items[j]
		}
	}
}

func (l *Lookup) junction(p boundary.Place, a *Answer) {
	best, dot := -1, math.Cos(sphere.KmToRad(JunctionReachKm*1.006))
	for i := range l.m.junctions {
		if d := p.Vec.Dot(l.m.junctions[i].vec); d > dot {
			best, dot = i, d
		}
	}
	if best < 0 {
		return
	}
	j := &l.m.junctions[best]
	if km, _ := sphere.Inverse(p.LonLat, j.At); km <= JunctionReachKm {
		a.Junction, a.NearJunction = JunctionAnswer{j, km}, true
	}
}

// zoneAt returns the first zone that holds the place, nil where none does.
func (m *Model) zoneAt(p sphere.Vec) *Zone {
	for _, z := range m.c.Zones {
		if z.region.Contains(p) {
			return z
		}
	}
	return nil
}

func (m *Model) hotspotNear(p boundary.Place) (*Hotspot, float64) {
	best, dot := -1, math.Cos(sphere.KmToRad(HotspotReachKm*1.006))
	for i := range m.hotspots {
		if d := p.Vec.Dot(m.hotspots[i]); d > dot {
			best, dot = i, d
		}
	}
	if best < 0 {
		return nil, 0
	}
	h := &m.c.Hotspots[best]
	if km, _ := sphere.Inverse(p.LonLat, h.At); km <= HotspotReachKm {
		return h, km
	}
	return nil, 0
}
