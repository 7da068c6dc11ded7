package store

import (
	"context"
	"fmt"

	"github.com/jackc/pgx/v5"

	"nearmargin/setting"
	"nearmargin/setting/boundary"
	"nearmargin/setting/bundle"
	"nearmargin/setting/motion"
	"nearmargin/setting/slab"
	"nearmargin/setting/sphere"
)

// Each of these reads one edition by the leading column of a primary key, in the
// order that the files have.
const (
	loadEditionSQL = `
SELECT edition_id, model_id, edition, title, licence, citations, default_motion, sha256
FROM nearmargin.editions WHERE model_id = @model AND edition = @edition`

	// The edition of a model that was activated last.
	activeOfModelSQL = `
SELECT e.edition FROM nearmargin.activations a JOIN nearmargin.editions e USING (edition_id)
WHERE e.model_id = @model ORDER BY a.activation_id DESC LIMIT 1`

	loadPlatesSQL     = `SELECT code, name FROM nearmargin.plates WHERE edition_id = @e ORDER BY code COLLATE "C"`
	loadBoundariesSQL = `
SELECT boundary_id, name, type, left_plate, right_plate, coalesce(subducting_plate, ''), sigma_km, source, source_status, ST_AsBinary(path)
FROM nearmargin.boundaries WHERE edition_id = @e ORDER BY boundary_id COLLATE "C"`
	loadJunctionsSQL = `SELECT name, ST_AsBinary(at) FROM nearmargin.junctions WHERE edition_id = @e ORDER BY ordinal`
	loadMotionsSQL   = `
SELECT name, title, frame, time_span, citation, relative_to, columns
FROM nearmargin.motion_models WHERE edition_id = @e ORDER BY ordinal`
	loadVelocitiesSQL = `SELECT motion, cells FROM nearmargin.angular_velocities WHERE edition_id = @e ORDER BY motion, ordinal`
	loadZonesSQL      = `SELECT name, kind, source, ST_AsBinary(area) FROM nearmargin.zones WHERE edition_id = @e ORDER BY ordinal`
	loadHotspotsSQL   = `SELECT name, source, ST_AsBinary(at) FROM nearmargin.hotspots WHERE edition_id = @e ORDER BY ordinal`
	loadWarningsSQL   = `SELECT code, lon, lat, detail FROM nearmargin.warnings WHERE edition_id = @e ORDER BY ordinal`
	loadLandSQL       = `SELECT name, ST_AsBinary(outline) FROM nearmargin.land WHERE edition_id = @e ORDER BY ordinal`
	loadSlabsSQL      = `
SELECT slab_id, name, kind, subducting_plate, overriding_plate, arc_min_depth_km, source, source_status
FROM nearmargin.slabs WHERE edition_id = @e ORDER BY slab_id COLLATE "C"`
	loadSlabBoundariesSQL = `SELECT slab_id, boundary_id FROM nearmargin.slab_boundaries WHERE edition_id = @e ORDER BY slab_id, ordinal`
	loadContoursSQL       = `
SELECT slab_id, depth_km, sigma_km, ST_AsBinary(path)
FROM nearmargin.slab_contours WHERE edition_id = @e ORDER BY slab_id, ordinal`
	loadGridsSQL = `SELECT slab_id, layer, gzipped, content FROM nearmargin.slab_grids WHERE edition_id = @e ORDER BY slab_id, layer`
)

// Load reads an edition, "id@edition" or "id" for the model's active one, and checks
// it as a directory is checked. The error is an ErrNoEdition where there is none; an
// ErrCorrupt where its rows make no model, or, as a ChecksumError, another model than
// was imported; an ErrUnavailable where the database says nothing for 15 s.
func (s *Store) Load(ctx context.Context, ref string) (*bundle.Bundle, error) {
	id, edition, err := splitRef(ref)
	if err != nil {
		return nil, &Error{Op: "load", Err: err}
	}
	r := reader{}
	snapshot := pgx.TxOptions{IsoLevel: pgx.RepeatableRead, AccessMode: pgx.ReadOnly}
	ctx, r.vigil = keepVigil(ctx, s.silence)
	err = pgx.BeginTxFunc(ctx, s.conn, snapshot, func(tx pgx.Tx) error {
		if edition == "" {
			if err := tx.QueryRow(ctx, activeOfModelSQL, pgx.StrictNamedArgs{"model": id}).Scan(&edition); err != nil {
				return err
			}
		}
		r.tx, r.ctx = tx, ctx
		if err := r.edition(id, edition); err != nil {
			return err
		}
		return r.contents()
	})
	if err = r.vigil.end(err); err != nil {
		return nil, interpretError("load", ref, err)
	}
	return r.bundle()
}

