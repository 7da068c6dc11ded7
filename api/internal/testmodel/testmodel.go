// Package testmodel builds the small made-up model that the tests of api and its
// packages answer from, so that none depends on the built-in data.
//
// Six plates divide the globe along the meridians 180°, 120°W, 60°W, 0°, 60°E
// and 120°E, from pole to pole. Each meridian is cut into runs of one type, so
// that every type of boundary occurs; the line along 180° zigzags across it. The
// eastern subduction boundary south of the equator has a slab, that north of it none.
package testmodel

import (
	"strconv"
	"strings"
	"testing"

	"nearmargin/setting"
	"nearmargin/setting/boundary"
	"nearmargin/setting/motion"
	"nearmargin/setting/slab"
	"nearmargin/setting/sphere"
)

// The model's name and edition.
const (
	ID      = "made-up"
	Edition = "7"
)

// The motion models: Full has all plates, one of them composed; Partial lacks GG.
const (
	Full    = "full"
	Partial = "partial"
)

// plates lie between one meridian and the next, from 180° eastward. One has the
// code NA; one has a name that needs escapes.
var plates = []setting.Plate{
	{Code: "PP", Name: "Pelagia"}, {Code: "NA", Name: "North America"}, {Code: "EE", Name: `Eth "E" <old> & süd`},
	{Code: "FF", Name: "Farland"}, {Code: "GG", Name: "Gorge"}, {Code: "HH", Name: "Highland"},
}

// run is one type of boundary on a meridian, up to a latitude.
type run struct {
	to    float64
	kind  boundary.Type
	sinks string
}

var meridians = []struct {
	lon         float64
	west, east  string
	runs        []run
	offsets     map[float64]float64 // of longitude, at latitudes where the line bends
	name        string
	uncertainKm float64
}{
	{180, "HH", "PP", []run{{-60, boundary.SpreadingRidge, ""}, {60, boundary.Subduction, "PP"}, {90, boundary.SpreadingRidge, ""}},
		map[float64]float64{-30: -6, 0: 6, 30: -6}, "Dateline", 8},
	{-120, "PP", "NA", []run{{0, boundary.SpreadingRidge, ""}, {90, boundary.SpreadingRidge, ""}}, nil, "West", 2},
	{-60, "NA", "EE", []run{{-30, boundary.SpreadingRidge, ""}, {30, boundary.ContinentalRift, ""}, {90, boundary.SpreadingRidge, ""}}, nil, "Rift", 5},
	{0, "EE", "FF", []run{{-40, boundary.SpreadingRidge, ""}, {-10, boundary.ContinentalTransform, ""}, {10, boundary.SpreadingRidge, ""}, {40, boundary.ContinentalTransform, ""}, {90, boundary.SpreadingRidge, ""}}, nil, "Middle", 4},
	{60, "FF", "GG", []run{{-20, boundary.SpreadingRidge, ""}, {0, boundary.Subduction, "FF"}, {20, boundary.Subduction, "FF"}, {50, boundary.ContinentalConvergent, "FF"}, {90, boundary.OceanicConvergent, ""}}, nil, "East", 10},
	{120, "GG", "HH", []run{{-30, boundary.SpreadingRidge, ""}, {0, boundary.OceanicTransform, ""}, {40, boundary.ContinentalConvergent, ""}, {90, boundary.SpreadingRidge, ""}}, nil, "Far", 6},
}

// New builds the model.
func New(tb testing.TB) *setting.Model { return Named(tb, ID, Edition) }

// Named builds the model under another name or edition.
func Named(tb testing.TB, id, edition string) *setting.Model {
	tb.Helper()
	m, err := setting.NewModel(setting.Contents{
		ID: id, Edition: edition, Title: "A made-up globe", Licence: "CC0-1.0",
		SHA256:     strings.Repeat("0123456789abcdef", 4),
		Citations:  []string{"Nobody (1999), A made-up globe."},
		Plates:     plates,
		Boundaries: boundaries(tb),
		JunctionNames: map[sphere.LonLat]string{
			{Lon: 0, Lat: 90}: "North pole junction",
		},
		Motions: []*motion.Model{motions(tb, Full), motions(tb, Partial)}, DefaultMotion: Full,
		Zones: []*setting.Zone{
			zone(tb, `Belt "of" shear`, setting.ShearKind, 25, -10, 35, 10),
			zone(tb, "Mixed belt", setting.MixedKind, 85, -10, 95, 10),
			zone(tb, "Broad collision", setting.CollisionKind, 56, 22, 66, 45),
		},
		Slabs:    []*slab.Slab{eastSlab(tb)},
		Hotspots: []setting.Hotspot{{Name: "Plume, the", At: sphere.LonLat{Lon: -90, Lat: 20}, Source: "made up"}},
	})
	if err != nil {
		tb.Fatal(err)
	}
	return m
}

