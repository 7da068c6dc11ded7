package main

import (
	"context"
	"encoding/csv"
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/jackc/pgx/v5"

	"nearmargin/api/wire"
	"nearmargin/store/storetest"
)

// texts returns a query's rows as text, one cell after another.
func texts(t *testing.T, url, sql string) [][]string {
	t.Helper()
	rows, err := storetest.Conn(t, url).Query(context.Background(), sql, pgx.QueryExecModeSimpleProtocol)
	if err != nil {
		t.Fatal(err)
	}
	out, err := pgx.CollectRows(rows, func(row pgx.CollectableRow) ([]string, error) {
		var cells []string
		for _, raw := range row.RawValues() {
			cells = append(cells, string(raw))
		}
		return cells, nil
	})
	if err != nil {
		t.Fatalf("%s: %v", sql, err)
	}
	return out
}

// wells is a table of places at many settings, with depths below ground in feet, and
// of what has no answer.
func wells(t *testing.T, url string) (csvText string) {
	t.Helper()
	storetest.Exec(t, url, `CREATE TABLE wells (id text PRIMARY KEY, geom geometry, depth text, ground double precision)`)
	var b strings.Builder
	var values []string
	b.WriteString("id,lon,lat,depth,ground\n")
	n := 0
	for lon := -175.5; lon < 180; lon += 23.1 {
		for lat := -71.0; lat < 80; lat += 11.3 {
			id := fmt.Sprintf("w%04d", n)
			depth, ground := fmt.Sprint(100*n), "330"
			if n%3 == 0 {
				depth = "-999.25"
			}
			fmt.Fprintf(&b, "%s,%.2f,%.2f,%s,%s\n", id, lon, lat, depth, ground)
			values = append(values, fmt.Sprintf("('%s', ST_SetSRID(ST_MakePoint(%.2f, %.2f), 4326), '%s', %s)", id, lon, lat, depth, ground))
			n++
		}
	}
	storetest.Exec(t, url, "INSERT INTO wells VALUES "+strings.Join(values, ", "))
	return b.String()
}

func annotatedTable(t *testing.T, url string, more ...string) outcome {
	t.Helper()
	return invoke(t, nil, "", append([]string{"annotate", "--database", url, "--table", "wells", "--into", "wells_setting"}, more...)...)
}

// TestTableEqualsFile asks for the same rows in a table and in a file.
func TestTableEqualsFile(t *testing.T) {
	url, _ := seeded(t)
	file := wells(t, url)
	depth := []string{"--depth-column", "depth", "--depth-unit", "ft", "--depth-datum", "ground", "--elevation-column", "ground"}
	if got := annotatedTable(t, url, depth...); got.status != exitDone || got.stdout != "" || !strings.Contains(got.stderr, "0 with an error") {
		t.Fatalf("%+v", got)
	}
	byFile := invoke(t, nil, file, append([]string{"annotate", "-", "--format", "csv"}, depth...)...)
	want, err := csv.NewReader(strings.NewReader(byFile.stdout)).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	columns := "id"
	for _, c := range wire.Columns {
		if c == "side_uncertain" {
			columns += ", ts_side_uncertain::text"
			continue
		}
		columns += ", ts_" + c
	}
	got := texts(t, url, `SELECT `+columns+` FROM wells_setting ORDER BY id`)
	if len(got) != len(want)-1 || len(got) < 150 {
		t.Fatalf("%d rows, want %d", len(got), len(want)-1)
	}
	related := 0 // to a slab, which takes a depth
	for i, row := range got {
		file := want[i+1]
		if row[0] != file[0] || strings.Join(row[1:], "|") != strings.Join(file[5:], "|") {
			t.Errorf("table %q\nfile  %q", row, file)
		}
		if line := strings.Join(row, "|"); strings.Contains(line, "|above|") || strings.Contains(line, "|below|") {
			related++
		}
	}
	if related == 0 {
		t.Error("no row has a depth above or below a slab")
	}
}