// reader collects an edition's rows.
type reader struct {
	tx     pgx.Tx
	ctx    context.Context
	vigil  *vigil
	id     int64
	sha256 string
	parts  bundle.Parts
}

// bundle makes the model and checks that it is the one that was imported.
func (r *reader) bundle() (*bundle.Bundle, error) {
	b, err := bundle.FromParts(r.parts)
	if err != nil {
		return nil, r.corrupt(err)
	}
	if made := b.Model.SHA256(); made != r.sha256 {
		sum := &ChecksumError{Ref: b.Model.Ref(), Stored: r.sha256, Made: made}
		return nil, &Error{Op: "load", Ref: sum.Ref, Err: sum}
	}
	return b, nil
}

// corrupt says that rows make no model.
func (r *reader) corrupt(err error) error {
	return &Error{Op: "load", Ref: r.parts.ID + "@" + r.parts.Edition, Kind: ErrCorrupt, Err: err}
}

// each scans every row of a query into the same variables and calls use after each;
// an error of use means that the row is corrupt.
func (r *reader) each(sql string, into []any, use func() error) error {
	rows, err := r.tx.Query(r.ctx, sql, pgx.StrictNamedArgs{"e": r.id})
	if err != nil {
		return err
	}
	_, err = pgx.ForEachRow(rows, into, func() error {
		r.vigil.heard()
		if err := use(); err != nil {
			return r.corrupt(err)
		}
		return nil
	})
	r.vigil.heard()
	return err
}

func (r *reader) edition(id, edition string) error {
	p := &r.parts
	return r.tx.QueryRow(r.ctx, loadEditionSQL, pgx.StrictNamedArgs{"model": id, "edition": edition}).
		Scan(&r.id, &p.ID, &p.Edition, &p.Title, &p.Licence, &p.Citations, &p.DefaultMotion, &r.sha256)
}

func (r *reader) contents() error {
	for _, read := range [...]func() error{r.plates, r.boundaries, r.junctions, r.motions, r.zones, r.hotspots, r.land, r.warnings, r.slabs, r.grids} {
		if err := read(); err != nil {
			return err
		}
	}
	return nil
}

func (r *reader) plates() error {
	var x setting.Plate
	return r.each(loadPlatesSQL, []any{&x.Code, &x.Name}, func() error {
		r.parts.Plates = append(r.parts.Plates, x)
		return nil
	})
}

func (r *reader) boundaries() error {
	var x boundary.Spec
	var kind, status string
	var raw []byte
	into := []any{&x.ID, &x.Name, &kind, &x.Left, &x.Right, &x.Subducting, &x.SigmaKm, &x.Source, &status, &raw}
	return r.each(loadBoundariesSQL, into, func() (err error) {
		if x.Type, err = boundary.ParseType(kind); err != nil {
			return fmt.Errorf("boundary %q: %w", x.ID, err)
		}
		if x.Path, err = readLine(raw); err != nil {
			return fmt.Errorf("boundary %q: %w", x.ID, err)
		}
		x.SourceStatus = boundary.SourceStatus(status)
		b, err := boundary.New(x)
		r.parts.Boundaries = append(r.parts.Boundaries, b)
		return err
	})
}

func (r *reader) junctions() error {
	var x bundle.Junction
	var raw []byte
	return r.each(loadJunctionsSQL, []any{&x.Name, &raw}, func() (err error) {
		x.At, err = readPoint(raw)
		r.parts.Junctions = append(r.parts.Junctions, x)
		return err
	})
}

