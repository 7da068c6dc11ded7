package store

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"github.com/jackc/pgx/v5"

	"nearmargin/setting"
	"nearmargin/setting/sphere"
	"nearmargin/store/storetest"
)

// active makes a database with editions of the built-in model, activated from the last
// to the first.
func active(t testing.TB, editions ...string) (url string, s *Store) {
	t.Helper()
	url = migrated(t)
	for _, e := range editions {
		s = imported(t, url, model(t, e))
	}
	for _, e := range slices.Backward(editions) {
		if err := s.Activate(context.Background(), "builtin@"+e); err != nil {
			t.Fatal(err)
		}
	}
	return url, s
}

// nearestRow is one row of nearmargin.nearest.
type nearestRow struct {
	ID, Name, Type, Plate, Left, Right string
	Subducting                         *string
	DistanceKm                         float64
	AzimuthDeg                         *float64
	Lon, Lat                           float64
	Across, From                       string
	Rate, RateAzimuth, Opening, Shear  *float64
	Obliquity                          *float64
	Motion                             *string
	Model                              string
}

const nearestSQL = `
SELECT boundary_id, name, type, plate, left_plate, right_plate, subducting_plate, distance_km, azimuth_deg,
       ST_X(nearest_point::geometry), ST_Y(nearest_point::geometry), motion_plate, relative_to,
       rate_mm_yr, rate_azimuth_deg, opening_mm_yr, shear_mm_yr, obliquity_deg, motion_model, model
FROM unnest($1::float8[], $2::float8[]) WITH ORDINALITY AS p(lon, lat, i),
     nearmargin.nearest(ST_SetSRID(ST_MakePoint(lon, lat), 4326)::geography) ORDER BY i`

// turned is the difference of two azimuths.
func turned(a, b float64) float64 { return math.Abs(math.Mod(a-b+540, 360) - 180) }

// compareNearest says in what a row differs from the service's answer.
func compareNearest(r *nearestRow, a *setting.Answer) string {
	n := &a.Nearest
	m := &n.Motion
	number := func(p *float64) float64 {
		if p == nil {
			return math.NaN()
		}
		return *p
	}
	off := func(p *float64, want, by float64) bool {
		got := number(p)
		return math.IsNaN(got) != math.IsNaN(want) || math.Abs(got-want) > by
	}
	angle := func(p *float64, want float64) bool {
		got := number(p)
		return math.IsNaN(got) != math.IsNaN(want) || turned(got, want) > 1e-4
	}
	switch {
	case r.ID != n.Boundary.ID() || r.Name != n.Boundary.Name() || r.Type != n.Boundary.Type().String():
		return fmt.Sprintf("boundary %s (%s), want %s (%s)", r.ID, r.Type, n.Boundary.ID(), n.Boundary.Type())
	case math.Abs(r.DistanceKm-n.DistanceKm) > 1e-5:
		return fmt.Sprintf("distance %.7f km, want %.7f", r.DistanceKm, n.DistanceKm)
	case r.Plate != a.Plate.Code || r.Left != n.Boundary.Left() || r.Right != n.Boundary.Right():
		return fmt.Sprintf("plates %s (%s, %s), want %s (%s, %s)", r.Plate, r.Left, r.Right, a.Plate.Code, n.Boundary.Left(), n.Boundary.Right())
	case (r.Subducting == nil) != (n.Boundary.Subducting() == "") || r.Subducting != nil && *r.Subducting != n.Boundary.Subducting():
		return fmt.Sprintf("subducting plate %v, want %q", r.Subducting, n.Boundary.Subducting())
	case n.DistanceKm > 1 && angle(r.AzimuthDeg, n.AzimuthDeg):
		return fmt.Sprintf("azimuth %v, want %v", number(r.AzimuthDeg), n.AzimuthDeg)
	case r.Across != m.Plate || r.From != m.RelativeTo:
		return fmt.Sprintf("motion of %s from %s, want %s from %s", r.Across, r.From, m.Plate, m.RelativeTo)
	case m.Known != (r.Motion != nil) || m.Known && *r.Motion != m.Model:
		return fmt.Sprintf("motion model %v, want %q", r.Motion, m.Model)
	case m.Known && (off(r.Rate, m.RateMmYr, 1e-6) || off(r.Opening, m.OpeningMmYr, 1e-6) || off(r.Shear, m.ShearMmYr, 1e-6)):
		return fmt.Sprintf("rate %v, opening %v, shear %v, want %v, %v, %v", number(r.Rate), number(r.Opening), number(r.Shear), m.RateMmYr, m.OpeningMmYr, m.ShearMmYr)
	case m.Known && (angle(r.RateAzimuth, m.AzimuthDeg) || angle(r.Obliquity, m.ObliquityDeg)):
		return fmt.Sprintf("azimuth of the rate %v, obliquity %v, want %v, %v", number(r.RateAzimuth), number(r.Obliquity), m.AzimuthDeg, m.ObliquityDeg)
	case r.Model != a.Model.Ref():
		return fmt.Sprintf("model %s, want %s", r.Model, a.Model.Ref())
	}
	return ""
}

