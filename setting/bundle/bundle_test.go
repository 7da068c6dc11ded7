package bundle

import (
	"errors"
	"io/fs"
	"maps"
	"os"
	"path/filepath"
	"reflect"
	"slices"
	"strings"
	"testing"
	"testing/fstest"

	"nearmargin/setting"
	"nearmargin/setting/boundary"
)

func mustRead(tb testing.TB, dir fs.FS) *Bundle {
	tb.Helper()
	b, err := Read(dir)
	if err != nil {
		tb.Fatal(err)
	}
	return b
}

// sameBoundaries reports how two networks differ.
func sameBoundaries(tb testing.TB, got, want []*boundary.Boundary) {
	tb.Helper()
	if len(got) != len(want) {
		tb.Fatalf("%d boundaries, want %d", len(got), len(want))
	}
	for i, g := range got {
		if w := want[i]; !reflect.DeepEqual(g, w) {
			tb.Errorf("boundary %q: %+v, want %q: %+v", g.ID(), g, w.ID(), w)
		}
	}
}

// sameFiles reports which canonical files of two bundles differ.
func sameFiles(tb testing.TB, got, want *Bundle) {
	tb.Helper()
	if !slices.Equal(got.Files(), want.Files()) {
		tb.Fatalf("files %v, want %v", got.Files(), want.Files())
	}
	for _, name := range want.Files() {
		if g, w := string(got.File(name)), string(want.File(name)); g != w {
			tb.Errorf("%s:\n%s\nwant\n%s", name, g, w)
		}
	}
	if g, w := got.Model.SHA256(), want.Model.SHA256(); g != w || len(g) != 64 {
		tb.Errorf("checksum %q, want %q", g, w)
	}
}

func TestTheTwoFormsGiveEqualModels(t *testing.T) {
	written, geo := mustRead(t, os.DirFS("testdata/written")), mustRead(t, os.DirFS("testdata/geojson"))
	for _, f := range written.Model.Network().Faults() {
		t.Errorf("the small model is not closed: %s at %v: %s", f.Code, f.At, f.Detail)
	}
	sameBoundaries(t, geo.Model.Network().Boundaries(), written.Model.Network().Boundaries())
	sameFiles(t, geo, written)
}

func TestWrittenFormCutsLinesIntoRuns(t *testing.T) {
	m := mustRead(t, os.DirFS("testdata/written")).Model
	var got []string
	for _, b := range m.Network().Boundaries() {
		got = append(got, strings.Join([]string{b.ID(), b.Name(), b.Type().String(), b.Left() + b.Right(), b.Subducting(), decimal(b.SigmaKm()), string(b.SourceStatus())}, "|"))
	}
	want := []string{
		"back-1|Back|oceanic_convergence|AACC|AA|20|consulted",
		"back-2|Back fault|continental_transform|AACC||20|consulted", // nothing goes down at a fault
		"front-1|Front Ridge|spreading_ridge|AABB||12|memory",
		"front-2|Front fracture zone|oceanic_transform|AABB||15|memory", // with the σ of its kind
		"front-3|Front Ridge|spreading_ridge|AABB||12|memory",
		"front-4|Front|subduction|AABB|BB|12|memory",
		"front-5|Front|continental_convergence|AABB|BB|12|memory",
		"south|South|continental_rift|CCBB||30|memory", // a single run keeps the line's id
	}
	if !slices.Equal(got, want) {
		t.Errorf("runs\n%s\nwant\n%s", strings.Join(got, "\n"), strings.Join(want, "\n"))
	}
	var names []string
	for _, j := range m.Junctions() {
		names = append(names, j.Name)
	}
	// one node has a title, the other is named after its plates
	if want := []string{"Ay-Bee-Cee, the wide one triple junction", "East triple junction"}; !slices.Equal(names, want) {
		t.Errorf("junctions %q, want %q", names, want)
	}
}

