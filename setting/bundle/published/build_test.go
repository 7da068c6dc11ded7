package published

import (
	"math"
	"slices"
	"strings"
	"testing"

	"nearmargin/setting"
	"nearmargin/setting/boundary"
	"nearmargin/setting/bundle"
	"nearmargin/setting/slab"
)

func TestSmallWorld(t *testing.T) {
	b, report := mustBuild(t, smallRequest())
	m := b.Model
	if n := report.Rejected(); n != 0 {
		t.Errorf("%d lines were rejected: %v", n, report.Tallies)
	}
	if w := m.Warnings(); len(w) != 0 {
		t.Errorf("warnings %v of a network that is closed", w)
	}
	if f := m.Network().Faults(); len(f) != 0 {
		t.Errorf("faults %v", f)
	}
	if got, want := m.MotionNames(), []string{"invented", PB2002}; !slices.Equal(got, want) || m.DefaultMotion() != PB2002 {
		t.Errorf("motion models %v, default %q; want %v, %q", got, m.DefaultMotion(), want, PB2002)
	}
	mm, _ := m.Motion(PB2002)
	if mm.Info().RelativeTo != "PA" {
		t.Errorf("pb2002 is relative to %q, want PA, which has the rate 0", mm.Info().RelativeTo)
	}
	for _, c := range []struct {
		name     string
		lon, lat float64
		plate    string
		kind     boundary.Type
		label    setting.Label
		slabs    int
	}{
		{"AF is the project's NU", 20, 0, "NU", boundary.SpreadingRidge, setting.PlateInterior, 0},
		{"above the slab", -117, 0, "BB", boundary.Subduction, setting.VolcanicArc, 1},
		{"seaward of the trench", -121, 0, "PA", boundary.Subduction, setting.OuterRise, 0},
		{"in the orogen", 115, 50, "NU", boundary.ContinentalConvergent, setting.DeformingZone, 0},
		{"on the ridge", 0.05, 55, "NU", boundary.SpreadingRidge, setting.RidgeAxis, 0},
	} {
		a, err := m.At(setting.SiteAt(c.lon, c.lat))
		if err != nil {
			t.Fatal(err)
		}
		if a.Plate.Code != c.plate || a.Nearest.Boundary.Type() != c.kind || a.Label != c.label || a.Slabs.Len() != c.slabs {
			t.Errorf("%s: plate %s, nearest %v, label %v, %d slabs; want %s, %v, %v, %d", c.name, a.Plate.Code, a.Nearest.Boundary.Type(), a.Label, a.Slabs.Len(), c.plate, c.kind, c.label, c.slabs)
		}
	}
}

// A grid's nodes come back: -dep, unc, dip, str and thk of the small slab, which
// its README gives as formulas.
func TestSmallSlab(t *testing.T) {
	b, _ := mustBuild(t, smallRequest())
	slabs := b.Model.Slabs()
	if len(slabs) != 1 {
		t.Fatalf("%d slabs", len(slabs))
	}
	s := slabs[0]
	if s.ID != "zzz" || s.Kind != slab.Subduction || !slices.Equal(s.BoundaryIDs, []string{"bb-pa-1"}) || s.Subducting != "PA" || s.Overriding != "BB" || s.ArcMinDepthKm != 80 {
		t.Errorf("slab %+v", s.Spec)
	}
	n := 0
	for lon := 240.5; lon <= 244; lon += 0.5 {
		for lat := -2.0; lat <= 2; lat += 0.5 {
			r, ok := s.Surface.At(vec(lon, lat))
			depth, sigma := (lon-240)*40+lat*0.123456, 5+(lon-240)
			if n++; !ok || math.Abs(r.DepthKm-depth) > 0.001 || math.Abs(r.SigmaKm-sigma) > 0.001 || math.Abs(r.DipDeg-19.8) > 0.001 || math.Abs(r.DipAzimuthDeg-90.25) > 0.001 || math.Abs(r.ThicknessKm-30) > 0.001 {
				t.Errorf("at %g, %g: %+v, %v; want depth %g, σ %g", lon, lat, r, ok, depth, sigma)
			}
		}
	}
	if _, ok := s.Surface.At(vec(244.6, 0)); ok || n != 72 {
		t.Errorf("there is a slab outside of its grid, or only %d nodes were tried", n)
	}
}

