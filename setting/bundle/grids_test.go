package bundle

import (
	"bytes"
	"compress/gzip"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"

	"nearmargin/setting"
	"nearmargin/setting/slab"
	"nearmargin/setting/sphere"
)

const gridRow = slabsHeader + "deep,Deep,subduction,front-4,BB,AA,80,made up,memory\n"

// planeText is a layer of 5 by 4 nodes a quarter of a degree apart, without the
// node at its north-east corner.
func planeText(west float64, f func(x, y float64) float64) string {
	var b strings.Builder
	for y := range 4 {
		for x := range 5 {
			if x == 4 && y == 3 {
				continue
			}
			fmt.Fprintf(&b, "%g,%g,%g\n", west+float64(x)/4, 10+float64(y)/4, f(float64(x)/4, float64(y)/4))
		}
	}
	return b.String()
}

func zipped(tb testing.TB, text string) string {
	tb.Helper()
	var b bytes.Buffer
	z := gzip.NewWriter(&b)
	if _, err := z.Write([]byte(text)); err != nil {
		tb.Fatal(err)
	}
	if err := z.Close(); err != nil {
		tb.Fatal(err)
	}
	return b.String()
}

func TestGriddedSlab(t *testing.T) {
	depth := planeText(30, func(x, y float64) float64 { return 100 + 40*x + 8*y })
	backwards := func(text string) string {
		lines := strings.Split(strings.TrimSpace(text), "\n")
		for i, j := 0, len(lines)-1; i < j; i, j = i+1, j-1 {
			lines[i], lines[j] = lines[j], lines[i]
		}
		return strings.Join(lines, "\n")
	}
	shuffled := func(text string) string { // no two nodes that follow each other are neighbours
		lines := strings.Split(strings.TrimSpace(text), "\n")
		var out []string
		for i := range lines {
			out = append(out, lines[i*7%len(lines)])
		}
		return strings.Join(out, "\n")
	}
	for name, files := range map[string]map[string]string{
		"plain":            {"depth.xyz": depth},
		"zipped":           {"depth.xyz.gz": zipped(t, depth)},
		"backwards":        {"depth.xyz": backwards(depth)},
		"in no order":      {"depth.xyz": shuffled(depth)},
		"blanks and CRLF":  {"depth.xyz": "\r\n" + strings.NewReplacer(",", " \t", "\n", "\r\n").Replace(depth) + "\r\n"},
		"a NaN for a hole": {"depth.xyz": depth + "31,10.75,NaN\n"},
		"0 to 360":         {"depth.xyz": depth}, // 30 is itself there
		"all layers": {"depth.xyz": depth, "sigma.xyz.gz": zipped(t, planeText(30, func(x, y float64) float64 { return 5 + x })), "dip.xyz": planeText(30, func(x, y float64) float64 { return 33 }),
			"strike.xyz": planeText(30, func(x, y float64) float64 { return 350 }), "thickness.xyz": planeText(30, func(x, y float64) float64 { return 60 + y })},
	} {
		t.Run(name, func(t *testing.T) {
			dir := map[string]string{slabsFile: gridRow}
			for file, text := range files {
				dir["slabs/deep/"+file] = text
			}
			b := mustRead(t, withFiles(t, dir))
			a, err := b.Model.At(setting.SiteAt(30.6, 10.3))
			if err != nil {
				t.Fatal(err)
			}
			if a.Slabs.Len() != 1 || math.Abs(a.Slabs.All()[0].DepthKm-(100+40*0.6+8*0.3)) > 1e-4 {
				t.Fatalf("slabs %+v, want one at 126.4 km", a.Slabs.All())
			}
			r := a.Slabs.All()[0].Reading
			if all := len(files) == 5; all && (math.Abs(r.SigmaKm-5.6) > 1e-4 || r.DipDeg != 33 || r.DipAzimuthDeg != 80 || math.Abs(r.ThicknessKm-60.3) > 1e-4) || !all && !(math.IsNaN(r.SigmaKm) && math.IsNaN(r.ThicknessKm)) {
				t.Errorf("reading %+v", r)
			}
			// the node left out is a hole
			if a, err := b.Model.At(setting.SiteAt(30.9, 10.7)); err != nil || a.Slabs.Len() != 0 {
				t.Errorf("%v, %d slabs over the hole, want none", err, a.Slabs.Len())
			}
			// grids are kept as they are
			out := filepath.Join(t.TempDir(), "model")
			if err := b.Write(out); err != nil {
				t.Fatal(err)
			}
			sameFiles(t, mustRead(t, os.DirFS(out)), b)
			for file, text := range files {
				if got := string(b.File("slabs/deep/" + file)); got != text {
					t.Errorf("%s changed", file)
				}
			}
		})
	}
}