func TestTableOfFaultsAndPolygons(t *testing.T) {
	url, ref := seeded(t)
	storetest.Exec(t, url, `CREATE TABLE wells (id int PRIMARY KEY, geom geometry, depth text)`)
	storetest.Exec(t, url, `INSERT INTO wells VALUES
		(1, NULL, NULL), (2, 'SRID=4326;POINT EMPTY', NULL), (3, 'SRID=4326;LINESTRING(0 0,1 1)', NULL), (4, 'SRID=4326;POINT(10 120)', NULL),
		(5, 'SRID=4326;POINT(10 20)', 'deep'), (6, 'SRID=4326;POLYGON((0 0,2 2,2 0,0 2,0 0))', NULL), (7, 'SRID=4326;POLYGON((-75 -40,-65 -40,-65 -30,-75 -30,-75 -40))', NULL),
		(8, 'SRID=4326;MULTIPOLYGON(((0 40,1 40,1 41,0 40)))', NULL), (9, ST_Transform('SRID=4326;POINT(-72.4 -36.1)', 32718), '30'), (10, 'POINT(1 1)', NULL)`)
	got := annotatedTable(t, url, "--depth-column", "depth")
	if got.status != exitRowErrors || !strings.Contains(got.stderr, "7 of 10") {
		t.Fatalf("%+v", got)
	}
	for i, says := range []string{"missing", "empty", "LineString; it must be", "lon and lat swapped", `"deep" is not a number`, "crosses", "", "", "", "no SRID"} {
		row := texts(t, url, fmt.Sprintf(`SELECT coalesce(ts_error, ''), coalesce(ts_plate, '') FROM wells_setting WHERE id = %d`, i+1))
		if len(row) != 1 || (says == "") != (row[0][0] == "") || !strings.Contains(row[0][0], says) || (row[0][1] == "") != (says != "") {
			t.Errorf("row %d: %q, want a fault with %q", i+1, row, says)
		}
	}
	area := texts(t, url, `SELECT ts_plate, ts_area->'plates'->0->>'code', ts_area_km2, ts_area->>'area_km2', ts_distance_km, ts_plate_fraction, ts_setting, ts_area->'settings'->0->>'label', ts_model
		FROM wells_setting WHERE id = 7`)[0]
	if area[0] != area[1] || area[0] == "" || area[2] != area[3] || area[4] != "0" || area[6] != area[7] || area[8] != ref {
		t.Errorf("the polygon: %q", area)
	}
	if slab := texts(t, url, `SELECT ts_setting, coalesce(ts_site_relation, ''), ts_area IS NULL FROM wells_setting WHERE id = 9`)[0]; slab[0] != "forearc" || slab[1] == "" || slab[2] != "t" {
		t.Errorf("the point in UTM: %q", slab)
	}
}

func TestTableUnderAnotherEdition(t *testing.T) {
	url, first := seeded(t)
	wells(t, url)
	storetest.Exec(t, url, `INSERT INTO wells VALUES ('rift', 'SRID=4326;POINT(36.3 -0.9)', NULL, NULL)`)
	if got := annotatedTable(t, url); got.status != exitDone {
		t.Fatalf("%+v", got)
	}
	dir := exported(t, "second")
	path := filepath.Join(dir, "boundaries.geojson")
	raw, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(path, []byte(strings.ReplaceAll(string(raw), "continental_rift", "continental_transform")), 0o600); err != nil {
		t.Fatal(err)
	}
	must(t, url, "model", "import", dir)
	must(t, url, "model", "activate", "builtin@second")
	before := texts(t, url, `SELECT id, ts_setting FROM wells_setting ORDER BY id`)
	got := annotatedTable(t, url)
	if got.status != exitDone || !strings.HasPrefix(got.stdout, "id,was,became\n") || !strings.Contains(got.stdout, "rift,continental_rift,transform_zone\n") {
		t.Fatalf("%+v", got)
	}
	after := texts(t, url, `SELECT id, ts_setting FROM wells_setting ORDER BY id`)
	want := "id,was,became\n"
	for i := range before {
		if before[i][1] != after[i][1] {
			want += before[i][0] + "," + before[i][1] + "," + after[i][1] + "\n"
		}
	}
	if got.stdout != want {
		t.Errorf("reported\n%swant\n%s", got.stdout, want)
	}
	if refs := texts(t, url, `SELECT DISTINCT ts_model FROM wells_setting`); len(refs) != 1 || refs[0][0] != "builtin@second" {
		t.Errorf("models %v", refs)
	}
	if got := annotatedTable(t, url, "--model", first); got.status != exitDone || strings.Count(got.stdout, "\n") != strings.Count(want, "\n") {
		t.Errorf("back to the first edition: %+v", got)
	}
}

