package store

import (
	"bytes"
	"compress/gzip"
	"context"
	"errors"
	"fmt"
	"strings"
	"testing"
	"testing/fstest"
	"time"

	"nearmargin/setting/builtin"
	"nearmargin/setting/bundle"
	"nearmargin/store/storetest"
)

// gridded returns the built-in model with the contours of one slab replaced by a
// grid of two layers, one of them compressed.
func gridded(t testing.TB) *bundle.Bundle {
	t.Helper()
	return edited(t, func(dir fstest.MapFS) {
		var kept []string
		slab := ""
		for _, line := range strings.Split(string(dir["slabs/contours.geojson"].Data), "\n") {
			if _, after, ok := strings.Cut(line, `"slab":"`); ok {
				id, _, _ := strings.Cut(after, `"`)
				if slab == "" {
					slab = id
				}
				if id == slab {
					continue
				}
			}
			kept = append(kept, line)
		}
		dir["slabs/contours.geojson"].Data = []byte(strings.Join(kept, "\n"))
		var depth, sigma bytes.Buffer
		z := gzip.NewWriter(&sigma)
		for row := range 4 {
			for col := range 4 {
				fmt.Fprintf(&depth, "%d,%d,%d.50\n", 170+col, -30+row, 20+10*col)
				fmt.Fprintf(z, "%d,%d,8\n", 170+col, -30+row)
			}
		}
		if err := z.Close(); err != nil {
			t.Fatal(err)
		}
		dir["slabs/"+slab+"/depth.xyz"] = &fstest.MapFile{Data: depth.Bytes()}
		dir["slabs/"+slab+"/sigma.xyz.gz"] = &fstest.MapFile{Data: sigma.Bytes()}
	})
}

func TestExportOfAnImportGivesTheSameBytes(t *testing.T) {
	for name, b := range map[string]*bundle.Bundle{"built-in": model(t, "1"), "with a grid": gridded(t)} {
		t.Run(name, func(t *testing.T) {
			s := imported(t, migrated(t), b)
			got, err := s.Load(context.Background(), b.Model.Ref())
			if err != nil {
				t.Fatal(err)
			}
			sameFiles(t, got, b)
		})
	}
}

func TestImportOfWhatIsThere(t *testing.T) {
	s := imported(t, migrated(t), model(t, "1"))
	err := s.Import(context.Background(), model(t, "1"))
	if !errors.Is(err, ErrEditionExists) || !strings.Contains(err.Error(), "builtin@1") {
		t.Errorf("%v; want ErrEditionExists that names the edition", err)
	}
	if _, err := s.Load(context.Background(), "builtin@1"); err != nil {
		t.Errorf("the first import is no longer whole: %v", err)
	}
}

// held starts an import that waits in its middle, for a lock that the test holds on
// a table which is written late. It returns how to let go, and the import's outcome.
func held(t *testing.T, url string, b *bundle.Bundle) (letGo func(), outcome chan error) {
	t.Helper()
	ctx := context.Background()
	tx, err := storetest.Conn(t, url).Begin(ctx)
	if err != nil {
		t.Fatal(err)
	}
	if _, err := tx.Exec(ctx, `LOCK TABLE nearmargin.hotspots IN ACCESS EXCLUSIVE MODE`); err != nil {
		t.Fatal(err)
	}
	outcome = make(chan error, 1)
	s := opened(t, url)
	go func() { outcome <- s.Import(ctx, b) }()
	waitFor(t, "the import to wait for the lock", func() bool {
		return count(t, url, `SELECT count(*) FROM pg_locks WHERE NOT granted AND relation = 'nearmargin.hotspots'::regclass`) == 1
	})
	return func() { _ = tx.Rollback(ctx) }, outcome
}

func count(t testing.TB, url, sql string, args ...any) (n int) {
	t.Helper()
	conn := storetest.Conn(t, url)
	defer conn.Close(context.Background())
	if err := conn.QueryRow(context.Background(), sql, args...).Scan(&n); err != nil {
		t.Fatal(err)
	}
	return n
}