func boundaries(tb testing.TB) []*boundary.Boundary {
	tb.Helper()
	var out []*boundary.Boundary
	used := map[string]int{}
	for _, m := range meridians {
		from := -90.0
		for _, r := range m.runs {
			s := boundary.Spec{
				ID: strings.ToLower(m.name) + "-" + r.kind.String(), Name: m.name + " " + r.kind.String(), Type: r.kind,
				Left: m.west, Right: m.east, Subducting: r.sinks, SigmaKm: m.uncertainKm, Source: "made up", SourceStatus: boundary.FromMemory,
			}
			if used[s.ID]++; used[s.ID] > 1 {
				s.ID += "-" + strconv.Itoa(used[s.ID])
			}
			for lat := from; ; lat += 10 {
				lat = min(lat, r.to)
				s.Path = append(s.Path, sphere.LonLat{Lon: m.lon + m.offsets[lat], Lat: lat})
				if lat == r.to {
					break
				}
			}
			b, err := boundary.New(s)
			if err != nil {
				tb.Fatal(err)
			}
			out = append(out, b)
			from = r.to
		}
	}
	return out
}

func motions(tb testing.TB, name string) *motion.Model {
	tb.Helper()
	var entries []motion.Entry
	for i, p := range plates {
		if name == Partial && p.Code == "GG" {
			continue
		}
		pole := motion.Pole{Lat: 60 - 20*float64(i), Lon: 70 * float64(i%3), RateDegMyr: 0.2 + 0.1*float64(i)}
		e := motion.Entry{Plate: p.Code, Vector: pole.Vector(), Basis: motion.Published}
		var err error
		switch i % 3 {
		case 0:
			e.Spread, err = motion.RateSpread(0.01, pole.RateDegMyr)
		default:
			e.Spread, err = motion.ComponentSpread(sphere.Vec{X: 1e-4, Y: 2e-4, Z: 1e-4})
		}
		if err != nil {
			tb.Fatal(err)
		}
		if p.Code == "HH" {
			e.Basis, e.Spread = motion.Composed("PP"), motion.NoSpread()
		}
		entries = append(entries, e)
	}
	info := motion.Info{Name: name, Title: "Motions, " + name, Frame: "made up", TimeSpan: "none", Citation: "Nobody (1999)"}
	if name == Partial {
		info.RelativeTo = "PP"
	}
	m, err := motion.NewModel(info, entries)
	if err != nil {
		tb.Fatal(err)
	}
	return m
}

func zone(tb testing.TB, name string, kind setting.ZoneKind, w, s, e, n float64) *setting.Zone {
	tb.Helper()
	z, err := setting.NewZone(setting.Zone{Name: name, Kind: kind, Source: "made up", Rings: [][]sphere.LonLat{
		{{Lon: w, Lat: s}, {Lon: e, Lat: s}, {Lon: e, Lat: n}, {Lon: w, Lat: n}, {Lon: w, Lat: s}},
	}})
	if err != nil {
		tb.Fatal(err)
	}
	return z
}

// eastSlab goes down eastward from the boundary at 60°E, between 18°S and 1°S.
func eastSlab(tb testing.TB) *slab.Slab {
	tb.Helper()
	var contours []slab.Contour
	for _, c := range []struct{ lon, depthKm float64 }{{60.4, 20}, {61, 60}, {62, 120}, {64, 260}, {67, 500}} {
		line := slab.Contour{DepthKm: c.depthKm, SigmaKm: 8}
		for lat := -18.0; lat <= -1; lat++ {
			line.Path = append(line.Path, sphere.LonLat{Lon: c.lon, Lat: lat})
		}
		contours = append(contours, line)
	}
	surface, err := slab.NewContours(contours)
	if err != nil {
		tb.Fatal(err)
	}
	s, err := slab.New(slab.Spec{
		ID: "east", Name: "East slab", Kind: slab.Subduction, BoundaryIDs: []string{"east-subduction"},
		Subducting: "FF", Overriding: "GG", ArcMinDepthKm: 75, Source: "made up", SourceStatus: "memory", Surface: surface,
	})
	if err != nil {
		tb.Fatal(err)
	}
	return s
}
