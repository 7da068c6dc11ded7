package store

import (
	"context"
	"errors"
	"log/slog"

	"github.com/jackc/pgx/v5"
	"github.com/jackc/pgx/v5/stdlib"
	"github.com/pressly/goose/v3"
	"github.com/pressly/goose/v3/lock"

	"nearmargin/migrations"
)

// versionTable holds which migrations are applied.
const versionTable = "nearmargin.schema_version"

// Migrated is one migration that was applied.
type Migrated struct {
	Version int64
	File    string
}

// Migrate brings the schema to its newest version. Two at once do the work once.
func Migrate(ctx context.Context, url string) ([]Migrated, error) {
	var out []Migrated
	err := withProvider(ctx, url, func(p *goose.Provider) error {
		done, err := p.Up(ctx)
		if partial := (*goose.PartialError)(nil); errors.As(err, &partial) {
			done, err = partial.Applied, partial.Err
		}
		for _, r := range done {
			out = append(out, Migrated{r.Source.Version, r.Source.Path})
		}
		return err
	})
	return out, interpretError("migrate", "", err)
}

// withProvider runs migrations through goose. Its table of versions stands in the
// schema that it builds, so the schema is made first.
func withProvider(ctx context.Context, url string, use func(*goose.Provider) error) error {
	conn, err := connect(ctx, url)
	if err != nil {
		return err
	}
	err = pgx.BeginFunc(ctx, conn, func(tx pgx.Tx) error {
		// two at once would both find no schema, and the second would fail to make it
		if _, err := tx.Exec(ctx, `SELECT pg_advisory_xact_lock(@key)`, pgx.StrictNamedArgs{"key": importLock}); err != nil {
			return err
		}
		_, err := tx.Exec(ctx, `CREATE SCHEMA IF NOT EXISTS nearmargin`)
		return err
	})
	err = errors.Join(err, conn.Close(ctx))
	if err != nil {
		return err
	}
	cfg, err := pgx.ParseConfig(url)
	if err != nil {
		return err
	}
	db := stdlib.OpenDB(*cfg)
	defer db.Close()
	once, err := lock.NewPostgresSessionLocker()
	if err != nil {
		return err
	}
	p, err := goose.NewProvider(goose.DialectPostgres, db, migrations.FS,
		goose.WithTableName(versionTable), goose.WithSessionLocker(once), goose.WithSlog(slog.New(slog.DiscardHandler)))
	if err != nil {
		return err
	}
	return use(p)
}