// Legs of one kind with a name of their own are a boundary of their own.
func TestWrittenFormCutsWhereTheNameChanges(t *testing.T) {
	m := mustRead(t, changed(t, "testdata/written", "boundaries/a.txt", "30 2.125", "30 2.125 trench Second Front")).Model
	b, ok := m.Network().Boundary("front-5")
	if !ok || b.Name() != "Second Front" || b.Type() != boundary.Subduction || len(b.Path()) != 2 {
		t.Errorf("front-5 is %+v, want the trench Second Front of one leg", b)
	}
}

// People read the files: &, < and > stand as they are.
func TestWritingEscapesNothing(t *testing.T) {
	b := mustRead(t, changed(t, "testdata/written", "boundaries/a.txt", "Front fracture zone", "Front & <fracture> zone"))
	for file, want := range map[string]string{"boundaries.geojson": `"Front & <fracture> zone"`, "model.json": "A small model: three plates <made up>"} {
		if got := string(b.File(file)); !strings.Contains(got, want) {
			t.Errorf("%s holds no %s:\n%s", file, want, got)
		}
	}
}

func TestWriteAndReadAgain(t *testing.T) {
	for _, from := range []string{"testdata/written", "testdata/geojson", "../builtin/model"} {
		t.Run(filepath.Base(from), func(t *testing.T) {
			first := mustRead(t, os.DirFS(from))
			dir := filepath.Join(t.TempDir(), "new", "model")
			if err := first.Write(dir); err != nil {
				t.Fatal(err)
			}
			again := mustRead(t, os.DirFS(dir))
			sameFiles(t, again, first)
			sameBoundaries(t, again.Model.Network().Boundaries(), first.Model.Network().Boundaries())
			if !reflect.DeepEqual(again.Model.Plates(), first.Model.Plates()) || !reflect.DeepEqual(again.Model.Hotspots(), first.Model.Hotspots()) ||
				!reflect.DeepEqual(again.Model.Zones(), first.Model.Zones()) || !reflect.DeepEqual(again.Model.Junctions(), first.Model.Junctions()) {
				t.Error("plates, hotspots, zones or junctions differ")
			}
			for _, name := range first.Model.MotionNames() {
				a, _ := again.Model.Motion(name)
				b, _ := first.Model.Motion(name)
				if !reflect.DeepEqual(a, b) {
					t.Errorf("motion model %s differs", name)
				}
			}
			for _, name := range first.Files() {
				raw, err := os.ReadFile(filepath.Join(dir, filepath.FromSlash(name)))
				if err != nil || string(raw) != string(first.File(name)) {
					t.Errorf("%s on disk is not the file in memory (%v)", name, err)
				}
			}
		})
	}
}

func TestWriteRefusesADirectoryInUse(t *testing.T) {
	dir := t.TempDir()
	if err := os.WriteFile(filepath.Join(dir, "plates.csv"), nil, 0o644); err != nil {
		t.Fatal(err)
	}
	err := mustRead(t, os.DirFS("testdata/written")).Write(dir)
	if err == nil || !strings.Contains(err.Error(), "is not empty") || !strings.Contains(err.Error(), dir) {
		t.Errorf("error %v, want one that names the directory", err)
	}
	if have, _ := os.ReadDir(dir); len(have) != 1 {
		t.Errorf("%d files in it, want the one that was there", len(have))
	}
}

