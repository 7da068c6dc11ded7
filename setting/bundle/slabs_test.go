package bundle

import (
	"os"
	"path/filepath"
	"reflect"
	"slices"
	"strings"
	"testing"
	"testing/fstest"

	"nearmargin/setting/slab"
)

// Two slabs of the small model in both forms. The second crosses ±180° and goes
// down from nothing.
const (
	twoSlabsText = smallSlab + `
slab lost-slab   # no trench is left of it
name Lost "slab", a small one
kind collision
subducting_plate CC
overriding_plate CC
arc_min_depth_km 100
sigma_km 20
source made up
source_status consulted
contour 60
170 40
-170 40
contour 300 sigma 40.5
170 38
-170 38
`
	slabsHeader   = "slab,name,kind,boundary_ids,subducting_plate,overriding_plate,arc_min_depth_km,source,source_status\n"
	frontRow      = "front-slab,Front slab,subduction,front-4,BB,AA,80,made up,memory\n"
	twoSlabsTable = slabsHeader + frontRow + `lost-slab,"Lost ""slab"", a small one",collision,,CC,CC,100,made up,consulted` + "\n"
	frontContours = `{"type":"Feature","properties":{"slab":"front-slab","depth_km":20,"sigma_km":10},"geometry":{"type":"LineString","coordinates":[[40,3],[20,3]]}},
		{"type":"Feature","properties":{"slab":"front-slab","depth_km":100,"sigma_km":15},"geometry":{"type":"LineString","coordinates":[[40,5],[20,5]]}}`
	twoContours = `{"type":"FeatureCollection","features":[` + frontContours + `,
		{"type":"Feature","properties":{"slab":"lost-slab","depth_km":60,"sigma_km":20},"geometry":{"type":"LineString","coordinates":[[170,40],[-170,40]]}},
		{"type":"Feature","properties":{"slab":"lost-slab","depth_km":300,"sigma_km":40.5},"geometry":{"type":"LineString","coordinates":[[170,38],[-170,38]]}}]}`
)

// withFiles returns the small model with files added.
func withFiles(tb testing.TB, files map[string]string) fstest.MapFS {
	tb.Helper()
	dir := changed(tb, "testdata/geojson", "", "", "")
	for name, text := range files {
		dir[name] = &fstest.MapFile{Data: []byte(text)}
	}
	return dir
}

func TestTheTwoFormsOfSlabsGiveEqualModels(t *testing.T) {
	written := mustRead(t, changed(t, "testdata/written", "slabs/b.txt", "", twoSlabsText))
	table := mustRead(t, withFiles(t, map[string]string{slabsFile: twoSlabsTable, contoursFile: twoContours}))
	sameFiles(t, table, written)
	if got, want := table.Model.Slabs(), written.Model.Slabs(); len(want) != 2 || !reflect.DeepEqual(got, want) {
		t.Errorf("slabs %+v, want %+v", got, want)
	}
	dir := filepath.Join(t.TempDir(), "again")
	if err := table.Write(dir); err != nil {
		t.Fatal(err)
	}
	again := mustRead(t, os.DirFS(dir))
	sameFiles(t, again, table)
	if !reflect.DeepEqual(again.Model.Slabs(), table.Model.Slabs()) {
		t.Error("the slabs differ once they are written and read again")
	}
	for _, file := range []string{slabsFile, contoursFile} {
		if !slices.Contains(table.Files(), file) {
			t.Errorf("%s is not among the canonical files", file)
		}
	}
	// a slab more changes the checksum
	one := mustRead(t, changed(t, "testdata/written", "slabs/b.txt", "", smallSlab))
	if one.Model.SHA256() == written.Model.SHA256() {
		t.Error("a slab less has the same checksum")
	}
}

// A line's name stands for its subduction runs, else for its convergent ones, else
// for all; a run can be named by itself.
func TestBoundariesOfALine(t *testing.T) {
	resolve := lineResolver(mustRead(t, os.DirFS("testdata/written")).Model.Network().Boundaries())
	for name, want := range map[string][]string{
		"front": {"front-4"}, "back": {"back-1"}, "south": {"south"}, "front-1": {"front-1"}, "back-2": {"back-2"}, "fro": nil, "front-": nil, "": nil,
	} {
		if got := resolve(name); !slices.Equal(got, want) {
			t.Errorf("%q stands for %v, want %v", name, got, want)
		}
	}
	text := strings.Replace(smallSlab, "boundaries front-4", "boundaries front front-4 back", 1)
	if got := mustRead(t, changed(t, "testdata/written", "slabs/a.txt", "", text)).Model.Slabs()[0].BoundaryIDs; !slices.Equal(got, []string{"back-1", "front-4"}) {
		t.Errorf("boundaries %v, want each once", got)
	}
}

