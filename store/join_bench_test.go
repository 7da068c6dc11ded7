package store

import (
	"context"
	"math"
	"math/rand/v2"
	"testing"
	"time"

	"nearmargin/setting"
	"nearmargin/store/storetest"
	"nearmargin/testdata/bench/rounds"
)

// bulkJoinSQL is the bulk join that one would write: for each point the nearest
// boundary by the index, and its distance on the spheroid.
const bulkJoinSQL = `
SELECT count(*), sum(n.metres)
FROM bench_points p
CROSS JOIN LATERAL (
    SELECT b.boundary_id, ST_Distance(b.path, p.at) AS metres
    FROM nearmargin.boundaries b
    ORDER BY b.path <-> p.at LIMIT 1
) n`

// bulkSegmentsSQL is the same with every arc a row of its own: more rows, with tighter
// boxes for the index.
const bulkSegmentsSQL = `
SELECT count(*), sum(n.metres)
FROM bench_points p
CROSS JOIN LATERAL (
    SELECT ST_Distance(s.arc, p.at) AS metres
    FROM bench_arcs s
    ORDER BY s.arc <-> p.at LIMIT 1
) n`

// BenchmarkPostGISJoin compares whole answers in this process, on one goroutine, with
// PostGIS's bulk join for the nearest boundary and its distance alone, in one backend,
// in turn. The join's time is that of the server, without sending the points.
func BenchmarkPostGISJoin(b *testing.B) {
	const points = 2000
	ctx := context.Background()
	url, s := active(b, "1")
	loaded, err := s.Load(ctx, "builtin@1")
	if err != nil {
		b.Fatal(err)
	}
	look, err := loaded.Model.Lookup(setting.Options{Brief: true})
	if err != nil {
		b.Fatal(err)
	}
	r := rand.New(rand.NewPCG(7, 11))
	lon, lat := make([]float64, points), make([]float64, points)
	for i := range lon {
		lon[i], lat[i] = 360*r.Float64()-180, math.Asin(2*r.Float64()-1)*180/math.Pi
	}
	conn := storetest.Conn(b, url)
	for _, sql := range []string{
		"SET jit = off", "SET max_parallel_workers_per_gather = 0",
		"CREATE TEMP TABLE bench_points (at geography(Point, 4326))",
		`CREATE TEMP TABLE bench_arcs AS SELECT ST_MakeLine(a, b)::geography AS arc FROM (
		   SELECT d.geom AS a, lead(d.geom) OVER (PARTITION BY boundary_id ORDER BY d.path[1]) AS b
		   FROM nearmargin.boundaries, LATERAL ST_DumpPoints(path::geometry) d) v WHERE b IS NOT NULL`,
		"CREATE INDEX ON bench_arcs USING gist (arc)",
	} {
		if _, err := conn.Exec(ctx, sql); err != nil {
			b.Fatal(sql, err)
		}
	}
	if _, err := conn.Exec(ctx, "INSERT INTO bench_points SELECT ST_SetSRID(ST_MakePoint(lon, lat), 4326)::geography FROM unnest($1::float8[], $2::float8[]) p(lon, lat)", lon, lat); err != nil {
		b.Fatal(err)
	}
	if _, err := conn.Exec(ctx, "ANALYZE bench_points, bench_arcs, nearmargin.boundaries"); err != nil {
		b.Fatal(err)
	}
	var want float64
	var a setting.Answer
	answer := func(int) {
		sum := 0.0
		for i := range lon {
			if err := look.At(setting.SiteAt(lon[i], lat[i]), &a); err != nil {
				b.Fatal(err)
			}
			sum += a.Nearest.DistanceKm
		}
		want = sum
	}
	join := func(sql string) func(int) {
		return func(int) {
			var n int
			var metres float64
			if err := conn.QueryRow(ctx, sql).Scan(&n, &metres); err != nil {
				b.Fatal(err)
			}
			if n != points || math.Abs(metres/1000/want-1) > 0.001 {
				b.Fatalf("%d points, %g km in all; want %g", n, metres/1000, want)
			}
		}
	}
	answer(0)
	for b.Loop() {
		ns := rounds.WallMedians(11, time.Millisecond, answer, join(bulkJoinSQL), join(bulkSegmentsSQL))
		b.ReportMetric(1e9*points/ns[0], "answers/s")
		b.ReportMetric(1e9*points/ns[1], "joined/s")
		b.ReportMetric(1e9*points/ns[2], "joined-arcs/s")
		b.ReportMetric(min(ns[1], ns[2])/ns[0], "of-the-join")
	}
}