func waitFor(t testing.TB, what string, ok func() bool) {
	t.Helper()
	for end := time.Now().Add(time.Minute); !ok(); time.Sleep(20 * time.Millisecond) {
		if time.Now().After(end) {
			t.Fatalf("waited a minute for %s", what)
		}
	}
}

// rowsLeft counts the rows in all tables that an import writes.
func rowsLeft(t *testing.T, url string) int {
	t.Helper()
	var parts []string
	for _, table := range []string{"models", "editions", "plates", "boundaries", "junctions", "motion_models", "angular_velocities",
		"zones", "hotspots", "land", "warnings", "slabs", "slab_boundaries", "slab_contours", "slab_grids"} {
		parts = append(parts, "(SELECT count(*) FROM nearmargin."+table+")")
	}
	return count(t, url, "SELECT "+strings.Join(parts, " + "))
}

func TestImportKilledHalfWayLeavesNothing(t *testing.T) {
	url := migrated(t)
	letGo, outcome := held(t, url, model(t, "1"))
	if n := count(t, url, `
		SELECT count(pg_terminate_backend(pid)) FROM pg_stat_activity
		WHERE datname = current_database() AND application_name = 'nearmargin' AND wait_event_type = 'Lock'`); n != 1 {
		t.Fatalf("%d imports killed", n)
	}
	if err := <-outcome; !errors.Is(err, ErrUnavailable) {
		t.Errorf("the import that was killed says %v; want ErrUnavailable", err)
	}
	letGo()
	if n := rowsLeft(t, url); n != 0 {
		t.Errorf("%d rows are left", n)
	}
	imported(t, url, model(t, "1"))
	if n := rowsLeft(t, url); n < 1000 {
		t.Errorf("an import after it wrote %d rows", n)
	}
}

func TestOfTwoImportsAtOnceOneWins(t *testing.T) {
	url := migrated(t)
	letGo, first := held(t, url, model(t, "1"))
	ctx, cancel := context.WithTimeout(context.Background(), 20*time.Second) // an import that waited instead would wait for ever
	defer cancel()
	err := opened(t, url).Import(ctx, model(t, "2"))
	if !errors.Is(err, ErrImportRunning) {
		t.Errorf("the second import says %v; want ErrImportRunning", err)
	}
	letGo()
	if err := <-first; err != nil {
		t.Errorf("the first import says %v", err)
	}
	list, err := opened(t, url).List(context.Background())
	if err != nil || len(list) != 1 || list[0].Ref() != "builtin@1" {
		t.Errorf("%v, %v; want the first alone", list, err)
	}
}

// TestEditionOnceActiveNeverChanges tries every way into its rows.
func TestEditionOnceActiveNeverChanges(t *testing.T) {
	url, ctx := migrated(t), context.Background()
	s := imported(t, url, model(t, "1"), model(t, "2"))
	if err := s.Activate(ctx, "builtin@1"); err != nil {
		t.Fatal(err)
	}
	const first, second = `(SELECT edition_id FROM nearmargin.editions WHERE edition = '1')`, `(SELECT edition_id FROM nearmargin.editions WHERE edition = '2')`
	for name, c := range map[string]struct {
		sql  string
		want error
	}{
		"change a boundary":      {`UPDATE nearmargin.boundaries SET sigma_km = 1 WHERE edition_id = ` + first, ErrImmutable},
		"move rows in":           {`UPDATE nearmargin.land SET edition_id = ` + first + ` WHERE edition_id = ` + second, ErrImmutable},
		"move rows out":          {`UPDATE nearmargin.land SET edition_id = ` + second + ` WHERE edition_id = ` + first, ErrImmutable},
		"add a plate":            {`INSERT INTO nearmargin.plates VALUES (` + first + `, 'QQ', 'Nowhere')`, ErrImmutable},
		"delete the edition":     {`DELETE FROM nearmargin.editions WHERE edition = '1'`, ErrImmutable},
		"change its checksum":    {`UPDATE nearmargin.editions SET sha256 = repeat('0', 64) WHERE edition = '1'`, ErrImmutable},
		"empty a table":          {`TRUNCATE nearmargin.slab_contours`, ErrImmutable},
		"rewrite the log":        {`UPDATE nearmargin.activations SET edition_id = ` + second, ErrImmutable},
		"shorten the log":        {`DELETE FROM nearmargin.activations`, ErrImmutable},
		"delete an unused one":   {`DELETE FROM nearmargin.editions WHERE edition = '2'`, nil},
		"boundary beyond limits": {`UPDATE nearmargin.boundaries SET sigma_km = 0 WHERE edition_id = ` + second, ErrLimit},
	} {
		t.Run(name, func(t *testing.T) {
			tx, err := storetest.Conn(t, url).Begin(ctx)
			if err != nil {
				t.Fatal(err)
			}
			defer tx.Rollback(ctx)
			_, err = tx.Exec(ctx, c.sql)
			if got := interpretError("change", "", err); !errors.Is(got, c.want) {
				t.Errorf("%v, want %v", got, c.want)
			}
		})
	}
}