func TestBuildRefuses(t *testing.T) {
	for _, c := range []struct {
		name   string
		change func(*Request)
		want   string
	}{
		{"no boundaries", func(q *Request) { q.Steps = nil }, "give steps, boundaries, or a base"},
		{"two networks", func(q *Request) { q.Boundaries, q.Mapping = small("boundaries.geojson"), &Mapping{} }, "both given"},
		{"boundaries without a mapping", func(q *Request) { q.Steps, q.Boundaries = nil, small("boundaries.geojson") }, "need a mapping"},
		{"no velocities", func(q *Request) { q.Poles, q.Velocities = nil, nil }, "give poles, velocities, or a base"},
		{"a share of 2", func(q *Request) { q.MaxRejected = 2 }, "at most 1"},
		{"another file", func(q *Request) { q.Steps = small("poles.dat") }, "poles.dat: none of 3 lines could be read"},
		{"an empty file", func(q *Request) { q.Steps = text("empty", "\n\n") }, "empty: holds nothing"},
		{"an unknown default motion model", func(q *Request) { q.Identity.DefaultMotion = "x" }, `"x" is not among`},
		{"a bad edition", func(q *Request) { q.Identity.Edition = "a b" }, "edition"},
		{"a motion model's bad name", func(q *Request) { q.Velocities[0].Name = "../x" }, "must be lower-case"},
		{"no grid among the files", func(q *Request) { q.Slab2 = []File{*small("poles.dat")} }, "none of 1 files is named ZONE_slab2_LAYER_DATE"},
		{"a slab without depth", func(q *Request) { q.Slab2 = q.Slab2[1:] }, "there is no depth"},
		{"a layer twice", func(q *Request) { q.Slab2 = append(q.Slab2, q.Slab2[0]) }, "another file already"},
		{"a layer on other nodes", func(q *Request) {
			q.Slab2 = append(q.Slab2[:1:1], *text("zzz_slab2_unc_01.01.26.xyz", "0,0,1\n1,0,1\n0,1,1\n1,1,1\n"))
		}, "nodes are not those of the depth layer"},
		{"a broken archive", func(q *Request) { q.Slab2 = []File{*text("zzz_slab2_dep_1.xyz.gz", "this is no gzip stream")} }, "gzip"},
	} {
		q := smallRequest()
		c.change(&q)
		if _, _, err := Build(q); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: error %v, want %q in it", c.name, err, c.want)
		}
	}
}

// A share of rejected lines is let pass, named, and kept with the edition.
func TestRejectedLinesAreNamedAndKept(t *testing.T) {
	lines := strings.Split(slurp(t, "poles.dat"), "\n")
	lines = append(lines, "XX   95.000     0.000   0.1000  no latitude")
	q := smallRequest()
	q.Poles = text("some/where/poles.dat", strings.Join(lines, "\n"))
	if _, r, err := Build(q); err == nil || !strings.Contains(err.Error(), "1 of 4 lines were rejected, more than a share of 0.01") || r.Rejected() != 1 {
		t.Errorf("error %v, report %+v", err, r)
	}
	q.MaxRejected = 0.24
	if _, _, err := Build(q); err == nil {
		t.Error("a quarter of the lines was rejected, 0.24 are allowed, and the build went on")
	}
	q.MaxRejected = 0.25
	b, r := mustBuild(t, q)
	if r.Rejected() != 1 {
		t.Errorf("%d lines were rejected", r.Rejected())
	}
	want := setting.Warning{Code: "rejected_line", Detail: `poles.dat:5: columns 3-11, the latitude: "95.000" is no number within -90 and 90`}
	if w := b.Model.Warnings(); len(w) != 1 || w[0] != want {
		t.Errorf("warnings %+v, want %+v", w, want)
	}
}

