package store

import (
	"context"
	"errors"
	"fmt"
	"math"
	"runtime"
	"strings"
	"testing"

	"github.com/jackc/pgx/v5"
	"github.com/paulmach/orb"
	"github.com/paulmach/orb/encoding/wkb"

	"nearmargin/store/storetest"
)

// quadrant answers with the quarter of the globe that a point lies in.
func quadrant(ask EnrichAsk) error {
	r := ask.Row
	if r.WKB == nil {
		ask.Fail()
		ask.Put(nil)
		ask.Put([]byte(r.Fault))
		return nil
	}
	g, err := wkb.Unmarshal(r.WKB)
	if err != nil {
		return err
	}
	p, ok := g.(orb.Point)
	if !ok {
		p = g.Bound().Center()
	}
	label := map[bool]string{true: "n", false: "s"}[p[1] >= 0] + map[bool]string{true: "e", false: "w"}[p[0] >= 0]
	ask.Put([]byte(label))
	ask.Put([]byte(fmt.Sprintf("%.5f %.5f%s", p[0], p[1], strings.Join(r.Extra, "|"))))
	return nil
}

func spec() EnrichSpec {
	return EnrichSpec{
		Source: "wells", Key: "id", Geometry: "geom", Target: "out",
		Columns: []EnrichColumn{{"label", "text"}, {"detail", "text"}}, Label: "label", Ref: "m@1", SHA256: "a", MaxPositions: 100, Answer: quadrant,
	}
}

// plain makes a database with PostGIS and nothing else, and runs statements in it.
func plain(t testing.TB, statements ...string) (url string, conn *pgx.Conn) {
	t.Helper()
	url = storetest.Get(t).Empty(t)
	conn = storetest.Conn(t, url)
	for _, sql := range append([]string{`CREATE EXTENSION postgis`}, statements...) {
		if _, err := conn.Exec(context.Background(), sql); err != nil {
			t.Fatalf("%s: %v", sql, err)
		}
	}
	return url, conn
}

// lines returns a query's rows of one text each.
func lines(t testing.TB, conn *pgx.Conn, sql string) []string {
	t.Helper()
	rows, err := conn.Query(context.Background(), sql)
	if err != nil {
		t.Fatal(err)
	}
	out, err := pgx.CollectRows(rows, pgx.RowTo[string])
	if err != nil {
		t.Fatalf("%s: %v", sql, err)
	}
	return out
}

const thousand = `CREATE TABLE wells AS SELECT i AS id, ST_SetSRID(ST_MakePoint((i * 7.31)::numeric % 360 - 180, (i * 3.17)::numeric % 180 - 90), 4326) AS geom
FROM generate_series(1, 1000) i`

const all = `SELECT concat_ws(' ', id, label, detail) FROM out ORDER BY id`

func TestEnrichReferenceSystemsAndGeometries(t *testing.T) {
	const place = `ST_SetSRID(ST_MakePoint(-72.4, -36.1), 4326)`
	const square = `ST_SetSRID(ST_MakeEnvelope(10, 20, 12, 22), 4326)`
	for name, c := range map[string]struct {
		typ, value string
		want       string
	}{
		"degrees":            {"geometry(Point, 4326)", place, "sw -72.40000 -36.10000"},
		"web mercator":       {"geometry(Point, 3857)", "ST_Transform(" + place + ", 3857)", "sw -72.40000 -36.10000"},
		"UTM 18 south":       {"geometry(Point, 32718)", "ST_Transform(" + place + ", 32718)", "sw -72.40000 -36.10000"},
		"geography":          {"geography(Point, 4326)", place + "::geography", "sw -72.40000 -36.10000"},
		"no typmod":          {"geometry", "ST_Transform(" + place + ", 32718)", "sw -72.40000 -36.10000"},
		"with a height":      {"geometry(PointZM, 4326)", "ST_SetSRID(ST_MakePoint(1, 2, 3, 4), 4326)", "ne 1.00000 2.00000"},
		"polygon":            {"geometry", square, "ne 11.00000 21.00000"},
		"polygon, mercator":  {"geometry(Polygon, 3857)", "ST_Transform(" + square + ", 3857)", "ne 11.00000 21.00000"},
		"polygon, geography": {"geography", square + "::geography", "ne 11.00000 21.00000"},
		"null":               {"geometry", "NULL", " the geometry is missing"},
		"empty":              {"geometry", "ST_GeomFromText('POINT EMPTY', 4326)", " the geometry is empty"},
		"no SRID":            {"geometry", "ST_MakePoint(1, 2)", " the geometry has no SRID; say with ST_SetSRID in what system its coordinates are"},
		"too many":           {"geometry", "ST_Segmentize(" + square + ", 0.01)", " the geometry has more than 100 positions, which is the limit; generalise it"},
		"cannot transform":   {"geometry", "ST_SetSRID(ST_MakePoint(1, 2), 910000)", " the geometry cannot be turned into WGS84: "},
	} {
		t.Run(name, func(t *testing.T) {
			url, conn := plain(t, `CREATE TABLE wells (id int PRIMARY KEY, geom `+c.typ+`)`, `INSERT INTO wells VALUES (2, `+c.value+`)`)
			r, err := Enrich(context.Background(), url, spec())
			if err != nil {
				t.Fatal(err)
			}
			got := lines(t, conn, `SELECT concat(label, ' ', detail) FROM out`)
			failed := strings.HasPrefix(c.want, " ")
			if len(got) != 1 || got[0] != c.want && !(failed && strings.HasPrefix(got[0], c.want)) {
				t.Errorf("got %q, want %q", got, c.want)
			}
			if r.Rows != 1 || (r.Errors == 1) != failed {
				t.Errorf("report %+v", r)
			}
		})
	}
}

