package setting

import (
	"cmp"
	"context"
	"math"
	"slices"

	"nearmargin/setting/boundary"
	"nearmargin/setting/slab"
	"nearmargin/setting/sphere"
)

// How many places an area is sampled at. A plate is found ten times as fast as a
// setting, so it is looked for at more, unless no boundary crosses the area.
const (
	areaPlatePoints   = 4000
	areaSettingPoints = 500
)

// Area answers for an area into out, which is overwritten. It stops with the
// context's error where that ends; an area of many positions may take seconds.
//
// Accuracy: area to 1e-12, lengths of boundaries to a millimetre; shares of
// plates, settings and slabs as out.Sampling says.
func (l *Lookup) Area(ctx context.Context, a *Area, out *AreaAnswer) error {
	*out = AreaAnswer{AreaKm2: a.km2, Model: l.m, MotionModel: l.motion.Name()}
	l.areaBoundaries(ctx, a, out)
	l.areaPlates(ctx, a, out)
	if err := ctx.Err(); err != nil {
		return err
	}
	l.areaNearest(a, out)
	l.areaSettings(ctx, a, out)
	if err := ctx.Err(); err != nil {
		return err
	}
	l.areaNotes(out)
	return nil
}

// tally gives a number to each of the classes met, and adds up their weights.
type tally[K comparable] struct {
	number map[K]uint16
	keys   []K
	weight []float64
}

func (t *tally[K]) add(k K, weight float64) uint16 {
	n, ok := t.number[k]
	if !ok {
		if t.number == nil {
			t.number = map[K]uint16{}
		}
		n = uint16(len(t.keys)) // #nosec G115 -- a class has a place, of which there are 4,000 to 5,000
		t.number[k] = n
		t.keys, t.weight = append(t.keys, k), append(t.weight, 0)
	}
	t.weight[n] += weight
	return n
}

// each calls f for each class, from the greatest weight; ties go to the class
// met first.
func (t *tally[K]) each(f func(k K, weight float64)) {
	order := make([]int, len(t.keys))
	for i := range order {
		order[i] = i
	}
	slices.SortStableFunc(order, func(i, j int) int { return cmp.Compare(t.weight[j], t.weight[i]) })
	for _, i := range order {
		f(t.keys[i], t.weight[i])
	}
}

// areaPlates finds the shares of plates; of what it leaves where the context ends
// nothing is to be used.
func (l *Lookup) areaPlates(ctx context.Context, a *Area, out *AreaAnswer) {
	points := areaPlatePoints
	if len(out.Boundaries) == 0 { // all of one plate, or the network has faults
		points = areaSettingPoints
	}
	g := a.sample(points)
	class := make([]uint16, len(g.at))
	clear := make([]float64, len(g.at))
	var t tally[string]
	for _, p := range g.parts {
		steps := p.steps()
		for i := p.from; i < p.to; i++ {
			if ctx.Err() != nil {
				return
			}
			// a neighbour already looked up, if nearer than its nearest boundary, has the same plate
			for _, step := range steps {
				j := i - step
				if j < p.from {
					continue
				}
				if left := clear[j] - sphere.Angle(g.at[i].At, g.at[j].At); left > 0 {
					class[i], clear[i] = class[j], left
					t.weight[class[i]] += g.at[i].Weight
					break
				}
			}
			if clear[i] == 0 {
				var plate string
				plate, clear[i] = l.m.network.PlateAt(g.at[i].At)
				class[i] = t.add(plate, g.at[i].Weight)
			}
		}
	}
	t.each(func(code string, w float64) {
		out.Plates = append(out.Plates, PlateShare{l.m.plates[code], w})
	})
	out.Sampling.PlatePoints, out.Sampling.PlateSpacingKm = len(g.at), g.spacingKm(a.km2)
	out.Sampling.PlateStandardError = g.standardError(class, len(t.keys))
}

// areaBoundaries clips the boundaries to the area, some of them where the context ends.
func (l *Lookup) areaBoundaries(ctx context.Context, a *Area, out *AreaAnswer) {
	index := map[*boundary.Boundary]int{}
	var motions []motionRange
	for _, s := range a.shapes {
		for p := range l.m.network.Inside(s) {
			if ctx.Err() != nil {
				return
			}
			i, ok := index[p.Boundary]
			if !ok {
				i = len(motions)
				index[p.Boundary] = i
				motions = append(motions, newMotionRange())
				out.Boundaries = append(out.Boundaries, BoundaryInside{Boundary: p.Boundary})
			}
			b := &out.Boundaries[i]
			b.LengthKm += p.LengthKm
			if p.LengthKm > b.longest.LengthKm {
				b.longest = p
			}
			motions[i].add(l, &p)
		}
	}
	for i := range motions {
		out.Boundaries[i].Motion = motions[i].r
	}
	slices.SortFunc(out.Boundaries, func(a, b BoundaryInside) int {
		return cmp.Or(cmp.Compare(b.LengthKm, a.LengthKm), cmp.Compare(a.Boundary.ID(), b.Boundary.ID()))
	})
}

// areaNearest finds the boundary nearest to the area.
func (l *Lookup) areaNearest(a *Area, out *AreaAnswer) {
	var at sphere.Vec
	crossed := len(out.Boundaries) > 0
	if crossed {
		at = out.Boundaries[0].longest.Arc.Midpoint()
	} else {
		best := math.Inf(1)
		for _, s := range a.shapes {
			if v, rad := l.m.network.NearestToOutline(s); rad < best {
				at, best = v, rad
			}
		}
	}
	place := boundary.PlaceAt(at.LonLat())
	code, hit := l.m.network.Locate(place)
	if crossed {
		hit.DistanceKm, hit.AzimuthDeg = 0, math.NaN()
	}
	site := Answer{Site: SiteAt(place.LonLat.Lon, place.LonLat.Lat), Plate: l.m.plates[code]}
	out.Nearest = l.boundaryAnswer(&site, hit)
}

