package main

import (
	"context"
	"errors"
	"fmt"
	"os"
	"slices"
	"strings"
	"time"

	"golang.org/x/term"

	"nearmargin/api/annotate"
	"nearmargin/api/wire"
	"nearmargin/setting"
	"nearmargin/store"
)

// enrichOptions are the flags of annotate that are about a table in a database.
type enrichOptions struct {
	table, key, geometry string
	into, where          string
	dryRun               bool
}

func enrichFlags(f *flags) {
	o := &f.enrich
	f.databaseFlag("the database of the tables; its active edition answers unless --model names another")
	f.set.StringVar(&o.table, "table", "", "`table` to read: TABLE or SCHEMA.TABLE")
	f.set.StringVar(&o.key, "key", "id", "`column` of the table that tells its rows apart")
	f.set.StringVar(&o.geometry, "geometry", "geom", "`column` of points or polygons, geometry or geography in any SRID that PostGIS knows")
	f.set.StringVar(&o.into, "into", "", "`table` to write: made where there is none, brought up to date where there is")
	f.set.StringVar(&o.where, "where", "", "SQL `condition` on the rows to read; it goes to the server as it is, with your rights, so never take it from a stranger")
	f.set.BoolVar(&o.dryRun, "dry-run", false, "tell what would be read and written, and write nothing")
}

// wantsTable reports whether annotate is asked about a table in a database. That the
// environment names a database is not enough: it may be there for other commands.
func (f *flags) wantsTable() bool {
	return f.enrich.table != "" || f.enrich.into != "" || f.enrich.dryRun || f.typed("database")
}

// annotateTable annotates a table in a database.
func annotateTable(p *program, ctx context.Context, f *flags) error {
	if err := f.checkTable(); err != nil {
		return err
	}
	m, err := tableModel(ctx, f)
	if err != nil {
		return err
	}
	l, err := m.Lookup(setting.Options{Motion: f.motion, Fallback: f.fallback, Brief: true})
	if err != nil {
		return usageError("%v", err)
	}
	a, err := newTableAnswerer(ctx, f, l)
	if err != nil {
		return usageError("%v", err)
	}
	spec := a.spec(f)
	if f.enrich.dryRun {
		plan, err := store.PlanEnrich(ctx, f.database, spec)
		if err != nil {
			return err
		}
		return p.tellPlan(f, &spec, plan)
	}
	spec.Progress = p.enrichProgress()
	r, err := store.Enrich(ctx, f.database, spec)
	if spec.Progress != nil {
		fmt.Fprintln(p.stderr)
	}
	if err != nil {
		if r.Run > 0 {
			err = fmt.Errorf("%w; %d of %d rows are written, and the same command goes on from there", err, r.Rows, r.Total)
		}
		return err
	}
	if r.Changed > 0 {
		if err := store.WriteChanges(ctx, f.database, spec, r.Run, p.stdout); err != nil {
			return err
		}
	}
	fmt.Fprintf(p.stderr, "%s: run %d, %d rows, %d with an error, %d with another label than before, by %s\n", f.enrich.into, r.Run, r.Rows, r.Errors, r.Changed, spec.Ref)
	if r.Untouched > 0 {
		fmt.Fprintf(p.stderr, "%d rows of %s were not among those read, and stay as they were\n", r.Untouched, f.enrich.into)
	}
	if r.Errors > 0 {
		return fmt.Errorf("%w: %d of %d", errRows, r.Errors, r.Rows)
	}
	return nil
}

// checkTable refuses what makes no sense with a table.
func (f *flags) checkTable() error {
	if len(f.args) > 0 {
		return usageError("a table in a database takes no file, got %s", strings.Join(f.args, " "))
	}
	if err := f.needDatabase(); err != nil {
		return err
	}
	for _, name := range [...]string{"out", "format", "lon-column", "lat-column"} {
		if f.typed(name) {
			return usageError("--%s is about files; a table has --table, --key, --geometry and --into", name)
		}
	}
	switch o := &f.enrich; {
	case o.table == "":
		return usageError("--table is missing: the table to read")
	case o.into == "":
		return usageError("--into is missing: the table to write, such as %s_setting", o.table)
	case f.depthColumn == annotate.ThirdCoordinate:
		return usageError("--depth-column %s is about GeoJSON; name a column of the table", annotate.ThirdCoordinate)
	}
	return nil
}

