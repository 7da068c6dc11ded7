package figure

import (
	"bytes"
	"encoding/xml"
	"fmt"
	"io"
	"math"
	"os"
	"os/exec"
	"regexp"
	"strconv"
	"strings"
	"testing"

	"nearmargin/api/page"
	"nearmargin/setting/builtin"
	"nearmargin/setting/sphere"
)

// TestProjectionsAgainstProj compares both projections with PROJ.
func TestProjectionsAgainstProj(t *testing.T) {
	if _, err := exec.LookPath("cct"); err != nil {
		if os.Getenv("NEARMARGIN_REQUIRE_TOOLS") == "1" {
			t.Fatal("cct is not installed; on Debian: apt-get install proj-bin")
		}
		t.Skip("cct is not installed; on Debian: apt-get install proj-bin")
	}
	for name, c := range map[string]struct {
		p    projection
		args []string
	}{
		"Equal Earth":            {equalEarth{}, []string{"+proj=eqearth", "+R=1"}},
		"Equal Earth about 90 E": {equalEarth{90}, []string{"+proj=eqearth", "+R=1", "+lon_0=90"}},
		"azimuthal":              {newAzimuthal(sphere.FromLonLat(sphere.LonLat{Lon: 140, Lat: -35})), []string{"+proj=laea", "+lat_0=-35", "+lon_0=140", "+R=1"}},
	} {
		for _, at := range []sphere.LonLat{{Lon: 0, Lat: 0}, {Lon: 139, Lat: -34}, {Lon: 170, Lat: 45}, {Lon: 60.5, Lat: -80.25}, {Lon: 179, Lat: 10}} {
			cmd := exec.Command("cct", append([]string{"-d", "12"}, c.args...)...)
			cmd.Stdin = strings.NewReader(fmt.Sprintf("%g %g 0 0\n", at.Lon, at.Lat))
			out, err := cmd.Output()
			if err != nil {
				t.Fatal(err)
			}
			var x, y float64
			if _, err := fmt.Sscan(string(out), &x, &y); err != nil {
				t.Fatalf("cct gave %q", out)
			}
			gx, gy, ok := c.p.at(at)
			if !ok || math.Abs(gx-x) > 1e-9 || math.Abs(gy-y) > 1e-9 {
				t.Errorf("%s of %v: %.9f %.9f %v, PROJ gives %.9f %.9f", name, at, gx, gy, ok, x, y)
			}
		}
	}
}

// TestProjectionsByHand: a place a quarter turn away lies at the square root of 2
// (Snyder 1987), and the Equal Earth map reaches 2.7066 at the equator (Savric et al.
// 2019 give a ratio of width to height of 2.05458).
func TestProjectionsByHand(t *testing.T) {
	x, y, ok := newAzimuthal(sphere.FromLonLat(sphere.LonLat{Lon: 10})).at(sphere.LonLat{Lon: 100})
	if !ok || math.Abs(x-math.Sqrt2) > 1e-12 || math.Abs(y) > 1e-12 {
		t.Errorf("%g %g %v", x, y, ok)
	}
	if _, _, ok := newAzimuthal(sphere.FromLonLat(sphere.LonLat{Lon: 10})).at(sphere.LonLat{Lon: -170}); ok {
		t.Error("the antipode has a place")
	}
	w, _, _ := equalEarth{}.at(sphere.LonLat{Lon: 180})
	_, h, _ := equalEarth{}.at(sphere.LonLat{Lat: 90})
	if math.Abs(w/h-2.05458) > 1e-5 {
		t.Errorf("the map is %g wide and %g high", w, h)
	}
}

// TestMiddleMeridian: Greenwich, but where that would cut the places apart.
func TestMiddleMeridian(t *testing.T) {
	at := func(lons ...float64) (out []sphere.LonLat) {
		for _, lon := range lons {
			out = append(out, sphere.LonLat{Lon: lon})
		}
		return out
	}
	for _, c := range []struct {
		name   string
		places []sphere.LonLat
		want   float64
	}{
		{"none", nil, 0}, {"Atlantic", at(-70, 0, 30), 0}, {"around the Pacific", at(140, 170, -175, -72), -150},
		{"around the Pacific, but none near the edge", at(140, -72), 0}, {"all the way round", at(-180, -130, -80, -30, 20, 70, 120, 170), 0},
		{"on the edge", at(180, 120), 150}, {"antipodes, none at the edge", at(0, 180), -90},
	} {
		if got := middleMeridian(c.places); got != c.want {
			t.Errorf("%s: %g, want %g", c.name, got, c.want)
		}
	}
}

