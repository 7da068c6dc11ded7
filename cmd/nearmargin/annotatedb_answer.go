package main

import (
	"context"
	"fmt"
	"math"
	"slices"
	"strings"

	"github.com/paulmach/orb"
	"github.com/paulmach/orb/encoding/wkb"
	"github.com/tidwall/gjson"

	"nearmargin/api/annotate"
	"nearmargin/api/wire"
	"nearmargin/setting"
	"nearmargin/setting/sphere"
	"nearmargin/store"
)

// areaColumns are those that polygons fill besides.
var areaColumns = [...]store.EnrichColumn{
	{Name: "plate_fraction", Type: "double precision"},
	{Name: "setting_fraction", Type: "double precision"},
	{Name: "area_km2", Type: "double precision"},
	{Name: "area", Type: "jsonb"},
}

// areaPaths are the places in an area's answer, as it goes over the wire, from which
// a polygon's columns come: the largest share of plate, setting and slab.
var areaPaths = map[string]string{
	"plate": "plates.0.code", "setting": "settings.0.label", "family": "settings.0.family",
	"boundary_id": "nearest_boundary.id", "boundary_type": "nearest_boundary.type",
	"distance_km": "nearest_boundary.distance_km", "distance_sigma_km": "nearest_boundary.distance_sigma_km",
	"azimuth_deg": "nearest_boundary.azimuth_deg",
	"rate_mm_yr":  "nearest_boundary.relative_motion.rate_mm_yr", "rate_sigma_mm_yr": "nearest_boundary.relative_motion.rate_sigma_mm_yr",
	"rate_azimuth_deg": "nearest_boundary.relative_motion.azimuth_deg", "opening_mm_yr": "nearest_boundary.relative_motion.opening_mm_yr",
	"shear_mm_yr": "nearest_boundary.relative_motion.shear_mm_yr", "obliquity_deg": "nearest_boundary.relative_motion.obliquity_deg",
	"motion_model": "nearest_boundary.relative_motion.motion_model",
	"slab":         "slabs.0.slab", "slab_depth_km": "slabs.0.median_depth_km",
	"plate_fraction": "plates.0.fraction", "setting_fraction": "settings.0.fraction", "area_km2": "area_km2",
}

// tableAnswerer answers for the rows of a table.
type tableAnswerer struct {
	ctx                           context.Context // of the run
	look                          *setting.Lookup
	options                       annotate.Options
	extra                         []string
	depth, elevation, uncertainty int // places in extra, -1 for none
	answer                        setting.Answer
	cells                         wire.Cells
	area                          setting.AreaAnswer
	json                          []byte
}

func newTableAnswerer(ctx context.Context, f *flags, l *setting.Lookup) (*tableAnswerer, error) {
	a := &tableAnswerer{ctx: ctx, look: l, options: annotate.Options{
		Lookup: l, DepthColumn: f.depthColumn, UncertaintyColumn: f.uncertaintyCol, Prefix: f.prefix,
		DepthUnit: f.depthUnit, DepthDatum: f.depthDatum, ElevationColumn: f.elevationColumn,
	}}
	place := func(column string) int {
		if column == "" {
			return -1
		}
		if i := slices.Index(a.extra, column); i >= 0 {
			return i
		}
		a.extra = append(a.extra, column)
		return len(a.extra) - 1
	}
	a.depth, a.elevation, a.uncertainty = place(f.depthColumn), place(f.elevationColumn), place(f.uncertaintyCol)
	return a, a.options.Check()
}

// spec says what the flags ask for.
func (a *tableAnswerer) spec(f *flags) store.EnrichSpec {
	m, o := a.look.Model(), &a.options
	return store.EnrichSpec{
		Source: f.enrich.table, Key: f.enrich.key, Geometry: f.enrich.geometry, Extra: a.extra, Where: f.enrich.where, Target: f.enrich.into,
		Columns: tableColumns(o.Prefix), Label: o.Prefix + "setting", Ref: m.Ref(), SHA256: m.SHA256(),
		Options:      strings.Join([]string{f.motion, f.fallback, o.Prefix, o.DepthColumn, o.DepthUnit, o.DepthDatum, o.ElevationColumn, o.UncertaintyColumn}, "\x1f"),
		MaxPositions: setting.MaxAreaPositions,
		Answer:       a.ask,
	}
}

