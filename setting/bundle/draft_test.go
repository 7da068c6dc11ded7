package bundle

import (
	"os"
	"slices"
	"strings"
	"testing"
	"testing/fstest"

	"nearmargin/setting"
	"nearmargin/setting/boundary"
	"nearmargin/setting/motion"
	"nearmargin/setting/slab"
	"nearmargin/setting/sphere"
)

func smallDraft(tb testing.TB) (*Draft, *Bundle) {
	tb.Helper()
	base := mustRead(tb, os.DirFS("testdata/geojson"))
	d, err := NewDraft(base)
	if err != nil {
		tb.Fatal(err)
	}
	return d, base
}

func mustBundle(tb testing.TB, d *Draft) *Bundle {
	tb.Helper()
	b, err := d.Bundle()
	if err != nil {
		tb.Fatal(err)
	}
	return b
}

func TestDraftOfABundleIsTheBundle(t *testing.T) {
	d, base := smallDraft(t)
	sameFiles(t, mustBundle(t, d), base)
}

func TestDraftKeepsWarnings(t *testing.T) {
	d, base := smallDraft(t)
	want := []setting.Warning{
		{Code: "network_open_end", Placed: true, At: sphere.LonLat{Lon: -120.5, Lat: 3}, Detail: `boundary "a" ends here, and no "other"`},
		{Code: "rejected_line", Detail: "f:1: x"},
	}
	d.SetWarnings(want)
	b := mustBundle(t, d)
	dir := t.TempDir() + "/model"
	if err := b.Write(dir); err != nil {
		t.Fatal(err)
	}
	again := mustRead(t, os.DirFS(dir))
	sameFiles(t, again, b)
	if got := again.Model.Warnings(); !slices.Equal(got, want) {
		t.Errorf("warnings %+v, want %+v", got, want)
	}
	if b.Model.SHA256() == base.Model.SHA256() {
		t.Error("warnings do not change the checksum")
	}
	d.SetWarnings(nil)
	sameFiles(t, mustBundle(t, d), base)
}

func TestReadWarningsRefuses(t *testing.T) {
	for _, c := range []struct{ text, want string }{
		{"code,lon,lat\n", "they must start with code,lon,lat,detail"},
		{"code,lon,lat,detail\nA b,,,x\n", "must be lower-case words"},
		{"code,lon,lat,detail\na,,,\n", "needs a detail"},
		{"code,lon,lat,detail\na,1,,x\n", "must be a number"},
		{"code,lon,lat,detail\na,1,91,x\n", "warnings.csv:2"},
	} {
		if _, err := readWarnings([]byte(c.text)); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%q: error %v, want %q", c.text, err, c.want)
		}
	}
}

func TestDraftMotions(t *testing.T) {
	d, base := smallDraft(t)
	n := len(base.Model.MotionNames())
	if err := d.SetMotion(motion.Info{Name: "new"}, PoleForm, []MotionRow{{"BB", []string{"1.50", "2", "0.10", ""}}, {"AA", []string{"1", "2", "0.3", "0.01"}}}); err != nil {
		t.Fatal(err)
	}
	b := mustBundle(t, d)
	if got := len(b.Model.MotionNames()); got != n+1 {
		t.Errorf("%d motion models, want %d", got, n+1)
	}
	if got, want := string(b.File("motion/new.csv")), "plate,lat_deg,lon_deg,rate_deg_myr,rate_sigma_deg_myr,basis\nAA,1,2,0.3,0.01,published\nBB,1.50,2,0.10,,published\n"; got != want {
		t.Errorf("%q, want %q", got, want)
	}
	if _, err := d.KeepMotionsOf([]string{"AA", "CC"}); err != nil {
		t.Fatal(err)
	}
	anchors := false
	for _, name := range mustBundle(t, d).Model.MotionNames() {
		m, _ := mustBundle(t, d).Model.Motion(name)
		anchor := slices.ContainsFunc(m.Entries(), func(e motion.Entry) bool { return e.Anchor() == "BB" })
		if m.Has("BB") != anchor {
			t.Errorf("%s: BB is kept: %v; a velocity is composed on it: %v", name, m.Has("BB"), anchor)
		}
		anchors = anchors || anchor
	}
	if !anchors {
		t.Error("no velocity of the small model is composed on BB, so nothing is shown")
	}
	if err := d.SetMotion(motion.Info{Name: "../x"}, PoleForm, nil); err == nil {
		t.Error("a name that leaves the directory was taken")
	}
	if err := d.SetMotion(motion.Info{Name: "x"}, CartesianForm, []MotionRow{{"AA", []string{"1"}}}); err == nil {
		t.Error("a row of one number was taken")
	}
	for _, c := range []struct {
		form MotionForm
		row  MotionRow
		want string
	}{
		{PoleForm, MotionRow{"AA", []string{"1", "2", "0.3", ""}}, ""},
		{PoleForm, MotionRow{"AA", []string{"99", "2", "0.3", ""}}, "no position"},
		{CartesianForm, MotionRow{"AA", []string{"1", "2", "3", "-1", "1", "1"}}, "must be 0 or more"},
		{CovarianceForm, MotionRow{"AA", []string{"1", "2", "3", "-1", "0", "0", "1", "0", "1"}}, "diagonal"},
	} {
		if err := c.row.Check(c.form); c.want == "" && err != nil || c.want != "" && (err == nil || !strings.Contains(err.Error(), c.want)) {
			t.Errorf("%+v: %v, want %q", c.row, err, c.want)
		}
	}
}