// labelled is a class of settings.
type labelled struct {
	label  Label
	family Family
}

// areaSettings labels the places of a lattice and reads the slabs below them, some of
// them where the context ends.
func (l *Lookup) areaSettings(ctx context.Context, a *Area, out *AreaAnswer) {
	near := l.nearArea(a)
	g := a.sample(areaSettingPoints)
	class := make([]uint16, len(g.at))
	var t tally[labelled]
	depths := map[*slab.Slab][]weighted{}
	var site Answer
	var e evidence
	for i, s := range g.at {
		if ctx.Err() != nil {
			return
		}
		place := boundary.PlaceAt(s.At.LonLat())
		plate, _ := l.m.network.PlateAt(s.At)
		site.Plate, site.Zone = l.m.plates[plate], near.m.zoneAt(s.At)
		near.gather(place, site.Plate.Code, &site, &e)
		v, _ := e.decide()
		class[i] = t.add(labelled{v.label, v.label.family(e.zone)}, s.Weight)
		for j := range e.slabs[:e.nSlabs] {
			if x := &e.slabs[j]; x.beyond == slab.NotBeyond {
				depths[x.slab] = append(depths[x.slab], weighted{x.z, s.Weight, i})
			}
		}
	}
	t.each(func(k labelled, w float64) {
		out.Settings = append(out.Settings, SettingShare{k.label, k.family, w})
	})
	out.Sampling.Points, out.Sampling.SpacingKm = len(g.at), g.spacingKm(a.km2)
	out.Sampling.StandardError = g.standardError(class, len(t.keys))
	for _, s := range near.m.c.Slabs {
		ds := depths[s]
		if ds == nil {
			continue
		}
		over := make([]uint16, len(g.at))
		for _, d := range ds {
			over[d.place] = 1
		}
		out.Sampling.StandardError = max(out.Sampling.StandardError, g.standardError(over, 2))
		out.Slabs = append(out.Slabs, slabShare(s, ds))
	}
	slices.SortStableFunc(out.Slabs, func(a, b SlabShare) int { return cmp.Compare(b.Fraction, a.Fraction) })
}

// weighted is a depth with the weight of the place it was met at.
type weighted struct {
	km, weight float64
	place      int
}

// slabShare adds up what was met of one slab. The median depth is that above
// which half of the area over the slab lies.
func slabShare(s *slab.Slab, ds []weighted) SlabShare {
	slices.SortFunc(ds, func(a, b weighted) int { return cmp.Or(cmp.Compare(a.km, b.km), cmp.Compare(a.place, b.place)) })
	out := SlabShare{Slab: s, MinDepthKm: ds[0].km, MedianDepthKm: ds[0].km, MaxDepthKm: ds[len(ds)-1].km}
	for _, d := range ds {
		out.Fraction += d.weight
	}
	below := 0.0
	for _, d := range ds {
		if below += d.weight; below >= out.Fraction/2 {
			out.MedianDepthKm = d.km
			break
		}
	}
	return out
}

// nearArea returns the look-up on a model without the slabs, zones and land that
// are nowhere near the area: the answers are the same, and found faster.
func (l *Lookup) nearArea(a *Area) *Lookup {
	m := *l.m
	m.c.Slabs, m.slabTies, m.c.Zones, m.c.Land = nil, nil, nil, nil
	const reachKm = 200 // farther than a slab past whose rim a site lies has a say
	for i, s := range l.m.c.Slabs {
		if slices.ContainsFunc(a.shapes, func(shape sphere.Shape) bool {
			centre, rad := shape.Cap()
			if _, in := s.Surface.At(centre); in {
				return true
			}
			_, within := s.Surface.Outside(centre, sphere.RadToKm(rad)+reachKm)
			return within
		}) {
			m.c.Slabs, m.slabTies = append(m.c.Slabs, s), append(m.slabTies, l.m.slabTies[i])
		}
	}
	for _, z := range l.m.c.Zones {
		if slices.ContainsFunc(a.shapes, func(s sphere.Shape) bool { return z.region.Near(s.Cap()) }) {
			m.c.Zones = append(m.c.Zones, z)
		}
	}
	for _, z := range l.m.c.Land {
		if slices.ContainsFunc(a.shapes, func(s sphere.Shape) bool { return z.region.Near(s.Cap()) }) {
			m.c.Land = append(m.c.Land, z)
		}
	}
	near := *l
	near.m = &m
	return &near
}

func (l *Lookup) areaNotes(out *AreaAnswer) {
	var notes Answer
	for i := range out.Boundaries {
		b := &out.Boundaries[i]
		m := l.relative(b.Boundary.Right(), b.Boundary.Left(), &boundary.Hit{Boundary: b.Boundary, NearestVec: b.longest.Arc.A, Along: b.longest.Arc.Tangent(b.longest.Arc.A)})
		l.motionNotes(&notes, &m)
	}
	l.motionNotes(&notes, &out.Nearest.Motion)
	if len(l.m.c.Slabs) == 0 && slices.ContainsFunc(out.Settings, func(s SettingShare) bool { return s.Family == SubductionFamily }) {
		notes.note(Note{Code: NoteNoSlabs})
	}
	out.Notes = notes.Notes
	out.Notes.n = min(out.Notes.n, maxList-1)
	out.Notes.add(Note{Code: NoteScreening})
}
