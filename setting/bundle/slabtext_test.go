package bundle

import (
	"os"
	"path/filepath"
	"strings"
	"testing"

	"nearmargin/setting/slab"
)

// smallSlab is a slab below plate AA of the small model, deepening northward.
const smallSlab = `slab front-slab
name Front slab
kind subduction
boundaries front-4
subducting_plate BB
overriding_plate AA
arc_min_depth_km 80
sigma_km 10
source made up
source_status memory
contour 20
40 3
20 3
contour 100 sigma 15
40 5
20 5
`

func TestSlabsInTheWrittenForm(t *testing.T) {
	first := mustRead(t, changed(t, "testdata/written", "slabs/a.txt", "", smallSlab))
	s := first.Model.Slabs()[0]
	if s.ID != "front-slab" || s.Kind != slab.Subduction || s.Subducting != "BB" || s.Overriding != "AA" || s.ArcMinDepthKm != 80 || len(s.BoundaryIDs) != 1 || s.BoundaryIDs[0] != "front-4" {
		t.Errorf("slab %+v", s.Spec)
	}
	got := slab.Contours(s.Surface)
	if len(got) != 2 || got[0].DepthKm != 20 || got[0].SigmaKm != 10 || got[1].DepthKm != 100 || got[1].SigmaKm != 15 {
		t.Errorf("contours %+v, want 20 ± 10 and 100 ± 15 km", got)
	}
	dir := filepath.Join(t.TempDir(), "model")
	if err := first.Write(dir); err != nil {
		t.Fatal(err)
	}
	sameFiles(t, mustRead(t, os.DirFS(dir)), first)
}

func TestFaultsOfSlabsInTheWrittenForm(t *testing.T) {
	for _, c := range []struct {
		name, old, with string
		line            int
		want            string
	}{
		{"id in capitals", "slab front-slab", "slab Front", 1, `want "slab ID"`},
		{"before the first slab", "slab front-slab\n", "", 1, "stands before the first slab"},
		{"header unknown", "sigma_km 10", "sigma 10", 8, `"sigma" is unknown here`},
		{"σ no number", "sigma_km 10", "sigma_km ten", 8, "sigma_km: "},
		{"kind unknown", "kind subduction", "kind sinking", 3, `slab kind "sinking" is unknown`},
		{"contour without a depth", "contour 20", "contour", 11, `want "contour DEPTH_KM [sigma KM]"`},
		{"depth no number", "contour 20", "contour deep", 11, `depth "deep" is not a number`},
		{"contour's σ no number", "sigma 15", "sigma x", 14, `sigma "x" is not a number`},
		{"vertex of three numbers", "20 3", "20 3 4", 13, `want "LON LAT" below a contour`},
		{"vertex off the globe", "20 3", "20 93", 13, "latitude 93 is out of range"},
		{"boundary unknown", "front-4", "front-9", 1, `there is no line or boundary "front-9"`},
		{"another encoding", "Front slab", "Fr\xf6nt", 2, "not valid UTF-8"},
		{"a control character", "Front slab", "Fr\x00nt", 2, "holds a control character"},
	} {
		text := strings.Replace(smallSlab, c.old, c.with, 1)
		if text == smallSlab {
			t.Fatalf("%s: nothing changed", c.name)
		}
		checkFaults(t, "testdata/written", []deliberate{{c.name, "slabs/a.txt", "", text, c.line, c.want}})
	}
}

func FuzzSlabLines(f *testing.F) {
	f.Add(smallSlab)
	f.Fuzz(func(t *testing.T, text string) {
		drafts, err := parseSlabs("slabs/a.txt", text)
		if err != nil {
			refused(t, err)
			return
		}
		for _, d := range drafts {
			s, err := d.finish(func(name string) []string { return []string{name} })
			if err != nil {
				refused(t, err)
			} else if s.ID == "" || s.Name == "" || len(slab.Contours(s.Surface)) < 2 {
				t.Fatalf("slab %+v was accepted", s.Spec)
			}
		}
	})
}