func TestEnrichKeys(t *testing.T) {
	for name, c := range map[string]struct{ typ, value string }{
		"integer":           {"integer", "i - 500"},
		"big":               {"bigint", "i::bigint * 1000000007"},
		"text":              {"text", `chr(97 + i % 26) || E'\t' || i || E'\\ \n''"'`},
		"text, C collation": {`text COLLATE "C"`, `chr(65 + i % 60) || i`},
		"varchar":           {"varchar(12)", `'w' || i`},
		"uuid":              {"uuid", "md5(i::text)::uuid"},
		"numeric":           {"numeric", "i / 7.0"},
		"time":              {"timestamptz", "'2020-01-01T00:00:00Z'::timestamptz + i * interval '1.000001 s'"},
	} {
		t.Run(name, func(t *testing.T) {
			url, conn := plain(t, `CREATE TABLE wells (id `+c.typ+` PRIMARY KEY, geom geometry)`,
				`INSERT INTO wells SELECT `+c.value+`, ST_SetSRID(ST_MakePoint(i % 170, i % 80), 4326) FROM generate_series(1, 1000) i`)
			s := spec()
			s.BatchRows = 90
			r := cutOff(t, url, s, conn, 5)
			if !r.Resumed || r.Rows != 1000 {
				t.Errorf("report %+v", r)
			}
			const lost = `SELECT w.id::text FROM wells w FULL JOIN out o ON o.id = w.id WHERE o.id IS NULL OR w.id IS NULL OR
				o.detail <> format('%s.00000 %s.00000', ST_X(w.geom), ST_Y(w.geom))`
			if got := lines(t, conn, lost); len(got) > 0 {
				t.Errorf("%d rows are lost or wrong: %.100q", len(got), got)
			}
			if got := lines(t, conn, `SELECT format_type(atttypid, atttypmod) FROM pg_attribute WHERE attrelid = 'out'::regclass AND attname = 'id'`); !strings.HasPrefix(c.typ, "text") && c.typ != "varchar(12)" && !strings.HasPrefix(got[0], strings.Split(c.typ, "tz")[0]) {
				t.Errorf("the target's key is %v, want %s", got, c.typ)
			}
		})
	}
}

// cutOff has the server end both connections of a run after some transactions, then
// runs it again.
func cutOff(t testing.TB, url string, s EnrichSpec, conn *pgx.Conn, after int) EnrichReport {
	t.Helper()
	calls := 0
	s.Progress = func(EnrichReport) {
		if calls++; calls == after {
			if _, err := conn.Exec(context.Background(), `SELECT pg_terminate_backend(pid) FROM pg_stat_activity
				WHERE datname = current_database() AND application_name = 'nearmargin'`); err != nil {
				t.Error(err)
			}
		}
	}
	half, err := Enrich(context.Background(), url, s)
	if err == nil || half.Rows == 0 {
		t.Fatalf("a run whose connections were ended: %+v, %v", half, err)
	}
	s.Progress = nil
	r, err := Enrich(context.Background(), url, s)
	if err != nil {
		t.Fatal(err)
	}
	return r
}