func TestTableOnTheCommandLine(t *testing.T) {
	url, ref := seeded(t)
	wells(t, url)
	bare := storetest.Get(t).Empty(t)
	storetest.Exec(t, bare, `CREATE EXTENSION postgis`)
	storetest.Exec(t, bare, `CREATE TABLE wells AS SELECT 1 AS id, 'SRID=4326;POINT(1 2)'::geometry AS geom`)
	got := annotatedTable(t, url, "--dry-run", "--where", "id < 'w0010'")
	for _, says := range []string{"would read 10 rows of wells", "10 × POINT, SRID 4326", "would make wells_setting", ref, "ts_distance_km double precision", "ts_area jsonb", "nothing was written"} {
		if got.status != exitDone || !strings.Contains(got.stdout, says) {
			t.Errorf("%+v\nwant %q", got, says)
		}
	}
	if left := texts(t, url, `SELECT relname FROM pg_class WHERE relname LIKE 'wells_setting%'`); len(left) > 0 {
		t.Errorf("a dry run made %v", left)
	}
	for name, c := range map[string]struct {
		args   []string
		status int
		says   string
	}{
		"no table":            {[]string{"--database", url, "--into", "x"}, exitUsage, "--table is missing"},
		"no target":           {[]string{"--database", url, "--table", "wells"}, exitUsage, "--into is missing"},
		"no database":         {[]string{"--table", "wells", "--into", "x"}, exitUsage, "--database is missing"},
		"a file too":          {[]string{"x.csv", "--database", url, "--table", "wells", "--into", "x"}, exitUsage, "takes no file"},
		"about files":         {[]string{"--database", url, "--table", "wells", "--into", "x", "--out", "y"}, exitUsage, "--out is about files"},
		"along the hole":      {[]string{"--database", url, "--table", "wells", "--into", "x", "--depth-column", "MD"}, exitUsage, "along the hole"},
		"unknown motion":      {[]string{"--database", url, "--table", "wells", "--into", "x", "--motion", "y"}, exitUsage, "nnr-morvel56"},
		"unknown table":       {[]string{"--database", url, "--table", "none", "--into", "x"}, exitFailed, "no such table"},
		"unknown edition":     {[]string{"--database", url, "--table", "wells", "--into", "x", "--model", "builtin@none"}, exitFailed, "no such edition"},
		"no schema":           {[]string{"--database", bare, "--table", "wells", "--into", "x"}, exitFailed, "--model builtin"},
		"built-in, no schema": {[]string{"--database", bare, "--table", "wells", "--into", "x", "--model", "builtin"}, exitDone, "1 rows, 0 with an error"},
	} {
		t.Run(name, func(t *testing.T) {
			got := invoke(t, nil, "", append([]string{"annotate"}, c.args...)...)
			if got.status != c.status || !strings.Contains(got.stderr, c.says) {
				t.Errorf("%+v, want status %d and %q", got, c.status, c.says)
			}
		})
	}
	t.Run("a database in the environment does not hide a file", func(t *testing.T) {
		got := invoke(t, map[string]string{"NEARMARGIN_DATABASE": url}, "lon,lat\n1,2\n", "annotate", "-", "--format", "csv")
		if got.status != exitDone || !strings.Contains(got.stdout, "1,2,NU,") {
			t.Errorf("%+v", got)
		}
	})
}