// TestLandAt asks for places whose nature is plain on any map.
func TestLandAt(t *testing.T) {
	for _, fine := range []bool{false, true} {
		land, err := page.Land(fine)
		if err != nil {
			t.Fatal(err)
		}
		for _, c := range []struct {
			name     string
			lon, lat float64
			want     bool
		}{
			{"Sichuan", 104, 31, true}, {"Sahara", 10, 23, true}, {"near the South Pole", 0, -89, true}, {"East Antarctica", 90, -80, true},
			{"Chukotka beyond the antimeridian", -175, 67, true}, {"Brazil", -55, -10, true}, {"Alice Springs", 134, -24, true},
			{"North Pole", 0, 90, false}, {"mid-Pacific", -150, 0, false}, {"Caspian Sea", 51, 42, false}, {"Tasman Sea", 160, -38, false}, {"north of Chukotka", 180, 74, false},
		} {
			got := false
			for _, rings := range land {
				got = got || landAt(sphere.FromLonLat(sphere.LonLat{Lon: c.lon, Lat: c.lat}), rings)
			}
			if got != c.want {
				t.Errorf("%s (fine %v): land %v", c.name, fine, got)
			}
		}
	}
}

// TestMapsAreWellFormed draws sites at places that are hard for maps.
func TestMapsAreWellFormed(t *testing.T) {
	land, err := page.Land(false)
	if err != nil {
		t.Fatal(err)
	}
	b, err := builtin.Load()
	if err != nil {
		t.Fatal(err)
	}
	site := func(lon, lat float64) MapSite {
		return MapSite{Name: "A & <B>", At: sphere.LonLat{Lon: lon, Lat: lat}, Label: "forearc", Family: "subduction", Confidence: "low"}
	}
	for name, sites := range map[string][]MapSite{
		"one": {site(10, 50)}, "pole": {site(0, 90)}, "antimeridian": {site(179.9, -20), site(-179.9, -19)},
		"antipodes": {site(0, 0), site(180, 0)}, "world": {site(-70, -30), site(140, 35), site(20, 60)}, "none": nil,
		"Pacific": {site(140, 38), site(178, -18), site(-172, -14), site(-72, -33)},
	} {
		out := Map(&MapSpec{Title: "T & <t>", Sites: sites, Land: land, Boundaries: b.Model.Network().Boundaries(), Caption: []string{"c"}})
		d := xml.NewDecoder(bytes.NewReader(out))
		for {
			_, err := d.Token()
			if err == io.EOF {
				break
			}
			if err != nil {
				t.Fatalf("%s: %v", name, err)
			}
		}
		if bytes.Contains(out, []byte("NaN")) || bytes.Contains(out, []byte("Inf")) {
			t.Errorf("%s: a number is none", name)
		}
		if n := bytes.Count(out, []byte(`class="nm-s-subduction"`)); len(sites) > 0 && n != len(sites)+1 {
			t.Errorf("%s: %d markers for %d sites and the legend", name, n, len(sites))
		}
		if n := bytes.Count(out, []byte("A &amp; &lt;B&gt;")); len(sites) > 0 && n != 2*len(sites) { // each with a pale rim below it
			t.Errorf("%s: %d texts for the names of %d sites", name, n, len(sites))
		}
		for _, at := range markerAt.FindAllSubmatch(out, len(sites)) {
			if x, err := strconv.ParseFloat(string(at[1]), 64); err != nil || x < marginX-0.1 || x > figureW-marginX+0.1 {
				t.Errorf("%s: a marker stands at %s", name, at[1])
			}
		}
		if !bytes.Contains(out, []byte("km")) {
			t.Errorf("%s lacks a scale", name)
		}
		if world := name == "world" || name == "none" || name == "antipodes"; world && !bytes.Contains(out, []byte("Spreading ridge")) {
			t.Errorf("%s: the legend lacks a type of boundary that is drawn", name)
		}
		if name == "one" && bytes.Contains(out, []byte("Spreading ridge")) {
			t.Error("the legend of a map of Germany explains spreading ridges")
		}
	}
}