// tableModel loads what answers: the database's active edition, or what --model names,
// an edition among it.
func tableModel(ctx context.Context, f *flags) (m *setting.Model, err error) {
	if f.given("model") && !strings.Contains(f.model, "@") {
		b, err := load(f.model)
		if err != nil {
			return nil, err
		}
		return b.Model, nil
	}
	return m, withStore(ctx, f, func(s *store.Store) error {
		ref := f.model
		if !f.given("model") {
			list, err := s.List(ctx)
			if err != nil {
				return fmt.Errorf("%w; or let the built-in model answer: --model builtin", err)
			}
			i := slices.IndexFunc(list, func(e store.Edition) bool { return e.Active })
			if i < 0 {
				return fmt.Errorf("%w; or let the built-in model answer: --model builtin", store.ErrNothingActive)
			}
			ref = list[i].Ref()
		}
		b, err := s.Load(ctx, ref)
		if err == nil {
			m = b.Model
		}
		return err
	})
}

// tellPlan prints what a run would do.
func (p *program) tellPlan(f *flags, spec *store.EnrichSpec, plan *store.EnrichPlan) error {
	w := p.stdout
	fmt.Fprintf(w, "would read %d rows of %s\n", plan.Rows, spec.Source)
	fmt.Fprintf(w, "  key       %s %s\n  geometry  %s %s\n", plan.Key.Name, plan.Key.Type, plan.Geometry.Name, plan.Geometry.Type)
	for _, x := range plan.Extra {
		fmt.Fprintf(w, "  read too  %s %s\n", x.Name, x.Type)
	}
	for _, k := range plan.Kinds {
		fmt.Fprintf(w, "  %d × %s, SRID %d\n", k.Rows, k.Type, k.SRID)
	}
	if plan.TargetExists {
		fmt.Fprintf(w, "would write into %s, which has %d rows, by %s\n", spec.Target, plan.TargetRows, spec.Ref)
	} else {
		fmt.Fprintf(w, "would make %s and write it, by %s\n", spec.Target, spec.Ref)
	}
	fmt.Fprintf(w, "  %s %s, the primary key\n", plan.Key.Name, plan.Key.Type)
	for _, c := range spec.Columns {
		fmt.Fprintf(w, "  %s %s\n", c.Name, c.Type)
	}
	if plan.KeyFault != "" {
		return errors.New(plan.KeyFault)
	}
	_, err := fmt.Fprintln(w, "nothing was written")
	return err
}

// enrichProgress returns a function that shows how far the work has come where
// standard error is a terminal; nil elsewhere.
func (p *program) enrichProgress() func(store.EnrichReport) {
	f, ok := p.stderr.(*os.File)
	if !ok || !term.IsTerminal(int(f.Fd())) {
		return nil
	}
	start, first := time.Now(), int64(-1)
	return func(r store.EnrichReport) {
		if first < 0 {
			first = r.Rows
		}
		rate := float64(r.Rows-first) / time.Since(start).Seconds()
		fmt.Fprintf(f, "\r%d of %d rows, %d with an error, %d changed, %.0f rows/s", r.Rows, r.Total, r.Errors, r.Changed, rate)
	}
}

// tableColumns are the columns that a table gains, with their types in SQL.
func tableColumns(prefix string) []store.EnrichColumn {
	var out []store.EnrichColumn
	for _, name := range wire.Columns {
		typ := "text"
		switch {
		case name == "side_uncertain":
			typ = "boolean"
		case strings.HasSuffix(name, "_km") || strings.HasSuffix(name, "_deg") || strings.HasSuffix(name, "_mm_yr"):
			typ = "double precision"
		}
		out = append(out, store.EnrichColumn{Name: prefix + name, Type: typ})
	}
	for _, c := range areaColumns {
		out = append(out, store.EnrichColumn{Name: prefix + c.Name, Type: c.Type})
	}
	return out
}
