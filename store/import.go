package store

import (
	"context"
	"errors"
	"fmt"

	"github.com/jackc/pgx/v5"

	"nearmargin/setting/bundle"
	"nearmargin/setting/motion"
	"nearmargin/setting/slab"
	"nearmargin/setting/sphere"
)

// importLock is the key of the advisory lock that an import holds: "nearmarg" read
// as a number. Two imports at once would each hold up the other's rows for long.
const importLock int64 = 0x6e6561726d617267

const (
	// Where this program vanishes with its machine the server notices within a minute and
	// gives the lock back; by its own settings it may take two hours.
	vanishSQL = `SELECT set_config('tcp_keepalives_idle', '30', true), set_config('tcp_keepalives_interval', '10', true), set_config('tcp_keepalives_count', '3', true), set_config('tcp_user_timeout', '60000', true)`

	lockSQL  = `SELECT pg_try_advisory_xact_lock(@key)`
	modelSQL = `INSERT INTO nearmargin.models (model_id) VALUES (@model) ON CONFLICT DO NOTHING`

	editionSQL = `
INSERT INTO nearmargin.editions (model_id, edition, title, licence, citations, default_motion, sha256, warnings)
VALUES (@model, @edition, @title, @licence, @citations, @default_motion, @sha256, @warnings) RETURNING edition_id`

	plateSQL = `INSERT INTO nearmargin.plates (edition_id, code, name) VALUES (@e, @code, @name)`

	boundarySQL = `
INSERT INTO nearmargin.boundaries
    (edition_id, boundary_id, name, type, left_plate, right_plate, subducting_plate, sigma_km, source, source_status, path)
VALUES (@e, @id, @name, @type, @left, @right, nullif(@subducting, ''), @sigma_km, @source, @status, ST_GeogFromWKB(@path))`

	junctionSQL = `INSERT INTO nearmargin.junctions (edition_id, ordinal, name, at) VALUES (@e, @n, @name, ST_GeogFromWKB(@at))`

	motionSQL = `
INSERT INTO nearmargin.motion_models (edition_id, name, ordinal, title, frame, time_span, citation, relative_to, columns)
VALUES (@e, @name, @n, @title, @frame, @time_span, @citation, @relative_to, @columns)`

	velocitySQL = `
INSERT INTO nearmargin.angular_velocities (edition_id, motion, ordinal, plate, basis, wx_rad_myr, wy_rad_myr, wz_rad_myr, cells)
VALUES (@e, @motion, @n, @plate, @basis, @wx, @wy, @wz, @cells)`

	zoneSQL    = `INSERT INTO nearmargin.zones (edition_id, ordinal, name, kind, source, area) VALUES (@e, @n, @name, @kind, @source, ST_GeogFromWKB(@area))`
	hotspotSQL = `INSERT INTO nearmargin.hotspots (edition_id, ordinal, name, source, at) VALUES (@e, @n, @name, @source, ST_GeogFromWKB(@at))`
	warningSQL = `INSERT INTO nearmargin.warnings (edition_id, ordinal, code, lon, lat, detail) VALUES (@e, @n, @code, @lon, @lat, @detail)`
	landSQL    = `INSERT INTO nearmargin.land (edition_id, ordinal, name, outline) VALUES (@e, @n, @name, ST_GeogFromWKB(@outline))`

	slabSQL = `
INSERT INTO nearmargin.slabs
    (edition_id, slab_id, name, kind, subducting_plate, overriding_plate, arc_min_depth_km, source, source_status)
VALUES (@e, @id, @name, @kind, @subducting, @overriding, @arc_min_depth_km, @source, @status)`

	slabBoundarySQL = `INSERT INTO nearmargin.slab_boundaries (edition_id, slab_id, ordinal, boundary_id) VALUES (@e, @slab, @n, @id)`

	contourSQL = `
INSERT INTO nearmargin.slab_contours (edition_id, slab_id, ordinal, depth_km, sigma_km, path)
VALUES (@e, @slab, @n, @depth_km, @sigma_km, ST_GeogFromWKB(@path))`

	gridSQL = `INSERT INTO nearmargin.slab_grids (edition_id, slab_id, layer, gzipped, content) VALUES (@e, @slab, @layer, @gzipped, @content)`
)

// Import writes an edition, whole or not at all. The error is an ErrEditionExists
// where the edition is there, an ErrImportRunning where another import holds the
// lock.
func (s *Store) Import(ctx context.Context, b *bundle.Bundle) error {
	ref := b.Model.Ref()
	parts, err := b.Parts()
	if err != nil {
		return &Error{Op: "import", Ref: ref, Err: err}
	}
	err = pgx.BeginFunc(ctx, s.conn, func(tx pgx.Tx) error {
		if _, err := tx.Exec(ctx, vanishSQL); err != nil {
			return err
		}
		var alone bool
		if err := tx.QueryRow(ctx, lockSQL, pgx.StrictNamedArgs{"key": importLock}).Scan(&alone); err != nil {
			return err
		}
		if !alone {
			return &Error{Op: "import", Ref: ref, Kind: ErrImportRunning}
		}
		w := writer{tx: tx, ctx: ctx}
		if err := w.edition(b, parts); err != nil {
			return err
		}
		return w.contents(b, parts)
	})
	return interpretError("import", ref, err)
}

// writer puts an edition's rows into a transaction. Statements wait in a batch and
// go out together, a table at a time.
type writer struct {
	tx    pgx.Tx
	ctx   context.Context
	id    int64
	batch pgx.Batch
	err   error // the first fault of a row, before it is sent
}

func (w *writer) add(sql string, args pgx.StrictNamedArgs) {
	args["e"] = w.id
	w.batch.Queue(sql, args)
}