// TestDomainLimitsAreChecks writes rows by hand that the reader of files would refuse.
func TestDomainLimitsAreChecks(t *testing.T) {
	url, ctx := migrated(t), context.Background()
	imported(t, url, model(t, "1"))
	for name, sql := range map[string]string{
		"plate code":          `UPDATE nearmargin.plates SET code = 'nu' WHERE code = 'NU'`,
		"unknown type":        `UPDATE nearmargin.boundaries SET type = 'trench'`,
		"one plate":           `UPDATE nearmargin.boundaries SET left_plate = right_plate`,
		"a third subducts":    `UPDATE nearmargin.boundaries SET subducting_plate = 'ZZ'`,
		"nothing subducts":    `UPDATE nearmargin.boundaries SET subducting_plate = NULL`,
		"infinite sigma":      `UPDATE nearmargin.boundaries SET sigma_km = 'Infinity'`,
		"not a number":        `UPDATE nearmargin.boundaries SET sigma_km = 'NaN'`,
		"source status":       `UPDATE nearmargin.slabs SET source_status = 'read'`,
		"contour depth":       `UPDATE nearmargin.slab_contours SET depth_km = 801`,
		"arc depth":           `UPDATE nearmargin.slabs SET arc_min_depth_km = 59`,
		"zone kind":           `UPDATE nearmargin.zones SET kind = 'plateau'`,
		"basis":               `UPDATE nearmargin.angular_velocities SET basis = 'guess'`,
		"rate":                `UPDATE nearmargin.angular_velocities SET wx_rad_myr = 5`,
		"id with an at sign":  `INSERT INTO nearmargin.models VALUES ('a@b')`,
		"a point for a line":  `UPDATE nearmargin.boundaries SET path = 'POINT(1 2)'`,
		"default not there":   `UPDATE nearmargin.editions SET default_motion = 'none'`,
		"velocity of a plate": `UPDATE nearmargin.angular_velocities SET plate = 'ZZ' WHERE plate = 'NU'`,
	} {
		t.Run(name, func(t *testing.T) {
			_, err := storetest.Conn(t, url).Exec(ctx, sql)
			if got := interpretError("change", "", err); !errors.Is(got, ErrLimit) {
				t.Errorf("%v, want ErrLimit", got)
			}
		})
	}
}

func TestImportKeepsWhoWhenAndCitations(t *testing.T) {
	before := time.Now().Add(-time.Minute)
	s := imported(t, migrated(t), model(t, "1"))
	list, err := s.List(context.Background())
	if err != nil || len(list) != 1 {
		t.Fatalf("%v, %v", list, err)
	}
	b, err := builtin.Load()
	if err != nil {
		t.Fatal(err)
	}
	e := list[0]
	if e.ImportedBy == "" || e.ImportedAt.Before(before) || len(e.Citations) != len(b.Model.Citations()) ||
		e.Active || !e.ActivatedAt.IsZero() || e.Licence != b.Model.Licence() {
		t.Errorf("%+v", e)
	}
}
