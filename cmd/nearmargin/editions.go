package main

import (
	"context"
	"errors"
	"fmt"
	"strings"
	"text/tabwriter"
	"time"

	"nearmargin/setting/bundle"
	"nearmargin/setting/revision"
	"nearmargin/store"
)

const theDatabase = "the database of editions"

func migrateFlags(f *flags)  { f.databaseFlag(theDatabase) }
func importFlags(f *flags)   { f.databaseFlag(theDatabase) }
func listFlags(f *flags)     { f.databaseFlag(theDatabase) }
func activateFlags(f *flags) { f.databaseFlag(theDatabase) }
func diffFlags(f *flags)     { f.databaseFlag("where A or B is ID@EDITION in a database") }

// withStore connects to the database, and ends the connection.
func withStore(ctx context.Context, f *flags, use func(*store.Store) error) error {
	if err := f.needDatabase(); err != nil {
		return err
	}
	s, err := store.Connect(ctx, f.database)
	if err != nil {
		return err
	}
	return errors.Join(use(s), s.Close(context.WithoutCancel(ctx)))
}

// migrate brings the schema to its newest version.
func migrate(p *program, ctx context.Context, f *flags) error {
	if err := f.wantArgs(0, 0); err != nil {
		return err
	}
	if err := f.needDatabase(); err != nil {
		return err
	}
	done, err := store.Migrate(ctx, f.database)
	for _, m := range done {
		fmt.Fprintf(p.stdout, "applied %s\n", m.File)
	}
	if err == nil && len(done) == 0 {
		fmt.Fprintln(p.stdout, "the schema is the newest")
	}
	return err
}

// modelImport writes a model into a database.
func modelImport(p *program, ctx context.Context, f *flags) error {
	if err := f.wantArgs(1, 1); err != nil {
		return err
	}
	if err := f.needDatabase(); err != nil {
		return err
	}
	b, err := load(f.args[0])
	if err != nil {
		return err
	}
	return withStore(ctx, f, func(s *store.Store) error {
		if err := s.Import(ctx, b); err != nil {
			return err
		}
		faults := len(b.Model.Network().Faults())
		_, err := fmt.Fprintf(p.stdout, "%s imported: sha256 %s, %d warnings; make it active with \"nearmargin model activate %s\"\n", b.Model.Ref(), b.Model.SHA256(), faults, b.Model.Ref())
		return err
	})
}

// modelList lists the editions of a database.
func modelList(p *program, ctx context.Context, f *flags) error {
	if err := f.wantArgs(0, 0); err != nil {
		return err
	}
	return withStore(ctx, f, func(s *store.Store) error {
		list, err := s.List(ctx)
		if err != nil {
			return err
		}
		w := tabwriter.NewWriter(p.stdout, 0, 0, 2, ' ', 0)
		fmt.Fprintln(w, "edition\tstate\tsha256\twarnings\timported\tby\tlast activated\tby")
		for _, e := range list {
			state := "-"
			switch {
			case e.Active:
				state = "active"
			case e.ActiveOfModel:
				state = "active for model=" + e.Model
			}
			activated := "-"
			if !e.ActivatedAt.IsZero() {
				activated = e.ActivatedAt.UTC().Format(time.RFC3339)
			}
			fmt.Fprintf(w, "%s\t%s\t%.12s\t%d\t%s\t%s\t%s\t%s\n", e.Ref(), state, e.SHA256, len(e.Warnings), e.ImportedAt.UTC().Format(time.RFC3339), e.ImportedBy, activated, e.ActivatedBy)
		}
		return w.Flush()
	})
}

// modelActivate makes an edition the active one.
func modelActivate(p *program, ctx context.Context, f *flags) error {
	if err := f.wantArgs(1, 1); err != nil {
		return err
	}
	return withStore(ctx, f, func(s *store.Store) error {
		if err := s.Activate(ctx, f.args[0]); err != nil {
			return err
		}
		_, err := fmt.Fprintf(p.stdout, "%s is active\n", f.args[0])
		return err
	})
}

// modelDiff tells what changed from one model to another.
func modelDiff(p *program, ctx context.Context, f *flags) error {
	if err := f.wantArgs(2, 2); err != nil {
		return err
	}
	var both [2]*bundle.Bundle
	for i, name := range f.args {
		var err error
		if !strings.Contains(name, "@") {
			both[i], err = load(name)
		} else {
			err = withStore(ctx, f, func(s *store.Store) (err error) {
				both[i], err = s.Load(ctx, name)
				return err
			})
		}
		if err != nil {
			return err
		}
	}
	_, err := fmt.Fprint(p.stdout, revision.Compare(both[0].Model, both[1].Model).Text())
	return err
}
