package sphere

import (
	"bytes"
	"fmt"
	"math"
	"os"
	"os/exec"
	"strconv"
	"strings"
	"testing"

	"pgregory.net/rapid"
)

// Values that need no other program. Those of Karney (2013), J. Geodesy 87, 43,
// doi:10.1007/s00190-012-0578-z, and of the GeographicLib documentation are
// written from memory and were confirmed with GeodSolve 2.1.2. The lengths along
// the equator and a meridian follow from the ellipsoid alone.
func TestInverseFixedValues(t *testing.T) {
	const quarterMeridianM = 10001965.729313 // the ellipse's quarter perimeter for a = 6378137 m, 1/f = 298.257223563
	tests := []struct {
		name   string
		a, b   LonLat
		metres float64
		azi    float64 // NaN: not compared
		aziTol float64
	}{
		{"GeographicLib manual: New York to London", LonLat{-73.8, 40.6}, LonLat{-0.5, 51.6}, 5551759.400319, 51.198882845580, 1e-9},
		{"GeographicLib manual: Wellington to Salamanca", LonLat{174.81, -41.32}, LonLat{-5.50, 40.96}, 19959679.267354, 161.067669986160, 1e-9},
		{"Karney 2013, section 4: a short line", LonLat{0, -30.12345}, LonLat{0.00005, -30.12344}, 4.944208, 77.043533542, 1e-7},
		{"Karney 2013, section 4: nearly antipodal", LonLat{0, -30}, LonLat{179.8, 29.9}, 19989832.827610, 161.890524736327, 1e-9},
		{"nearly antipodal on the equator", LonLat{0, 0}, LonLat{179.5, 0.5}, 19936288.578965, 25.671872868290, 1e-9},
		{"antipodes on the equator: over a pole", LonLat{0, 0}, LonLat{180, 0}, 2 * quarterMeridianM, 0, 1e-9},
		{"equator, a quarter: a·π/2", LonLat{0, 0}, LonLat{90, 0}, 6378137 * math.Pi / 2, 90, 1e-12},
		{"equator over the antimeridian: a·2°", LonLat{179, 0}, LonLat{-179, 0}, 6378137 * 2 * math.Pi / 180, 90, 1e-12},
		{"equator westward", LonLat{-179, 0}, LonLat{179, 0}, 6378137 * 2 * math.Pi / 180, 270, 1e-12},
		{"equator to pole", LonLat{12, 0}, LonLat{12, 90}, quarterMeridianM, 0, 1e-12},
		{"equator to pole, another longitude", LonLat{12, 0}, LonLat{-77, -90}, quarterMeridianM, 180, 1e-12},
		{"pole to pole", LonLat{0, 90}, LonLat{0, -90}, 2 * quarterMeridianM, math.NaN(), 0},
		{"from the North Pole, azimuths count from the longitude given", LonLat{30, 90}, LonLat{30, 0}, quarterMeridianM, 180, 1e-12},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			km, azi := Inverse(tt.a, tt.b)
			if math.Abs(km*1000-tt.metres) > 1e-6 {
				t.Errorf("distance %.7f m, want %.7f", km*1000, tt.metres)
			}
			if !math.IsNaN(tt.azi) && math.Abs(WrapLon(azi-tt.azi)) > tt.aziTol {
				t.Errorf("azimuth %.12f, want %.12f", azi, tt.azi)
			}
			if !(azi >= 0 && azi < 360) {
				t.Errorf("azimuth %g is not in [0, 360)", azi)
			}
		})
	}
}

func TestInverseCoincident(t *testing.T) {
	for _, pair := range [][2]LonLat{
		{{10, 20}, {10, 20}}, {{180, 5}, {-180, 5}}, {{0, 90}, {90, 90}}, {{0, -90}, {-135, -90}}, {{-5, 7}, {355, 7}},
	} {
		km, azi := Inverse(pair[0], pair[1])
		if km != 0 || !math.IsNaN(azi) {
			t.Errorf("Inverse(%v, %v) = %g, %g; want 0 and NaN", pair[0], pair[1], km, azi)
		}
	}
}

// A latitude a hair south of the equator is the equator: the library's rounding
// made -19,970 km of the first of these lines.
func TestInverseHairSouthOfEquator(t *testing.T) {
	for _, lat := range []float64{-3.4e-18, -1e-18, -1e-300, math.Copysign(0, -1), 3.4e-18, -1e-17, -1e-16} {
		for _, lon := range []float64{179.5, 179.9, 180, 90, 0.001} {
			got, _ := Inverse(LonLat{0, lat}, LonLat{lon, lat})
			want, _ := Inverse(LonLat{0, 0}, LonLat{lon, 0})
			if math.Abs(got-want) > 1e-9 {
				t.Errorf("latitude %g, %g° of longitude: %.9f km, on the equator %.9f", lat, lon, got, want)
			}
			c := Direct(LonLat{0, lat}, 90, 100)
			if d := Direct(LonLat{0, 0}, 90, 100); math.Abs(c.Lon-d.Lon) > 1e-12 || math.Abs(c.Lat-d.Lat) > 1e-12 {
				t.Errorf("latitude %g, 100 km east: %v, on the equator %v", lat, c, d)
			}
		}
	}
}