func TestGridAcrossTheAntimeridian(t *testing.T) {
	depth := planeText(179.5, func(x, y float64) float64 { return 100 + 40*x })
	east := strings.NewReplacer("180.25,", "-179.75,", "180.5,", "-179.5,").Replace(depth)
	for name, text := range map[string]string{"0 to 360": depth, "-180 to 180": east, "180 as -180": strings.ReplaceAll(east, "\n180,", "\n-180,")} {
		m := mustRead(t, withFiles(t, map[string]string{slabsFile: gridRow, "slabs/deep/depth.xyz": text})).Model
		for _, lon := range []float64{179.6, 179.99, 180, 180.1, -179.9, -179.6} {
			a, err := m.At(setting.SiteAt(lon, 10.2))
			if err != nil {
				t.Fatal(err)
			}
			want := 100 + 40*math.Mod(lon-179.5+360, 360)
			if a.Slabs.Len() != 1 || math.Abs(a.Slabs.All()[0].DepthKm-want) > 1e-3 {
				t.Errorf("%s: at %g slabs %+v, want one at %g km", name, lon, a.Slabs.All(), want)
			}
		}
	}
}

func TestFaultsOfGrids(t *testing.T) {
	const file = "slabs/deep/depth.xyz"
	good := planeText(30, func(x, y float64) float64 { return 100 + 40*x })
	grid := func(text string) map[string]string { return map[string]string{slabsFile: gridRow, file: text} }
	edit := func(old, with string) map[string]string {
		text := strings.Replace(good, old, with, 1)
		if text == good {
			t.Fatalf("no %q in the grid", old)
		}
		return grid(text)
	}
	and := func(name, text string) map[string]string {
		out := grid(good)
		out[name] = text
		return out
	}
	checkSlabFaults(t, []faultCase{
		{"a header", grid("lon,lat,depth\n" + good), file, 1, `"lon" is not a number`},
		{"two numbers", edit("30.5,10,120", "30.5,10"), file, 3, `"30.5,10" has 2 numbers; want lon,lat,value`},
		{"four numbers", edit("30.5,10,120", "30.5,10,120,4"), file, 3, "has 4 numbers; want lon,lat,value"},
		{"a value that is a word", edit("30.5,10,120", "30.5,10,deep"), file, 3, `"deep" is not a number`},
		{"longitude out of range", edit("30.5,10,120", "361,10,120"), file, 3, "361, 10 is not a longitude and a latitude"},
		{"latitude not a number", edit("30.5,10,120", "30.5,NaN,120"), file, 3, "30.5, NaN is not a longitude and a latitude"},
		{"empty", grid(""), file, 0, "0 nodes; a grid has at least 4"},
		{"one row", grid("1,2,50\n2,2,50\n3,2,50\n4,2,50\n"), file, 0, "want a grid with one step, at least 2 by 2"},
		{"one column", grid("1,2,50\n1,3,50\n1,4,50\n1,5,50\n"), file, 0, "want a grid with one step, at least 2 by 2"},
		{"two steps", grid("1,2,50\n2,2,50\n1,2.5,50\n2,2.5,50\n"), file, 0, "the longitudes are 1 degrees apart and the latitudes 0.5"},
		{"a node beside the grid", edit("30.5,10.25", "30.6,10.25"), file, 0, "the longitudes are 0.1 degrees apart and the latitudes 0.25"},
		{"a node off the grid", grid("0,0,50\n1,0,50\n0,1,50\n1,1,50\n2.5,1,50\n"), file, 0, "node 2.5, 1 does not lie on a grid"},
		{"a node far off", edit("30.5,10,120", "-30.5,-80,120"), file, 0, "19 nodes on a grid of 247 by 364 with step 0.25; is one of them misplaced?"},
		{"a node twice", grid(good + "30.5,10,121\n"), file, 0, "node 30.5, 10 stands twice, with 120 and 121"},
		{"depths positive up", grid(planeText(30, func(x, y float64) float64 { return -100 })), "slabs/deep", 0, "depth: the node at 30, 10 has -100; it must be within 0 and 800, km positive down"},
		{"nothing but holes", grid(planeText(30, func(x, y float64) float64 { return math.NaN() })), "slabs/deep", 0, "depth: no node has a value"},
		{"no zip file", map[string]string{slabsFile: gridRow, file + ".gz": good}, file + ".gz", 0, "gzip: invalid header"},
		{"a zip file cut short", map[string]string{slabsFile: gridRow, file + ".gz": zipped(t, good)[:60]}, file + ".gz", 0, "unexpected EOF"},
		{"layer on other nodes", and("slabs/deep/sigma.xyz", planeText(31, func(x, y float64) float64 { return 5 })), "slabs/deep", 0, "sigma: its nodes are not those of the depth layer"},
		{"layer without depth", map[string]string{slabsFile: gridRow, "slabs/deep/sigma.xyz": good}, file, 0, "the file is missing, and other layers of the slab are there"},
		{"grid of no slab", and("slabs/ghost/depth.xyz", good), "slabs/ghost/depth.xyz", 0, `slab "ghost" is not in slabs/slabs.csv`},
		{"grid without a table", map[string]string{file: good}, file, 0, "stands without slabs/slabs.csv"},
		{"contours and a grid", map[string]string{slabsFile: slabsHeader + frontRow, contoursFile: `{"type":"FeatureCollection","features":[` + frontContours + `]}`, "slabs/front-slab/depth.xyz": good},
			slabsFile, 0, `slab "front-slab" has contours and a grid; a slab has one or the other`},
	})
}