func TestEnrichGoesOnAfterAKill(t *testing.T) {
	url, conn := plain(t, thousand)
	whole := spec()
	whole.Target = "whole"
	want, err := Enrich(context.Background(), url, whole)
	if err != nil {
		t.Fatal(err)
	}
	once := lines(t, conn, strings.Replace(all, "out", "whole", 1))

	t.Run("connections ended", func(t *testing.T) {
		s := spec()
		s.Target, s.BatchRows = "ended", 100
		if r := cutOff(t, url, s, conn, 4); !r.Resumed || r.Rows != want.Rows || r.Errors != want.Errors {
			t.Errorf("report %+v, want as %+v", r, want)
		}
		if got := lines(t, conn, strings.Replace(all, "out", "ended", 1)); strings.Join(got, "\n") != strings.Join(once, "\n") {
			t.Errorf("%d rows differ from those of one run", len(got))
		}
	})
	t.Run("context cancelled", func(t *testing.T) {
		ctx, cancel := context.WithCancel(context.Background())
		s := spec()
		s.Target, s.BatchRows = "cancelled", 100
		s.Progress = func(r EnrichReport) {
			if r.Rows == 300 {
				cancel()
			}
		}
		if _, err := Enrich(ctx, url, s); !errors.Is(err, context.Canceled) {
			t.Fatalf("a run that was cancelled: %v", err)
		}
		s.Progress = nil
		asked := 0
		s.Answer = func(a EnrichAsk) error { asked++; return quadrant(a) }
		r, err := Enrich(context.Background(), url, s)
		if err != nil || !r.Resumed || r.Rows != 1000 || asked != 700 {
			t.Errorf("%+v, %v, %d rows asked for; want the other 700", r, err, asked)
		}
		if got := lines(t, conn, strings.Replace(all, "out", "cancelled", 1)); strings.Join(got, "\n") != strings.Join(once, "\n") {
			t.Errorf("%d rows differ from those of one run", len(got))
		}
	})
	t.Run("another question starts anew", func(t *testing.T) {
		s := spec()
		s.Target, s.BatchRows = "other", 100
		stop := errors.New("stop")
		asked := 0
		s.Answer = func(a EnrichAsk) error {
			if asked++; asked > 250 {
				return stop
			}
			return quadrant(a)
		}
		if r, err := Enrich(context.Background(), url, s); !errors.Is(err, stop) || r.Rows != 200 {
			t.Fatalf("%+v, %v", r, err)
		}
		s.Answer, s.Where = quadrant, "id > 0"
		if r, err := Enrich(context.Background(), url, s); err != nil || r.Resumed || r.Rows != 1000 || r.Changed != 0 {
			t.Errorf("%+v, %v", r, err)
		}
	})
}

func TestEnrichReadsOneSnapshot(t *testing.T) {
	url, conn := plain(t, thousand)
	s := spec()
	s.BatchRows = 100
	done := false
	s.Progress = func(EnrichReport) {
		if done {
			return
		}
		done = true
		for _, sql := range [...]string{`INSERT INTO wells SELECT 5000 + i, 'SRID=4326;POINT(1 1)' FROM generate_series(1, 10) i`,
			`DELETE FROM wells WHERE id = 900`, `UPDATE wells SET geom = 'SRID=4326;POINT(12 34)' WHERE id = 901`} {
			if _, err := conn.Exec(context.Background(), sql); err != nil {
				t.Error(err)
			}
		}
	}
	r, err := Enrich(context.Background(), url, s)
	if err != nil || r.Rows != 1000 || r.Total != 1000 {
		t.Fatalf("%+v, %v", r, err)
	}
	if got := lines(t, conn, `SELECT id::text FROM out WHERE id > 1000 OR id = 900 OR detail = '12.00000 34.00000'`); len(got) != 1 || got[0] != "900" {
		t.Errorf("rows %v of the target; want 900 alone, as it was when the run began", got)
	}
}