func (r *reader) motions() error {
	var x motion.Info
	var columns []string
	at := map[string]int{}
	into := []any{&x.Name, &x.Title, &x.Frame, &x.TimeSpan, &x.Citation, &x.RelativeTo, &columns}
	err := r.each(loadMotionsSQL, into, func() error {
		at[x.Name] = len(r.parts.Motions)
		r.parts.Motions = append(r.parts.Motions, bundle.MotionTable{Info: x, Columns: columns})
		columns = nil
		return nil
	})
	if err != nil {
		return err
	}
	var name string
	var cells []string
	return r.each(loadVelocitiesSQL, []any{&name, &cells}, func() error {
		t := &r.parts.Motions[at[name]]
		t.Rows = append(t.Rows, cells)
		cells = nil
		return nil
	})
}

func (r *reader) zones() error {
	var x setting.Zone
	var kind string
	var raw []byte
	return r.each(loadZonesSQL, []any{&x.Name, &kind, &x.Source, &raw}, func() (err error) {
		if x.Kind, err = setting.ParseZoneKind(kind); err != nil {
			return fmt.Errorf("zone %q: %w", x.Name, err)
		}
		if x.Rings, err = readPolygon(raw); err != nil {
			return fmt.Errorf("zone %q: %w", x.Name, err)
		}
		z, err := setting.NewZone(setting.Zone{Name: x.Name, Kind: x.Kind, Source: x.Source, Rings: x.Rings})
		r.parts.Zones = append(r.parts.Zones, z)
		return err
	})
}

func (r *reader) hotspots() error {
	var x setting.Hotspot
	var raw []byte
	return r.each(loadHotspotsSQL, []any{&x.Name, &x.Source, &raw}, func() (err error) {
		x.At, err = readPoint(raw)
		r.parts.Hotspots = append(r.parts.Hotspots, x)
		return err
	})
}

func (r *reader) land() error {
	var name string
	var raw []byte
	return r.each(loadLandSQL, []any{&name, &raw}, func() error {
		rings, err := readPolygon(raw)
		if err == nil && len(rings) != 1 {
			err = fmt.Errorf("land %q: an outline has one ring, not %d", name, len(rings))
		}
		if err != nil {
			return err
		}
		l, err := setting.NewLand(name, rings[0])
		r.parts.Land = append(r.parts.Land, l)
		return err
	})
}

func (r *reader) warnings() error {
	var code, detail string
	var lon, lat *float64
	return r.each(loadWarningsSQL, []any{&code, &lon, &lat, &detail}, func() error {
		x := setting.Warning{Code: code, Detail: detail}
		if x.Placed = lon != nil && lat != nil; x.Placed {
			x.At = sphere.LonLat{Lon: *lon, Lat: *lat}
		}
		r.parts.Warnings = append(r.parts.Warnings, x)
		return nil
	})
}

func (r *reader) slabs() error {
	var id, other string
	boundaries := map[string][]string{}
	err := r.each(loadSlabBoundariesSQL, []any{&id, &other}, func() error {
		boundaries[id] = append(boundaries[id], other)
		return nil
	})
	if err != nil {
		return err
	}
	contours := map[string][]slab.Contour{}
	var c slab.Contour
	var raw []byte
	err = r.each(loadContoursSQL, []any{&id, &c.DepthKm, &c.SigmaKm, &raw}, func() (err error) {
		c.Path, err = readLine(raw)
		contours[id] = append(contours[id], c)
		return err
	})
	if err != nil {
		return err
	}
	var x slab.Spec
	var kind string
	into := []any{&x.ID, &x.Name, &kind, &x.Subducting, &x.Overriding, &x.ArcMinDepthKm, &x.Source, &x.SourceStatus}
	return r.each(loadSlabsSQL, into, func() (err error) {
		x.Kind, err = slab.ParseKind(kind)
		x.BoundaryIDs, x.Surface = boundaries[x.ID], nil
		if cs := contours[x.ID]; err == nil && len(cs) > 0 {
			x.Surface, err = slab.NewContours(cs)
		}
		if err != nil {
			return fmt.Errorf("slab %q: %w", x.ID, err)
		}
		r.parts.Slabs = append(r.parts.Slabs, x)
		return nil
	})
}

func (r *reader) grids() error {
	var x bundle.Grid
	return r.each(loadGridsSQL, []any{&x.Slab, &x.Layer, &x.Gzipped, &x.Content}, func() error {
		r.parts.Grids = append(r.parts.Grids, x)
		x.Content = nil
		return nil
	})
}