// TestNearestEqualsTheService compares the function with the service's answer on
// points spread over the sphere and, half of them, near boundaries. Near ties are those
// where the site may lie on either plate, or two boundaries are equally far, to 1 cm.
func TestNearestEqualsTheService(t *testing.T) {
	points := 20000
	if testing.Short() {
		points = 1000
	}
	url, s := active(t, "1", "2") // the second was active and is no more
	b, err := s.Load(context.Background(), "builtin@1")
	if err != nil {
		t.Fatal(err)
	}
	look, err := b.Model.Lookup(setting.Options{})
	if err != nil {
		t.Fatal(err)
	}
	r := rand.New(rand.NewPCG(7, 11))
	bs := b.Model.Network().Boundaries()
	var lon, lat []float64
	for len(lon) < points {
		p := sphere.LonLat{Lon: 360*r.Float64() - 180, Lat: math.Asin(2*r.Float64()-1) * 180 / math.Pi}
		if len(lon)%2 == 1 {
			path := bs[r.IntN(len(bs))].Path()
			p = sphere.Direct(path[r.IntN(len(path))], 360*r.Float64(), math.Exp(r.Float64()*12-6)) // 2.5 m to 400 km
		}
		lon, lat = append(lon, p.Lon), append(lat, p.Lat)
	}
	rows, err := storetest.Conn(t, url).Query(context.Background(), nearestSQL, lon, lat)
	if err != nil {
		t.Fatal(err)
	}
	got, err := pgx.CollectRows(rows, pgx.RowToStructByPos[nearestRow])
	if err != nil {
		t.Fatal(err)
	}
	if len(got) != points {
		t.Fatalf("%d rows for %d points", len(got), points)
	}
	bad, ties := 0, 0
	var a setting.Answer
	for i := range got {
		if err := look.At(setting.SiteAt(lon[i], lat[i]), &a); err != nil {
			t.Fatal(err)
		}
		diff := compareNearest(&got[i], &a)
		if diff == "" {
			continue
		}
		if got[i].ID != a.Nearest.Boundary.ID() && math.Abs(got[i].DistanceKm-a.Nearest.DistanceKm) < 1e-5 {
			ties++
			continue
		}
		if bad++; bad < 10 {
			t.Errorf("%.9f %.9f: %s", lon[i], lat[i], diff)
		}
	}
	t.Logf("%d points, %d near ties, %d differ", points, ties, bad)
	if ties > points/200 {
		t.Errorf("%d of %d points are near ties", ties, points)
	}
}

func TestNearestOfNothing(t *testing.T) {
	url := migrated(t)
	conn := storetest.Conn(t, url)
	count := func(site string) (n int) {
		t.Helper()
		if err := conn.QueryRow(context.Background(), `SELECT count(*) FROM nearmargin.nearest(`+site+`)`).Scan(&n); err != nil {
			t.Fatal(err)
		}
		return n
	}
	const place = `'POINT(-72.4 -36.1)'::geography`
	if n := count(place); n != 0 {
		t.Errorf("without an active edition there are %d rows", n)
	}
	s := imported(t, url, model(t, "1"))
	if err := s.Activate(context.Background(), "builtin@1"); err != nil {
		t.Fatal(err)
	}
	for site, want := range map[string]int{place: 1, `NULL`: 0, `'POINT EMPTY'::geography`: 0, `'POINT(0 90)'::geography`: 1, `'POINT(180 -90)'::geography`: 1} {
		if n := count(site); n != want {
			t.Errorf("%s: %d rows, want %d", site, n, want)
		}
	}
	if _, err := conn.Exec(context.Background(), `SELECT * FROM nearmargin.nearest('LINESTRING(0 0,1 1)'::geography)`); err == nil {
		t.Error("a line is taken for a point")
	}
}

// TestNearestNeedsSelectOnly calls the function with the rights of the service.
func TestNearestNeedsSelectOnly(t *testing.T) {
	url, _ := active(t, "1")
	storetest.Exec(t, url, `CREATE ROLE asks_only LOGIN PASSWORD 'x'`)
	t.Cleanup(func() {
		storetest.Exec(t, url, `DROP OWNED BY asks_only`)
		storetest.Exec(t, url, `DROP ROLE asks_only`)
	})
	conn := storetest.Conn(t, storetest.As(t, url, "asks_only", "x"))
	const ask = `SELECT count(*) FROM nearmargin.nearest('POINT(1 2)'::geography)`
	var n int
	if err := conn.QueryRow(context.Background(), ask).Scan(&n); err == nil {
		t.Error("a role without rights is answered")
	}
	storetest.Exec(t, url, `GRANT USAGE ON SCHEMA nearmargin TO asks_only`)
	storetest.Exec(t, url, `GRANT SELECT ON ALL TABLES IN SCHEMA nearmargin TO asks_only`)
	if err := conn.QueryRow(context.Background(), ask).Scan(&n); err != nil || n != 1 {
		t.Errorf("%d rows, %v", n, err)
	}
}