// FuzzGrid reads a layer, writes all its nodes, and wants the same layer back.
func FuzzGrid(f *testing.F) {
	f.Add(planeText(30, func(x, y float64) float64 { return 100 + 40*x }))
	f.Add(planeText(179.5, func(x, y float64) float64 { return 100 + 40*x }))
	f.Add("-180,1,2\n180,1,2\n-179,1,3\n-180,2,nan\n-179,2,5")
	f.Add("0 0 1e300\n1e-3\t0 -0\n0,1e-3,+Inf\n1e-3 1e-3 0x1p3")
	f.Fuzz(func(t *testing.T, text string) {
		l, err := readLayer("slabs/a/depth.xyz", strings.NewReader(text))
		if err != nil {
			refused(t, err)
			return
		}
		if l.Cols < 2 || l.Rows < 2 || len(l.Values) != l.Cols*l.Rows || !(l.Step > 0) || !(l.West >= -180 && l.West <= 540) || !(l.South >= -90 && l.South <= 90) {
			t.Fatalf("layer %+v was accepted", l)
		}
		if len(l.Values) > 10_000 {
			return
		}
		// which way round a wider one goes is not to be told from longitudes within ±180°
		if float64(l.Cols-1)*l.Step < 180-1e-6 {
			writtenAndRead(t, l)
		}
		// a surface is built from it, or refused with a reason
		if s, err := slab.NewGrid(slab.Layers{Depth: l}); (err == nil) == (s == nil) {
			t.Fatalf("surface %v, error %v", s, err)
		}
	})
}