// Faults of a network, here a line that stands twice and an outline of a plate
// that is none, are warnings, and the model is built all the same.
func TestFaultsOfTheNetworkAreWarnings(t *testing.T) {
	q := smallRequest()
	steps := strings.Split(strings.TrimRight(slurp(t, "steps.dat"), "\n"), "\n")
	twice := strings.Replace(strings.Replace(steps[len(steps)-2], "BB/PA", `CC\PA`, 1), ":CC", " CC", 1)
	q.Steps = text("steps.dat", strings.Join(append(steps, twice), "\n"))
	q.Plates = text("plates.dig", slurp(t, "plates.dig")+"QQ\n 1,1\n 2,2\n 3,1\n 1,1\n*** end\n")
	b, _ := mustBuild(t, q)
	codes := map[string]int{}
	for _, w := range b.Model.Warnings() {
		codes[w.Code]++
		if w.Code == "network_coincident" && (!w.Placed || math.Abs(w.At.Lon+120) > 1e-6 || math.Abs(w.At.Lat+60) > 1e-6) {
			t.Errorf("%+v, want it at -120, -60", w)
		}
	}
	if codes["network_coincident"] != 1 || codes["plate_outline"] < 2 {
		t.Errorf("warnings %v, want one coincident leg, an outline too many and one too few", codes)
	}
}

// What no file gives is the base's.
func TestBaseGivesTheRest(t *testing.T) {
	base, _ := mustBuild(t, smallRequest())
	b, _ := mustBuild(t, Request{Base: base, Identity: bundle.Identity{ID: "next", Edition: "2"}, Velocities: []Velocities{{"other", *small("velocities.csv")}}, Codes: BirdCodes()})
	for _, name := range base.Files() {
		if name != "model.json" && string(b.File(name)) != string(base.File(name)) {
			t.Errorf("%s is not the base's", name)
		}
	}
	if got, want := b.Model.MotionNames(), []string{"invented", "other", PB2002}; !slices.Equal(got, want) || b.Model.DefaultMotion() != base.Model.DefaultMotion() {
		t.Errorf("motion models %v, default %s", got, b.Model.DefaultMotion())
	}
	if c := b.Model.Citations(); !slices.ContainsFunc(c, func(s string) bool { return strings.HasPrefix(s, "For what is kept of small@1: ") }) {
		t.Errorf("citations %q do not name the base", c)
	}

	// a grid takes the place of the base's slab where it lies
	q := Request{Base: base, Identity: bundle.Identity{ID: "next", Edition: "3"}, Codes: BirdCodes()}
	for _, f := range smallGrids() {
		f.Name = strings.Replace(f.Name, "zzz_", "yyy_", 1)
		q.Slab2 = append(q.Slab2, f)
	}
	b, report := mustBuild(t, q)
	if s := b.Model.Slabs(); len(s) != 1 || s[0].ID != "yyy" || !slices.Equal(report.Superseded, []string{"zzz by yyy"}) {
		t.Errorf("%d slabs, superseded %v", len(s), report.Superseded)
	}
	if b.File("slabs/zzz/depth.xyz.gz") != nil || b.File("slabs/yyy/depth.xyz.gz") == nil {
		t.Errorf("files %v", b.Files())
	}

	// another network ties the base's slabs anew, and drops the plates that it lacks
	m, err := ParseMapping("id=NR,name=LABEL,type=KIND,left_plate=L,right_plate=R,subducting_plate=DOWN,sigma_km=S,type:SPREAD=spreading_ridge")
	if err != nil {
		t.Fatal(err)
	}
	codes := Codes{"AF": "ZZ"}
	b, _ = mustBuild(t, Request{Base: base, Identity: bundle.Identity{ID: "next", Edition: "4"}, Boundaries: small("boundaries.geojson"), Mapping: m, Codes: codes})
	if s := b.Model.Slabs(); len(s) != 1 || !slices.Equal(s[0].BoundaryIDs, []string{"3"}) || string(b.File("slabs/zzz/dip.xyz.gz")) != string(base.File("slabs/zzz/dip.xyz.gz")) {
		t.Errorf("slabs %+v", s)
	}
	mm, _ := b.Model.Motion("invented")
	if mm.Has("NU") || !mm.Has("BB") {
		t.Errorf("the motion model holds %v", mm.Entries())
	}
}
