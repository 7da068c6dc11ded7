package motion_test

import (
	"bufio"
	"bytes"
	"fmt"
	"math"
	"os"
	"os/exec"
	"strconv"
	"strings"
	"testing"

	"nearmargin/setting/builtin"
	"nearmargin/setting/motion"
	"nearmargin/setting/sphere"
)

// The plates of Altamimi et al. (2017), ITRF2014 plate motion model, GJI 209,
// 1906, Table 1, as PROJ's parameter file names them.
var projPlates = map[string]string{
	"ANTA": "AN", "ARAB": "AR", "AUST": "AU", "EURA": "EU", "INDI": "IN", "NAZC": "NZ",
	"NOAM": "NA", "NUBI": "NU", "PCFC": "PA", "SOAM": "SA", "SOMA": "SM",
}

// absent skips a test that needs a tool or file of PROJ (Debian: proj-bin and
// proj-data), or fails it where the environment requires them.
func absent(t *testing.T, what string) {
	t.Helper()
	if os.Getenv("NEARMARGIN_REQUIRE_TOOLS") == "1" {
		t.Fatalf("%s is absent and NEARMARGIN_REQUIRE_TOOLS=1; install proj-bin and proj-data", what)
	}
	t.Skipf("%s is absent; install proj-bin and proj-data to run this comparison", what)
}

// projRates reads the rates of rotation of PROJ's plates, in arc seconds a year.
func projRates(t *testing.T) map[string][3]float64 {
	t.Helper()
	var raw []byte
	var tried []string
	for _, dir := range append(strings.Split(os.Getenv("PROJ_DATA"), ":"), "/usr/share/proj", "/usr/local/share/proj") {
		if dir == "" {
			continue
		}
		file := dir + "/ITRF2014"
		var err error
		if raw, err = os.ReadFile(file); err == nil {
			break
		}
		tried = append(tried, file)
	}
	if raw == nil {
		absent(t, "PROJ's file ITRF2014 ("+strings.Join(tried, ", ")+")")
	}
	out := map[string][3]float64{}
	for s := bufio.NewScanner(bytes.NewReader(raw)); s.Scan(); {
		words := strings.Fields(s.Text())
		if len(words) == 0 || projPlates[strings.Trim(words[0], "<>")] == "" {
			continue
		}
		var w [3]float64
		for i, key := range []string{"+drx=", "+dry=", "+drz="} {
			for _, word := range words {
				if text, ok := strings.CutPrefix(word, key); ok {
					x, err := strconv.ParseFloat(text, 64)
					if err != nil {
						t.Fatalf("%s: %v", s.Text(), err)
					}
					w[i] = x
				}
			}
		}
		if !strings.Contains(s.Text(), "+convention=position_vector") {
			t.Fatalf("%s: another convention than position_vector has other signs", s.Text())
		}
		out[projPlates[strings.Trim(words[0], "<>")]] = w
	}
	return out
}

func itrf2014(t *testing.T) *motion.Model {
	t.Helper()
	b, err := builtin.Load()
	if err != nil {
		t.Fatal(err)
	}
	m, ok := b.Model.Motion("itrf2014")
	if !ok {
		t.Fatal("the built-in model has no motion model itrf2014")
	}
	return m
}

func TestITRF2014AgainstPROJsFile(t *testing.T) {
	rates := projRates(t)
	entries := itrf2014(t).Entries()
	if len(rates) != len(projPlates) || len(entries) != len(projPlates) {
		t.Fatalf("%d plates in PROJ's file and %d in ours, want %d", len(rates), len(entries), len(projPlates))
	}
	for _, e := range entries {
		r, ok := rates[e.Plate]
		if !ok {
			t.Errorf("plate %s is not in PROJ's file", e.Plate)
			continue
		}
		want := motion.FromMasYr(r[0]*1000, r[1]*1000, r[2]*1000)
		if d := e.Vector.Sub(want).Norm(); d > 1e-15 {
			t.Errorf("plate %s: ours %+v and PROJ's %+v differ by %g rad/Myr", e.Plate, motion.PoleOf(e.Vector), motion.PoleOf(want), d)
		}
	}
}