// faultCase is a fault put into the files of slabs.
type faultCase struct {
	name  string
	files map[string]string
	file  string
	line  int
	want  string
}

func checkSlabFaults(t *testing.T, list []faultCase) {
	t.Helper()
	for _, c := range list {
		t.Run(c.name, func(t *testing.T) {
			_, err := Read(withFiles(t, c.files))
			fe, ok := err.(*FileError) //nolint:errorlint // Read returns it as it is
			if !ok {
				t.Fatalf("error %v, want a *FileError", err)
			}
			if fe.File != c.file || fe.Line != c.line || !strings.Contains(err.Error(), c.want) {
				t.Errorf("%s:%d: %q; want %s:%d and %q", fe.File, fe.Line, err, c.file, c.line, c.want)
			}
		})
	}
}

func TestFaultsOfSlabTables(t *testing.T) {
	contours := `{"type":"FeatureCollection","features":[` + frontContours + `]}`
	row := func(old, with string) map[string]string {
		changed := strings.Replace(frontRow, old, with, 1)
		if changed == frontRow {
			t.Fatalf("no %q in the row", old)
		}
		return map[string]string{slabsFile: slabsHeader + changed, contoursFile: contours}
	}
	lines := func(old, with string) map[string]string {
		changed := strings.Replace(contours, old, with, 1)
		if changed == contours {
			t.Fatalf("no %q in the contours", old)
		}
		return map[string]string{slabsFile: slabsHeader + frontRow, contoursFile: changed}
	}
	checkSlabFaults(t, []faultCase{
		{"columns", map[string]string{slabsFile: "slab,name\n"}, slabsFile, 1, "they must start with slab,name,kind,boundary_ids"},
		{"id in capitals", row("front-slab", "Front"), slabsFile, 2, `slab "Front" must be lower-case letters, digits and hyphens`},
		{"id that leaves the directory", row("front-slab", "../front"), slabsFile, 2, `must be lower-case letters`},
		{"kind unknown", row("subduction", "sinking"), slabsFile, 2, `slab kind "sinking" is unknown; the kinds are [subduction collision]`},
		{"boundary unknown", row("front-4", "front-4 front-9"), slabsFile, 2, `slab "front-slab": there is no boundary "front-9"`},
		{"a line is no boundary here", row("front-4", "front"), slabsFile, 2, `there is no boundary "front"`},
		{"arc no number", row(",80,", ",deep,"), slabsFile, 2, `arc_min_depth_km is "deep"; it must be a number`},
		{"arc out of range", row(",80,", ",180,"), slabsFile, 2, "arc_min_depth_km is 180; it must be within 60 and 100"},
		{"no name", row("Front slab", ""), slabsFile, 2, "name is empty"},
		{"no plate", row(",BB,", ",,"), slabsFile, 2, "must both be given"},
		{"no source", row("made up", ""), slabsFile, 2, "source is empty"},
		{"status unknown", row("memory", "hearsay"), slabsFile, 2, `source_status is "hearsay"`},
		{"twice", map[string]string{slabsFile: slabsHeader + frontRow + frontRow, contoursFile: contours}, slabsFile, 3, `slab "front-slab" stands already at line 2`},
		{"no surface", map[string]string{slabsFile: slabsHeader + frontRow}, contoursFile, 0, "slab front-slab: 0 contours; at least 2 are needed"},
		{"contours of another slab", map[string]string{slabsFile: slabsHeader + frontRow, contoursFile: twoContours}, contoursFile, 0, `slab "lost-slab" is not in slabs/slabs.csv`},
		{"contours without a table", map[string]string{contoursFile: contours}, contoursFile, 0, "stands without slabs/slabs.csv"},
		{"both forms", map[string]string{slabsFile: slabsHeader + frontRow, contoursFile: contours, "slabs/a.txt": smallSlab}, slabsFile, 0, "stands beside slabs/*.txt; a model has one or the other"},

		{"no JSON", map[string]string{slabsFile: slabsHeader + frontRow, contoursFile: "{"}, contoursFile, 0, "unexpected EOF"},
		{"unknown member", lines(`"depth_km"`, `"depth"`), contoursFile, 0, `unknown field "depth"`},
		{"longitude out of range", lines("[40,3]", "[400,3]"), contoursFile, 0, `features[0] (slab "front-slab"): longitude 400 is out of range`},
		{"geometry of points", lines("LineString", "MultiPoint"), contoursFile, 0, `features[0] (slab "front-slab"): geometry is "MultiPoint"`},
		{"depths out of order", lines(`"depth_km":20`, `"depth_km":120`), contoursFile, 0, "slab front-slab: contour 2: depth_km 100 does not lie below the one before, 120"},
		{"no σ", lines(`,"sigma_km":15`, ""), contoursFile, 0, "contour 100 km: sigma_km is 0; it must be more than 0"},
		{"σ below 0", lines(`"sigma_km":15`, `"sigma_km":-15`), contoursFile, 0, "sigma_km is -15"},
		{"on the left", lines(`[[40,5],[20,5]]`, `[[40,1],[20,1]]`), contoursFile, 0, "the contour of 100 km lies to the left of that of 20 km"},
		{"the other way round", lines(`[[40,5],[20,5]]`, `[[20,5],[40,5]]`), contoursFile, 0, "run in opposite directions"},
	})
	if _, err := Read(withFiles(t, row(",BB,", ",QQ,"))); err == nil || !strings.Contains(err.Error(), `slab "front-slab": plate "QQ" is not in the table of plates`) {
		t.Errorf("unknown plate: %v", err)
	}
}