// bytes keeps the first error of an encoder.
func (w *writer) bytes(raw []byte, err error) []byte {
	w.err = errors.Join(w.err, err)
	return raw
}

// flush sends what waits.
func (w *writer) flush() error {
	if w.err != nil {
		return w.err
	}
	err := w.tx.SendBatch(w.ctx, &w.batch).Close()
	w.batch = pgx.Batch{}
	return err
}

func (w *writer) edition(b *bundle.Bundle, p bundle.Parts) error {
	warnings := []string{}
	for _, f := range b.Model.Network().Faults() {
		warnings = append(warnings, fmt.Sprintf("%.4f %.4f %s: %s", f.At.Lon, f.At.Lat, f.Code, f.Detail))
	}
	if _, err := w.tx.Exec(w.ctx, modelSQL, pgx.StrictNamedArgs{"model": p.ID}); err != nil {
		return err
	}
	return w.tx.QueryRow(w.ctx, editionSQL, pgx.StrictNamedArgs{
		"model": p.ID, "edition": p.Edition, "title": p.Title, "licence": p.Licence, "citations": p.Citations,
		"default_motion": p.DefaultMotion, "sha256": b.Model.SHA256(), "warnings": warnings,
	}).Scan(&w.id)
}

func (w *writer) contents(b *bundle.Bundle, p bundle.Parts) error {
	for _, x := range p.Plates {
		w.add(plateSQL, pgx.StrictNamedArgs{"code": x.Code, "name": x.Name})
	}
	for _, x := range p.Boundaries {
		w.add(boundarySQL, pgx.StrictNamedArgs{
			"id": x.ID(), "name": x.Name(), "type": x.Type().String(), "left": x.Left(), "right": x.Right(), "subducting": x.Subducting(),
			"sigma_km": x.SigmaKm(), "source": x.Source(), "status": string(x.SourceStatus()), "path": w.bytes(lineBytes(x.Path())),
		})
	}
	if err := w.flush(); err != nil {
		return err
	}
	w.motions(b, p.Motions)
	for i, x := range p.Junctions {
		w.add(junctionSQL, pgx.StrictNamedArgs{"n": i, "name": x.Name, "at": w.bytes(pointBytes(x.At))})
	}
	for i, x := range p.Zones {
		w.add(zoneSQL, pgx.StrictNamedArgs{"n": i, "name": x.Name, "kind": x.Kind.String(), "source": x.Source, "area": w.bytes(polygonBytes(x.Rings))})
	}
	for i, x := range p.Hotspots {
		w.add(hotspotSQL, pgx.StrictNamedArgs{"n": i, "name": x.Name, "source": x.Source, "at": w.bytes(pointBytes(x.At))})
	}
	for i, x := range p.Land {
		w.add(landSQL, pgx.StrictNamedArgs{"n": i, "name": x.Name, "outline": w.bytes(polygonBytes([][]sphere.LonLat{x.Ring}))})
	}
	for i, x := range p.Warnings {
		var lon, lat *float64
		if x.Placed {
			lon, lat = &x.At.Lon, &x.At.Lat
		}
		w.add(warningSQL, pgx.StrictNamedArgs{"n": i, "code": x.Code, "lon": lon, "lat": lat, "detail": x.Detail})
	}
	w.slabs(p.Slabs)
	if err := w.flush(); err != nil {
		return err
	}
	for _, g := range p.Grids { // one at a time: a grid may be large
		w.add(gridSQL, pgx.StrictNamedArgs{"slab": g.Slab, "layer": g.Layer, "gzipped": g.Gzipped, "content": g.Content})
		if err := w.flush(); err != nil {
			return err
		}
	}
	return nil
}

func (w *writer) motions(b *bundle.Bundle, tables []bundle.MotionTable) {
	for i, t := range tables {
		w.add(motionSQL, pgx.StrictNamedArgs{
			"name": t.Info.Name, "n": i, "title": t.Info.Title, "frame": t.Info.Frame, "time_span": t.Info.TimeSpan,
			"citation": t.Info.Citation, "relative_to": t.Info.RelativeTo, "columns": t.Columns,
		})
		m, _ := b.Model.Motion(t.Info.Name)
		entries := map[string]motion.Entry{}
		for _, e := range m.Entries() {
			entries[e.Plate] = e
		}
		for j, row := range t.Rows {
			e := entries[row[0]] // every form of the table starts with the plate
			w.add(velocitySQL, pgx.StrictNamedArgs{
				"motion": t.Info.Name, "n": j, "plate": e.Plate, "basis": e.Basis,
				"wx": e.Vector.X, "wy": e.Vector.Y, "wz": e.Vector.Z, "cells": row,
			})
		}
	}
}

func (w *writer) slabs(list []slab.Spec) {
	for _, x := range list {
		w.add(slabSQL, pgx.StrictNamedArgs{
			"id": x.ID, "name": x.Name, "kind": x.Kind.String(), "subducting": x.Subducting, "overriding": x.Overriding,
			"arc_min_depth_km": x.ArcMinDepthKm, "source": x.Source, "status": x.SourceStatus,
		})
		for i, id := range x.BoundaryIDs {
			w.add(slabBoundarySQL, pgx.StrictNamedArgs{"slab": x.ID, "n": i, "id": id})
		}
		for i, c := range slab.Contours(x.Surface) {
			w.add(contourSQL, pgx.StrictNamedArgs{"slab": x.ID, "n": i, "depth_km": c.DepthKm, "sigma_km": c.SigmaKm, "path": w.bytes(lineBytes(c.Path))})
		}
	}
}