func TestChecksumFollowsTheContent(t *testing.T) {
	first := mustRead(t, os.DirFS("testdata/written"))
	for _, change := range []struct{ name, file, old, new string }{
		{"a comment", "boundaries/a.txt", "# The equator", "# That equator"},
		{"blanks in the model's file", "model.json", `  "id"`, `"id"`},
		{"order of the plates", "plates.csv", "AA,Ay\nBB,Bee\n", "BB,Bee\nAA,Ay\n"},
	} {
		if got := mustRead(t, changed(t, "testdata/written", change.file, change.old, change.new)); got.Model.SHA256() != first.Model.SHA256() {
			t.Errorf("%s: the checksum changed", change.name)
		}
	}
	for _, change := range []struct{ name, file, old, new string }{
		{"a vertex", "boundaries/a.txt", "2.125", "2.126"},
		{"a plate's name", "plates.csv", "Bee", "Bees"},
		{"a pole", "motion/poles.csv", "-30.5", "-30.6"},
		{"the edition", "model.json", `"1.0"`, `"1.1"`},
		{"a zone", "zones.geojson", `"mixed"`, `"shear"`},
		{"a hotspot", "hotspots.csv", "40", "41"},
	} {
		if got := mustRead(t, changed(t, "testdata/written", change.file, change.old, change.new)); got.Model.SHA256() == first.Model.SHA256() {
			t.Errorf("%s: the checksum did not change", change.name)
		}
	}
}

func TestFileReturnsACopy(t *testing.T) {
	b := mustRead(t, os.DirFS("testdata/written"))
	b.File("plates.csv")[0] = 'X'
	if got := b.File("plates.csv"); got[0] != 'c' {
		t.Errorf("the bundle's file changed to %q", got)
	}
	if got := b.File("no such file"); got != nil {
		t.Errorf("got %q, want nil", got)
	}
}

func TestSmallestModel(t *testing.T) {
	dir := changed(t, "testdata/written", "", "", "")
	delete(dir, "zones.geojson")
	delete(dir, "hotspots.csv")
	b := mustRead(t, dir)
	for _, name := range []string{"zones.geojson", "hotspots.csv"} {
		if slices.Contains(b.Files(), name) {
			t.Errorf("%s is among the files of a model without it", name)
		}
	}
	if a, err := b.Model.At(setting.SiteAt(0, 45)); err != nil || a.Plate.Code != "AA" {
		t.Errorf("at 0, 45: %v, %v; want plate AA", a, err)
	}
}

// changed returns a model directory in memory, with one file changed.
func changed(tb testing.TB, dir, file, old, with string) fstest.MapFS {
	tb.Helper()
	out := fstest.MapFS{}
	err := fs.WalkDir(os.DirFS(dir), ".", func(path string, d fs.DirEntry, err error) error {
		if err != nil || d.IsDir() {
			return err
		}
		raw, err := os.ReadFile(filepath.Join(dir, path))
		out[path] = &fstest.MapFile{Data: raw}
		return err
	})
	if err != nil {
		tb.Fatal(err)
	}
	if file == "" {
		return out
	}
	if f := out[file]; f == nil || old == "" {
		out[file] = &fstest.MapFile{Data: []byte(with)} // a new file, or new content
	} else if text := string(f.Data); strings.Contains(text, old) {
		f.Data = []byte(strings.Replace(text, old, with, 1))
	} else {
		tb.Fatalf("%s holds no %q; there are %v", file, old, slices.Sorted(maps.Keys(out)))
	}
	return out
}

func TestFileErrorText(t *testing.T) {
	cause := errors.New("cause")
	for _, c := range []struct {
		err  FileError
		want string
	}{
		{FileError{File: "a.csv", Detail: "wrong"}, "a.csv: wrong"},
		{FileError{File: "a.csv", Line: 7, Detail: "wrong"}, "a.csv:7: wrong"},
		{FileError{File: "a.csv", Line: 7, Err: cause}, "a.csv:7: cause"},
		{FileError{File: "a.csv", Detail: "features[3]", Err: cause}, "a.csv: features[3]: cause"},
	} {
		if got := c.err.Error(); got != c.want {
			t.Errorf("%q, want %q", got, c.want)
		}
		if errors.Is(&c.err, cause) != (c.err.Err != nil) {
			t.Errorf("%q: wraps its cause %v", c.want, errors.Is(&c.err, cause))
		}
	}
}
