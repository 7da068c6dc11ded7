package store

import (
	"context"
	"slices"
	"testing"

	"github.com/jackc/pgx/v5"
	"github.com/pressly/goose/v3"

	"nearmargin/store/storetest"
)

// objects lists what the schema holds besides goose's own table.
func objects(t *testing.T, url string) []string {
	t.Helper()
	rows, err := storetest.Conn(t, url).Query(context.Background(), `
		SELECT 'table ' || relname FROM pg_class c JOIN pg_namespace n ON n.oid = relnamespace
		WHERE nspname = 'nearmargin' AND relkind IN ('r', 'v', 'S', 'i') AND relname !~ '^schema_version'
		UNION ALL SELECT 'function ' || proname FROM pg_proc p JOIN pg_namespace n ON n.oid = pronamespace WHERE nspname = 'nearmargin'
		UNION ALL SELECT 'trigger ' || tgname || ' on ' || relname FROM pg_trigger g JOIN pg_class c ON c.oid = tgrelid
		JOIN pg_namespace n ON n.oid = relnamespace WHERE nspname = 'nearmargin' AND NOT tgisinternal
		ORDER BY 1`)
	if err != nil {
		t.Fatal(err)
	}
	out, err := pgx.CollectRows(rows, pgx.RowTo[string])
	if err != nil {
		t.Fatal(err)
	}
	return out
}

func TestMigrationsGoUpDownUp(t *testing.T) {
	url, ctx := storetest.Get(t).Empty(t), context.Background()
	done, err := Migrate(ctx, url)
	if err != nil || len(done) == 0 {
		t.Fatalf("%v, %v", done, err)
	}
	first := objects(t, url)
	if !slices.Contains(first, "trigger never_change on slab_grids") || !slices.Contains(first, "table boundaries_path") {
		t.Errorf("the schema has %v", first)
	}
	imported(t, url, model(t, "1"))
	err = withProvider(ctx, url, func(p *goose.Provider) error {
		_, err := p.DownTo(ctx, 0)
		return err
	})
	if err != nil {
		t.Fatal(err)
	}
	if left := objects(t, url); len(left) > 0 {
		t.Errorf("going down left %v", left)
	}
	if again, err := Migrate(ctx, url); err != nil || len(again) != len(done) {
		t.Fatalf("up again: %v, %v", again, err)
	}
	if second := objects(t, url); !slices.Equal(first, second) {
		t.Errorf("up, down and up made\n%v, at first\n%v", second, first)
	}
	if none, err := Migrate(ctx, url); err != nil || len(none) > 0 {
		t.Errorf("a migration of a newest schema did %v, %v", none, err)
	}
}

func TestMigrationsAtOnceDoTheWorkOnce(t *testing.T) {
	url, ctx := storetest.Get(t).Empty(t), context.Background()
	type outcome struct {
		done []Migrated
		err  error
	}
	results := make(chan outcome, 2)
	for range 2 {
		go func() {
			done, err := Migrate(ctx, url)
			results <- outcome{done, err}
		}()
	}
	a, b := <-results, <-results
	if a.err != nil || b.err != nil || (len(a.done) == 0) == (len(b.done) == 0) {
		t.Errorf("%v, %v and %v, %v; want one to do the work and the other to find it done", a.done, a.err, b.done, b.err)
	}
}