func TestFaultsOfWrittenContours(t *testing.T) {
	for _, c := range []struct{ name, old, with, want string }{
		{"σ without bound", "sigma 15", "sigma inf", "sigma_km is +Inf"},
		{"depth not a number", "contour 20", "contour nan", "depth_km is NaN; it must be within 0 and 800"},
		{"no σ at all", "sigma_km 10\n", "", "contour 20 km: sigma_km is 0"},
		{"a single contour", "contour 100 sigma 15\n40 5\n20 5\n", "", "slab front-slab: 1 contours; at least 2 are needed"},
		{"on the left", "40 5\n20 5", "40 1\n20 1", "lies to the left of that of 20 km; the slab must deepen to the right"},
		{"arc out of range", "arc_min_depth_km 80", "arc_min_depth_km 30", "arc_min_depth_km is 30; it must be within 60 and 100"},
		{"no source", "source made up\n", "", `slab "front-slab": source is empty`},
	} {
		checkFaults(t, "testdata/written", []deliberate{{c.name, "slabs/a.txt", "", strings.Replace(smallSlab, c.old, c.with, 1), 1, c.want}})
	}
}

// FuzzSlabText reads the written form, writes what it holds as table and contours,
// and wants the same slabs back, and the same bytes.
func FuzzSlabText(f *testing.F) {
	f.Add(twoSlabsText)
	f.Add(strings.Replace(smallSlab, "sigma_km 10", "sigma_km 1e-300", 1))
	f.Add(strings.Replace(smallSlab, "40 3\n20 3", "-179.99 3\n160 3", 1))
	f.Fuzz(func(t *testing.T, text string) {
		drafts, err := parseSlabs("slabs/a.txt", text)
		if err != nil {
			refused(t, err)
			return
		}
		ids := map[string]bool{}
		var slabs []*slab.Slab
		for _, d := range drafts {
			d.boundaries = nil // they belong to a model
			s, err := d.finish(lineResolver(nil))
			if err != nil {
				refused(t, err)
				return
			}
			if ids[s.ID] {
				return
			}
			ids[s.ID] = true
			slabs = append(slabs, s)
		}
		if len(slabs) == 0 {
			return
		}
		first := &Bundle{files: map[string][]byte{}}
		if err := first.encodeSlabs(slabs); err != nil {
			t.Fatal(err)
		}
		r := reader{dir: fstest.MapFS{contoursFile: {Data: first.files[contoursFile]}}, grids: map[string][]byte{}}
		again, err := r.tableSlabs(first.files[slabsFile], nil)
		if err != nil {
			t.Fatalf("cannot read what was written: %v\n%s\n%s", err, first.files[slabsFile], first.files[contoursFile])
		}
		second := &Bundle{files: map[string][]byte{}}
		if err := second.encodeSlabs(again); err != nil {
			t.Fatal(err)
		}
		if !reflect.DeepEqual(first.files, second.files) {
			t.Fatalf("written:\n%s\nread and written again:\n%s", first.files[contoursFile], second.files[contoursFile])
		}
	})
}