func TestDirectFixedValues(t *testing.T) {
	tests := []struct {
		name   string
		from   LonLat
		azi, m float64
		want   LonLat
	}{
		// Karney (2013), table 2; from memory, confirmed with GeodSolve 2.1.2
		{"Karney 2013, table 2", LonLat{0, 40}, 30, 10e6, LonLat{137.84490004377, 41.79331020506}},
		{"east along the equator", LonLat{179, 0}, 90, 6378137 * 2 * math.Pi / 180, LonLat{-179, 0}},
		{"west along the equator to the antimeridian", LonLat{-90, 0}, 270, 6378137 * math.Pi / 2, LonLat{180, 0}},
		{"to the pole", LonLat{0, 0}, 0, 10001965.729313, LonLat{0, 90}},
		{"nowhere", LonLat{33, -44}, 12, 0, LonLat{33, -44}},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			got := Direct(tt.from, tt.azi, tt.m/1000)
			if apartRad(FromLonLat(got), FromLonLat(tt.want)) > 1e-12 || !(got.Lon > -180 && got.Lon <= 180) { // 6 µm
				t.Errorf("Direct = %v, want %v", got, tt.want)
			}
		})
	}
}

func TestDirectUndoesInverse(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		a, b := genLonLat().Draw(t, "a"), genLonLat().Draw(t, "b")
		km, azi := Inverse(a, b)
		if back, _ := Inverse(b, a); math.Abs(back-km) > 1e-9 {
			t.Fatalf("%g km one way, %g the other", km, back)
		}
		sphereKm := RadToKm(Angle(FromLonLat(a), FromLonLat(b)))
		// 0.56 %; near antipodes the geodesic takes the way over a pole instead
		if sphereKm < 19000 && math.Abs(km-sphereKm) > 0.0056*sphereKm+1e-9 {
			t.Fatalf("%g km on the ellipsoid, %g on the sphere: more than 0.56 %% apart", km, sphereKm)
		}
		if km == 0 {
			return
		}
		c := Direct(a, azi, km)
		if !(c.Lon > -180 && c.Lon <= 180) {
			t.Fatalf("Direct gives longitude %g", c.Lon)
		}
		if miss, _ := Inverse(b, c); miss > 1e-6 { // azimuths carry 1e-13 degrees or so
			t.Fatalf("Direct misses by %g km", miss)
		}
	})
}

const requireTools = "NEARMARGIN_REQUIRE_TOOLS"

// TestInverseAgainstGeodSolve compares random lines with GeographicLib's own
// command line program (Debian package geographiclib-tools), written by the
// author of the method, C. F. F. Karney.
func TestInverseAgainstGeodSolve(t *testing.T) {
	path, err := exec.LookPath("GeodSolve")
	if err != nil {
		if os.Getenv(requireTools) == "1" {
			t.Fatalf("GeodSolve is not installed, and %s=1 requires it: install geographiclib-tools", requireTools)
		}
		t.Skipf("GeodSolve is not installed (Debian package geographiclib-tools); set %s=1 to make this a failure", requireTools)
	}
	r := seeded(t)
	n := 10000
	if testing.Short() {
		n = 500
	}
	pairs := make([][2]LonLat, n)
	var in bytes.Buffer
	for i := range pairs {
		a, b := anyVec(r).LonLat(), anyVec(r).LonLat()
		switch i % 4 {
		case 1: // near
			b = near(r, FromLonLat(a), math.Pow(10, -6*r.Float64())).LonLat()
		case 2: // nearly antipodal
			b = near(r, FromLonLat(a).Scale(-1), 0.02).LonLat()
		}
		pairs[i] = [2]LonLat{a, b}
		for _, x := range []float64{a.Lat, a.Lon, b.Lat, b.Lon} {
			in.WriteString(strconv.FormatFloat(x, 'f', -1, 64)) // GeodSolve reads an E as east
			in.WriteByte(' ')
		}
		in.WriteByte('\n')
	}
	cmd := exec.Command(path, "-i", "-p", "9")
	cmd.Stdin = &in
	out, err := cmd.Output()
	if err != nil {
		t.Fatalf("GeodSolve: %v", err)
	}
	lines := strings.Split(strings.TrimSpace(string(out)), "\n")
	if len(lines) != n {
		t.Fatalf("GeodSolve gave %d lines for %d questions", len(lines), n)
	}
	worstNm := 0.0
	for i, line := range lines {
		var azi1, azi2, m float64
		if _, err := fmt.Sscan(line, &azi1, &azi2, &m); err != nil {
			t.Fatalf("GeodSolve's line %q: %v", line, err)
		}
		km, azi := Inverse(pairs[i][0], pairs[i][1])
		off := math.Abs(km*1000 - m)
		worstNm = max(worstNm, off*1e9)
		if off > 30e-9 { // 15 nm for each of the two
			t.Errorf("%v: %.9f m, GeodSolve %.9f", pairs[i], km*1000, m)
		}
		// an azimuth that is off moves the far end by its sine times the reduced
		// length, which is next to nothing near antipodes: compare where it counts
		if i%4 != 2 && math.Abs(WrapLon(azi-azi1))*math.Pi/180*min(m, 6e6) > 1e-5 {
			t.Errorf("%v: azimuth %.12f, GeodSolve %.12f", pairs[i], azi, azi1)
		}
	}
	t.Logf("%d lines, largest difference %.1f nm", n, worstNm)
}

func BenchmarkInverse(b *testing.B) {
	r := seeded(b)
	var pairs [1024][2]LonLat
	for i := range pairs {
		a := anyVec(r)
		pairs[i] = [2]LonLat{a.LonLat(), near(r, a, 0.3).LonLat()}
	}
	sum, i := 0.0, 0
	for b.Loop() {
		km, _ := Inverse(pairs[i%1024][0], pairs[i%1024][1])
		sum += km
		i++
	}
	if mean := sum / float64(i); !(mean > 100 && mean < 2500) {
		b.Fatalf("mean distance %g km", mean)
	}
}