func TestEnrichWhereAndDryRun(t *testing.T) {
	url, conn := plain(t, thousand, `INSERT INTO wells VALUES (1001, NULL), (1002, 'SRID=3857;POINT(1 1)'), (1003, 'SRID=4326;POINT EMPTY')`)
	s := spec()
	s.Where = "id % 10 = 0 OR id > 1000 -- every tenth"
	tables := func() []string {
		return lines(t, conn, `SELECT relname::text FROM pg_class WHERE relkind IN ('r', 'S') AND relnamespace = 'public'::regnamespace ORDER BY 1`)
	}
	before := tables()
	p, err := PlanEnrich(context.Background(), url, s)
	if err != nil {
		t.Fatal(err)
	}
	want := []EnrichKind{{"POINT", 4326, 100}, {"POINT", 3857, 1}, {"empty POINT", 4326, 1}, {"missing", 0, 1}}
	if fmt.Sprint(p.Kinds) != fmt.Sprint(want) || p.Rows != 103 || p.TargetExists || p.Key.Type != "integer" || p.Geometry.Type != "geometry" {
		t.Errorf("plan %+v, want kinds %v", p, want)
	}
	if got := tables(); strings.Join(got, " ") != strings.Join(before, " ") {
		t.Errorf("a dry run left the tables %v, before it there were %v", got, before)
	}
	r, err := Enrich(context.Background(), url, s)
	if err != nil || r.Rows != 103 || r.Errors != 2 {
		t.Fatalf("%+v, %v", r, err)
	}
	if got := lines(t, conn, `SELECT id::text FROM out WHERE id % 10 <> 0 AND id <= 1000`); len(got) > 0 {
		t.Errorf("rows %v are there, which the condition leaves out", got)
	}
	if p, err = PlanEnrich(context.Background(), url, s); err != nil || !p.TargetExists || p.TargetRows != 103 {
		t.Errorf("plan %+v, %v", p, err)
	}
	s.Where = "id <= 100"
	if r, err = Enrich(context.Background(), url, s); err != nil || r.Rows != 100 || r.Untouched != 93 {
		t.Errorf("%+v, %v; want 93 rows left as they were", r, err)
	}
}

func TestEnrichReportsChangedLabels(t *testing.T) {
	url, conn := plain(t, thousand)
	s := spec()
	s.BatchRows = 100
	if r, err := Enrich(context.Background(), url, s); err != nil || r.Changed != 0 {
		t.Fatalf("%+v, %v", r, err)
	}
	want := lines(t, conn, `SELECT format('%s,%s,%s', id, label, CASE WHEN label = 'ne' THEN 'north' END) FROM out WHERE label IN ('ne', 'sw') ORDER BY id`)
	s.Ref, s.SHA256 = "m@2", "b"
	s.Answer = func(a EnrichAsk) error { // every label "ne" becomes another, every "sw" is lost
		p, err := wkb.Unmarshal(a.Row.WKB)
		if err != nil {
			return err
		}
		at := p.(orb.Point)
		switch {
		case at[0] >= 0 && at[1] >= 0:
			a.Put([]byte("north"))
			a.Put(nil)
		case at[0] < 0 && at[1] < 0:
			a.Put(nil)
			a.Put([]byte("lost"))
			a.Fail()
		default:
			return quadrant(a)
		}
		return nil
	}
	r := cutOff(t, url, s, conn, 5)
	if r.Changed != int64(len(want)) || len(want) < 400 {
		t.Errorf("%d labels changed, want %d", r.Changed, len(want))
	}
	var out strings.Builder
	if err := WriteChanges(context.Background(), url, s, r.Run, &out); err != nil {
		t.Fatal(err)
	}
	if got := strings.TrimSpace(out.String()); got != "id,was,became\n"+strings.Join(want, "\n") {
		t.Errorf("the changes are\n%.300s\nwant\n%.300s", got, strings.Join(want, "\n"))
	}
	if r, err := Enrich(context.Background(), url, s); err != nil || r.Changed != 0 || r.Resumed {
		t.Errorf("the same again: %+v, %v", r, err)
	}
}