// ask answers for one row.
func (a *tableAnswerer) ask(q store.EnrichAsk) error {
	area, err := a.answerRow(q.Row)
	if err != nil {
		a.cells.SetError(strings.ToValidUTF8(strings.ReplaceAll(err.Error(), "\x00", ""), "\uFFFD"))
		q.Fail()
	}
	if area && err == nil {
		a.putArea(q)
		return nil
	}
	for i := range wire.NumColumns {
		q.Put(a.cells.Value(i))
	}
	for range areaColumns {
		q.Put(nil)
	}
	return nil
}

// answerRow fills the cells, or the answer for an area.
func (a *tableAnswerer) answerRow(r *store.EnrichRow) (area bool, err error) {
	if r.WKB == nil {
		return false, fmt.Errorf("%s", r.Fault)
	}
	g, err := wkb.Unmarshal(r.WKB)
	if err != nil {
		return false, fmt.Errorf("the geometry cannot be read: %w; it must be a point, a polygon or several polygons", err)
	}
	switch g := g.(type) {
	case orb.Point:
		return false, a.point(r, g)
	case orb.Polygon:
		return true, a.polygons(orb.MultiPolygon{g})
	case orb.MultiPolygon:
		return true, a.polygons(g)
	}
	return false, fmt.Errorf("the geometry is a %s; it must be a Point, a Polygon or a MultiPolygon", g.GeoJSONType())
}

func (a *tableAnswerer) point(r *store.EnrichRow, p orb.Point) error {
	cell := func(i int) string {
		if i < 0 {
			return ""
		}
		return r.Extra[i]
	}
	s, err := a.options.SiteAt(p[0], p[1], cell(a.depth), cell(a.uncertainty), cell(a.elevation))
	if err != nil {
		return err
	}
	if err := a.look.At(s, &a.answer); err != nil {
		return err
	}
	a.cells.Set(&a.answer)
	return nil
}

func (a *tableAnswerer) polygons(list orb.MultiPolygon) error {
	polygons := make([][][]sphere.LonLat, len(list))
	for i, p := range list {
		for _, ring := range p {
			out := make([]sphere.LonLat, len(ring))
			for k, at := range ring {
				if math.IsNaN(at[0]) || math.IsInf(at[0], 0) || math.IsNaN(at[1]) || math.IsInf(at[1], 0) {
					return fmt.Errorf("polygon %d has a position of which WGS84 knows nothing: %g %g", i, at[0], at[1])
				}
				out[k] = sphere.LonLat{Lon: at[0], Lat: at[1]}
			}
			polygons[i] = append(polygons[i], out)
		}
	}
	area, err := setting.NewArea(polygons...)
	if err != nil {
		return err
	}
	if err := a.look.Area(a.ctx, area, &a.area); err != nil {
		return err
	}
	a.json = wire.AppendArea(a.json[:0], &a.area)
	return nil
}

// putArea writes a polygon's columns: all of its answer as JSON, and from it what the
// columns of points hold.
func (a *tableAnswerer) putArea(q store.EnrichAsk) {
	var buf []byte
	put := func(name string) {
		buf = buf[:0]
		switch name {
		case "model":
			buf = append(buf, a.look.Model().Ref()...)
		case "notes":
			for i, note := range gjson.GetBytes(a.json, "notes.#.code").Array() {
				if i > 0 {
					buf = append(buf, ';')
				}
				buf = append(buf, note.Str...)
			}
		case "area":
			buf = append(buf, a.json...)
		default:
			if path, ok := areaPaths[name]; ok {
				if v := gjson.GetBytes(a.json, path); v.Type != gjson.Null {
					buf = append(buf, v.String()...)
				}
			}
		}
		q.Put(buf)
	}
	for _, name := range wire.Columns {
		put(name)
	}
	for _, c := range areaColumns {
		put(c.Name)
	}
}