func TestDraftSlabs(t *testing.T) {
	d, base := smallDraft(t)
	var b0 *boundary.Boundary
	for _, b := range base.Model.Network().Boundaries() {
		if b.Type() == boundary.Subduction {
			b0 = b
		}
	}
	l := &slab.Layer{West: 10, South: 0, Step: 0.5, Cols: 2, Rows: 2, Values: []float32{10.12345, 20, 10, 20}}
	surface, err := slab.NewGrid(slab.Layers{Depth: l})
	if err != nil {
		t.Fatal(err)
	}
	s, err := slab.New(slab.Spec{
		ID: "one", Name: "One", Kind: slab.Subduction, BoundaryIDs: []string{b0.ID()}, Subducting: b0.Left(), Overriding: b0.Right(),
		ArcMinDepthKm: 80, Source: "made up", SourceStatus: "memory", Surface: surface,
	})
	if err != nil {
		t.Fatal(err)
	}
	if err := d.SetSlabs([]*slab.Slab{s}); err != nil {
		t.Fatal(err)
	}
	b := mustBundle(t, d)
	if got := b.Model.Slabs(); len(got) != 1 || got[0].ID != "one" || b.File("slabs/one/depth.xyz.gz") == nil || b.File("slabs/one/sigma.xyz.gz") != nil {
		t.Fatalf("slabs %v, files %v", got, b.Files())
	}
	if r, ok := b.Model.Slabs()[0].Surface.At(sphere.FromLonLat(sphere.LonLat{Lon: 10, Lat: 0})); !ok || r.DepthKm < 10.122 || r.DepthKm > 10.124 {
		t.Errorf("depth %+v, %v; want 10.123, rounded to a metre", r, ok)
	}
	// a draft of that keeps the grid's bytes
	next, err := NewDraft(b)
	if err != nil {
		t.Fatal(err)
	}
	if err := next.SetSlabs(b.Model.Slabs()); err != nil {
		t.Fatal(err)
	}
	sameFiles(t, mustBundle(t, next), b)
	// also those of a grid that is written otherwise than a draft would
	dir := fstest.MapFS{}
	for _, name := range b.Files() {
		dir[name] = &fstest.MapFile{Data: b.File(name)}
	}
	delete(dir, "slabs/one/depth.xyz.gz")
	dir["slabs/one/depth.xyz"] = &fstest.MapFile{Data: []byte("10,0,10.12345\n10.5,0,20\n10,0.5,10\n10.5,0.5,20\n")}
	plain := mustRead(t, dir)
	if next, err = NewDraft(plain); err != nil {
		t.Fatal(err)
	}
	if err := next.SetSlabs(plain.Model.Slabs()); err != nil {
		t.Fatal(err)
	}
	sameFiles(t, mustBundle(t, next), plain)
	if err := next.SetSlabs(nil); err != nil {
		t.Fatal(err)
	}
	if c := mustBundle(t, next); len(c.Model.Slabs()) != 0 || c.File("slabs/one/depth.xyz.gz") != nil {
		t.Errorf("files %v of a model without slabs", c.Files())
	}
	bad := s.Spec
	bad.ID = "../one"
	if x, err := slab.New(bad); err != nil || next.SetSlabs([]*slab.Slab{x}) == nil {
		t.Errorf("a slab %q that leaves the directory was taken (%v)", bad.ID, err)
	}
}