// stations lie well within each plate.
var stations = map[string][]sphere.LonLat{
	"AN": {{Lon: 0, Lat: -75}, {Lon: 166.7, Lat: -77.8}}, "AR": {{Lon: 45, Lat: 24}, {Lon: 54, Lat: 18}},
	"AU": {{Lon: 149, Lat: -35.3}, {Lon: 115.9, Lat: -31.8}}, "EU": {{Lon: 12.9, Lat: 49.1}, {Lon: 82.9, Lat: 55}},
	"IN": {{Lon: 77.5, Lat: 13}, {Lon: 80, Lat: 22}}, "NZ": {{Lon: -109.3, Lat: -27.2}, {Lon: -85, Lat: -10}},
	"NA": {{Lon: -77, Lat: 39}, {Lon: -147.5, Lat: 65}}, "NU": {{Lon: 15.6, Lat: -1.3}, {Lon: -1, Lat: 30}},
	"PA": {{Lon: -159.7, Lat: 22}, {Lon: 167.7, Lat: 8.7}, {Lon: -179.9, Lat: -20}}, "SA": {{Lon: -47.9, Lat: -15.9}, {Lon: -58, Lat: -34.6}},
	"SM": {{Lon: 55.5, Lat: -4.7}, {Lon: 45, Lat: 3}},
}

// cctVelocity has PROJ move a station for ten years by a seven-parameter
// transformation with rates, and returns its velocity in mm/yr. earth names the
// figure, such as "+ellps=WGS84".
func cctVelocity(t *testing.T, p sphere.LonLat, rate [3]float64, earth string) (eastMmYr, northMmYr float64) {
	t.Helper()
	const years = 10
	xyz := func(year float64) [3]float64 {
		cmd := exec.Command("cct", "-d", "12", "+proj=pipeline",
			"+step", "+proj=cart", earth,
			"+step", "+proj=helmert", fmt.Sprintf("+drx=%.9f", rate[0]), fmt.Sprintf("+dry=%.9f", rate[1]), fmt.Sprintf("+drz=%.9f", rate[2]),
			"+t_epoch=2010", "+convention=position_vector")
		cmd.Stdin = strings.NewReader(fmt.Sprintf("%.10f %.10f 0 %.1f\n", p.Lon, p.Lat, year))
		out, err := cmd.CombinedOutput()
		if err != nil {
			t.Fatalf("%v: %v\n%s", cmd.Args, err, out)
		}
		var v [3]float64
		if _, err := fmt.Sscan(string(out), &v[0], &v[1], &v[2]); err != nil {
			t.Fatalf("%v printed %q: %v", cmd.Args, out, err)
		}
		return v
	}
	a, b := xyz(2010), xyz(2010+years)
	d := sphere.Vec{X: b[0] - a[0], Y: b[1] - a[1], Z: b[2] - a[2]}.Scale(1000. / years) // m → mm/yr
	east, north := place(p.Lon, p.Lat).EastNorth()
	return d.Dot(east), d.Dot(north)
}

func TestITRF2014AgainstCct(t *testing.T) {
	if _, err := exec.LookPath("cct"); err != nil {
		absent(t, "the program cct")
	}
	rates := projRates(t)
	ours := itrf2014(t)
	entries := []motion.Entry{entry("ZZ", sphere.Vec{})} // the frame itself
	entries = append(entries, ours.Entries()...)
	m := mustModel(t, entries...)
	for _, e := range ours.Entries() {
		if len(stations[e.Plate]) < 2 {
			t.Fatalf("plate %s: the test needs stations", e.Plate)
		}
		for _, p := range stations[e.Plate] {
			at := place(p.Lon, p.Lat)
			got := mustRelative(t, m, e.Plate, "ZZ", at, heading(at, 0), true)
			sin, cos := math.Sincos(got.AzimuthDeg * math.Pi / 180)
			east, north := got.RateMmYr*sin, got.RateMmYr*cos
			for _, c := range []struct {
				earth    string
				tolMmYr  float64
				toldWhat string
			}{
				{fmt.Sprintf("+R=%.1f", sphere.MeanRadiusKm*1000), 1e-4, "on the same sphere"},
				// the distance from the axis differs by up to 1/150 between sphere and ellipsoid
				{"+ellps=WGS84", got.RateMmYr/150 + 1e-4, "on WGS84"},
			} {
				e1, n1 := cctVelocity(t, p, rates[e.Plate], c.earth)
				what := fmt.Sprintf("%s at %v, %s", e.Plate, p, c.toldWhat)
				inDelta(t, what+": east mm/yr", east, e1, c.tolMmYr)
				inDelta(t, what+": north mm/yr", north, n1, c.tolMmYr)
			}
		}
	}
}