var (
	markerAt = regexp.MustCompile(`class="nm-s-[^>]* transform="translate\(([-0-9.]+) ([-0-9.]+)\)"`)
	barAt    = regexp.MustCompile(`class="nm-ground"[^>]* d="M([-0-9.]+) [-0-9.]+L[^L]*L([-0-9.]+) `)
	barWords = regexp.MustCompile(`>([0-9.]+) km( at the equator)?<`)
)

// TestScaleBarIsRight draws two sites and measures their distance on the paper by the
// scale bar: it is that of the WGS84 geodesic between them, but for the flattening that
// the projections leave out (0.5 %), the stretch away from the middle and 0.1 px.
func TestScaleBarIsRight(t *testing.T) {
	for _, middle := range []sphere.LonLat{{Lon: 0, Lat: 0}, {Lon: -72, Lat: -36}, {Lon: 180, Lat: 52}, {Lon: 20, Lat: 88}, {Lon: 138, Lat: 35}} {
		for azimuth := 0.0; azimuth < 180; azimuth += 45 {
			for _, km := range []float64{60, 400} {
				a, b := sphere.Direct(middle, azimuth, km/2), sphere.Direct(middle, azimuth+180, km/2)
				measureByBar(t, a, b, km, "")
			}
		}
	}
	// of a world map along the equator: a quarter of it, since far apart the middle is not defined
	quarter, _ := sphere.Inverse(sphere.LonLat{}, sphere.LonLat{Lon: 90})
	measureByBar(t, sphere.LonLat{}, sphere.LonLat{Lon: 90}, quarter, " at the equator", sphere.LonLat{Lon: 180}, sphere.LonLat{Lon: -90})
}

func measureByBar(t *testing.T, a, b sphere.LonLat, wantKm float64, words string, more ...sphere.LonLat) {
	t.Helper()
	spec := &MapSpec{Title: "t"}
	for _, at := range append([]sphere.LonLat{a, b}, more...) {
		spec.Sites = append(spec.Sites, MapSite{At: at, Label: "forearc", Family: "subduction", Confidence: "high"})
	}
	out := string(Map(spec))
	num := func(s string) float64 {
		x, err := strconv.ParseFloat(s, 64)
		if err != nil {
			t.Fatal(err)
		}
		return x
	}
	marks, bar, says := markerAt.FindAllStringSubmatch(out, -1), barAt.FindStringSubmatch(out), barWords.FindStringSubmatch(out)
	if len(marks) < 2 || bar == nil || says == nil || says[2] != words {
		t.Fatalf("%v %v: %d markers, bar %q, %q", a, b, len(marks), bar, says)
	}
	paper := math.Hypot(num(marks[0][1])-num(marks[1][1]), num(marks[0][2])-num(marks[1][2]))
	got := paper / (num(bar[2]) - num(bar[1])) * num(says[1])
	if math.Abs(got-wantKm) > 0.008*wantKm {
		t.Errorf("%v %v: %.1f km by the bar, %.1f km by the geodesic", a, b, got, wantKm)
	}
}

// TestManySites: markers alike that lie on each other are drawn once, the legend counts
// all, and nobody's name is left out without a word.
func TestManySites(t *testing.T) {
	spec := &MapSpec{Title: "A title that is much too long for one line of a figure of this width, as file names sometimes are, and ends here"}
	for i := range 30 {
		spec.Sites = append(spec.Sites, MapSite{Name: strings.Repeat("long ", 20) + strconv.Itoa(i), At: sphere.LonLat{Lon: -70, Lat: -30}, Label: "forearc", Family: "subduction", Confidence: "high"})
	}
	out := string(Map(spec))
	if n := strings.Count(out, `class="nm-s-subduction"`); n != 2 {
		t.Errorf("%d markers, want one and the legend's", n)
	}
	for _, want := range []string{"Forearc (30)", "Sites whose name has no room on the map: ", "\u2026<", "and ends here<"} {
		if !strings.Contains(out, want) {
			t.Errorf("the map lacks %q", want)
		}
	}
	if strings.Contains(out, spec.Title+"</text>") {
		t.Error("the title is on one line")
	}
}