func TestEnrichRefuses(t *testing.T) {
	url, conn := plain(t, thousand, `CREATE TABLE twice AS SELECT 1 AS id, geom FROM wells LIMIT 3`, `CREATE TABLE void AS SELECT NULL::int AS id, geom FROM wells LIMIT 3`,
		`CREATE TABLE mine (id int PRIMARY KEY, label text)`, `CREATE TABLE keyless (id int, label text, detail text)`)
	for name, c := range map[string]struct {
		edit func(*EnrichSpec)
		says string
	}{
		"no table":        {func(s *EnrichSpec) { s.Source = "absent" }, "no such table"},
		"no column":       {func(s *EnrichSpec) { s.Key = "nr" }, `no column "nr"; the columns are geom, id`},
		"not a geometry":  {func(s *EnrichSpec) { s.Geometry = "id" }, "must be geometry or geography"},
		"key twice":       {func(s *EnrichSpec) { s.Source = "twice" }, "2 rows have a value of the key"},
		"key missing":     {func(s *EnrichSpec) { s.Source = "void" }, "3 of 3 rows have no value of the key"},
		"itself":          {func(s *EnrichSpec) { s.Target = "wells" }, "name another"},
		"not its table":   {func(s *EnrichSpec) { s.Target = "mine" }, `has no column "detail"`},
		"target, no key":  {func(s *EnrichSpec) { s.Target = "keyless" }, "not its primary key"},
		"three parts":     {func(s *EnrichSpec) { s.Source = "a.b.c" }, "more than two parts"},
		"open quote":      {func(s *EnrichSpec) { s.Source = `"a` }, "not closed"},
		"long name":       {func(s *EnrichSpec) { s.Target = strings.Repeat("x", 60) }, "1 to 63 bytes"},
		"bad condition":   {func(s *EnrichSpec) { s.Where = "nonsense = 1" }, `column "nonsense" does not exist`},
		"two of one name": {func(s *EnrichSpec) { s.Key, s.Columns[0].Name = "label", "label" }, "two columns"},
	} {
		t.Run(name, func(t *testing.T) {
			s := spec()
			c.edit(&s)
			if _, err := Enrich(context.Background(), url, s); err == nil || !strings.Contains(err.Error(), c.says) {
				t.Errorf("got %v, want %q", err, c.says)
			}
		})
	}
	t.Run("two at once", func(t *testing.T) {
		s := spec()
		s.BatchRows = 100
		var second error
		s.Progress = func(r EnrichReport) {
			if r.Rows == 100 {
				_, second = Enrich(context.Background(), url, spec())
			}
		}
		if _, err := Enrich(context.Background(), url, s); err != nil || !errors.Is(second, ErrEnrichRunning) {
			t.Errorf("%v, and the second %v", err, second)
		}
	})
	if got := lines(t, conn, `SELECT id::text FROM twice`); len(got) != 3 {
		t.Errorf("a source was changed: %v", got)
	}
}

// TestEnrichReadsAView has no index to tell that the key is unique.
func TestEnrichReadsAView(t *testing.T) {
	url, conn := plain(t, thousand, `CREATE VIEW deep AS SELECT id * 2 AS nr, geom FROM wells`)
	s := spec()
	s.Source, s.Key = "deep", "nr"
	if r, err := Enrich(context.Background(), url, s); err != nil || r.Rows != 1000 {
		t.Fatalf("%+v, %v", r, err)
	}
	if got := lines(t, conn, `SELECT max(nr)::text FROM out`); got[0] != "2000" {
		t.Errorf("the last key is %s", got[0])
	}
}

func TestEnrichNames(t *testing.T) {
	url, conn := plain(t, `CREATE SCHEMA "Odd.Schema"`, `CREATE TABLE "Odd.Schema"."We""lls" ("The Key" int PRIMARY KEY, "sh""ape" geometry, "depth'" text)`,
		`INSERT INTO "Odd.Schema"."We""lls" VALUES (1, 'SRID=4326;POINT(1 2)', '7')`)
	s := spec()
	s.Source, s.Key, s.Geometry, s.Extra, s.Target = `"Odd.Schema"."We""lls"`, "The Key", `sh"ape`, []string{"depth'"}, `public.Out Put`
	if _, err := Enrich(context.Background(), url, s); err != nil {
		t.Fatal(err)
	}
	if got := lines(t, conn, `SELECT concat("The Key", label, detail) FROM public."Out Put"`); len(got) != 1 || got[0] != "1ne1.00000 2.000007" {
		t.Errorf("got %q", got)
	}
}

// TestEnrichHoldsConstantMemory reads a table of 200,000 rows, 60 MB of text, and looks
// at the heap after each transaction.
func TestEnrichHoldsConstantMemory(t *testing.T) {
	if testing.Short() {
		t.Skip("takes half a minute")
	}
	url, conn := plain(t, `CREATE TABLE wells AS SELECT i AS id, ST_SetSRID(ST_MakePoint(i % 360 - 180, i % 180 - 90), 4326) AS geom, repeat('x', 300) AS more
		FROM generate_series(1, 200000) i`)
	s := spec()
	s.Extra = []string{"more"}
	var least, most uint64 = math.MaxUint64, 0
	s.Progress = func(r EnrichReport) {
		var m runtime.MemStats
		runtime.GC()
		runtime.ReadMemStats(&m)
		least, most = min(least, m.HeapAlloc), max(most, m.HeapAlloc)
	}
	r, err := Enrich(context.Background(), url, s)
	if err != nil || r.Rows != 200000 {
		t.Fatalf("%+v, %v", r, err)
	}
	t.Logf("the heap had %.1f to %.1f MiB", float64(least)/(1<<20), float64(most)/(1<<20))
	if most > least+8<<20 {
		t.Errorf("the heap grew from %d to %d bytes", least, most)
	}
	if got := lines(t, conn, `SELECT count(*)::text FROM out`); got[0] != "200000" {
		t.Errorf("%s rows were written", got[0])
	}
}