// writtenAndRead writes a layer as text and reads it again.
func writtenAndRead(t *testing.T, l *slab.Layer) {
	t.Helper()
	var b strings.Builder
	for i, v := range l.Values {
		lon, lat := sphere.WrapLon(l.West+float64(i%l.Cols)*l.Step), math.Min(90, l.South+float64(i/l.Cols)*l.Step)
		b.WriteString(strconv.FormatFloat(lon, 'g', -1, 64) + "," + strconv.FormatFloat(lat, 'g', -1, 64) + "," + strconv.FormatFloat(float64(v), 'g', -1, 32) + "\n")
	}
	again, err := readLayer("slabs/a/depth.xyz", strings.NewReader(b.String()))
	if err != nil {
		t.Fatalf("cannot read what was written: %v\n%s", err, b.String())
	}
	same := again.Cols == l.Cols && again.Rows == l.Rows && math.Abs(again.Step-l.Step) < 1e-6 && math.Abs(again.South-l.South) < 1e-6
	for i, v := range l.Values {
		same = same && (again.Values[i] == v || v != v && again.Values[i] != again.Values[i])
	}
	if !same {
		t.Fatalf("%+v came back as %+v", l, again)
	}
}

// Full grids of Hayes et al. (2018), in the form of a model directory: their own
// nodes come back.
func TestDistributedGridsComeBack(t *testing.T) {
	root, err := filepath.Abs("../../../shared/reference/slab2")
	if err != nil {
		t.Fatal(err)
	}
	if _, err := os.Stat(root); err != nil {
		t.Skipf("reference data are absent: %v", err)
	}
	dir := filepath.Join(t.TempDir(), "model")
	if err := os.CopyFS(dir, os.DirFS("testdata/geojson")); err != nil {
		t.Fatal(err)
	}
	table := slabsHeader
	type place struct{ lon, lat, depthKm float64 }
	given := map[string][]place{}
	for _, zone := range []string{"cas", "hel", "izu", "van"} {
		table += zone + "," + zone + ",subduction,front-4,BB,AA,80,\"Hayes et al. (2018)\",consulted\n"
		found, err := filepath.Glob(filepath.Join(root, zone+"_slab2_dep_*.xyz.gz"))
		if err != nil || len(found) != 1 {
			t.Fatalf("%s: %v, files %v", zone, err, found)
		}
		raw, err := os.ReadFile(found[0])
		if err != nil {
			t.Fatal(err)
		}
		z, err := gzip.NewReader(bytes.NewReader(raw))
		if err != nil {
			t.Fatal(err)
		}
		var text, out bytes.Buffer
		if _, err := text.ReadFrom(z); err != nil {
			t.Fatal(err)
		}
		for line := range strings.Lines(text.String()) {
			f := strings.Split(strings.TrimSpace(line), ",")
			n, err := parseNode(strings.TrimSpace(line))
			if err != nil || len(f) != 3 {
				t.Fatalf("%s: %q: %v", zone, line, err)
			}
			if math.IsNaN(n.Value) { // its node stands for the extent
				fmt.Fprintf(&out, "%s,%s,NaN\n", f[0], f[1])
				continue
			}
			fmt.Fprintf(&out, "%s,%s,%s\n", f[0], f[1], strings.TrimPrefix(f[2], "-")) // positive down
			given[zone] = append(given[zone], place{n.Lon, n.Lat, -n.Value})
		}
		if err := os.MkdirAll(filepath.Join(dir, "slabs", zone), 0o755); err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(filepath.Join(dir, "slabs", zone, "depth.xyz.gz"), []byte(zipped(t, out.String())), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	if err := os.WriteFile(filepath.Join(dir, "slabs", "slabs.csv"), []byte(table), 0o644); err != nil {
		t.Fatal(err)
	}
	for _, s := range mustRead(t, os.DirFS(dir)).Model.Slabs() {
		worst, lost := 0.0, 0
		for _, p := range given[s.ID] {
			r, in := s.Surface.At(sphere.FromLonLat(sphere.LonLat{Lon: p.lon, Lat: p.lat}))
			if !in {
				lost++
				continue
			}
			worst = max(worst, math.Abs(r.DepthKm-p.depthKm))
		}
		t.Logf("%s: %d nodes, worst difference %.4f km, %d not found", s.ID, len(given[s.ID]), worst, lost)
		if lost > 0 || worst > 0.1 || len(given[s.ID]) < 10_000 {
			t.Errorf("%s: of %d nodes %d are not found, the worst difference is %.3f km; want none and at most 0.1", s.ID, len(given[s.ID]), lost, worst)
		}
	}
}
