package published

import (
	"math"
	"strings"
	"testing"

	"nearmargin/setting/boundary"
	"nearmargin/setting/bundle"
	"nearmargin/setting/slab"
)

// sound checks a tally against what was read.
func sound(t *testing.T, tally Tally, read int) {
	t.Helper()
	if tally.Read != read || tally.Rejected < len(tally.Rejects) || tally.Rejected > 0 && len(tally.Rejects) == 0 {
		t.Fatalf("%d were read, and the tally says %d read, %d rejected, %d named", read, tally.Read, tally.Rejected, len(tally.Rejects))
	}
	for _, r := range tally.Rejects {
		if r.File != tally.File || r.Line < 1 || r.Reason == "" {
			t.Fatalf("reject %+v names no place or no reason", r)
		}
	}
}

// firstLines keeps seeds short: the fuzzer's time goes into making long ones short.
func firstLines(s string, n int) string {
	lines := strings.SplitAfterN(s, "\n", n+1)
	return strings.Join(lines[:min(n, len(lines))], "")
}

func FuzzSteps(f *testing.F) {
	f.Add(firstLines(slurp(f, "steps.dat"), 3))
	f.Add(stepRow)
	f.Add(stepRow[:30] + "\n\n" + stepRow + "\r\n")
	f.Fuzz(func(t *testing.T, s string) {
		steps, tally, err := ReadSteps("f", strings.NewReader(s), BirdCodes())
		if err != nil {
			return
		}
		sound(t, tally, len(steps))
		list, err := Runs(steps, func(code string) string { return code })
		if err != nil {
			t.Fatalf("steps were taken that make no boundary: %v", err)
		}
		arcs := 0
		for _, b := range list {
			arcs += len(b.Path()) - 1
		}
		if arcs != len(steps) {
			t.Fatalf("%d steps became %d arcs", len(steps), arcs)
		}
		if len(list) == 0 || len(list) > 100 {
			return
		}
		if _, err := boundary.NewNetwork(list); err != nil {
			t.Fatal(err)
		}
	})
}

func FuzzDig(f *testing.F) {
	f.Add(firstLines(slurp(f, "plates.dig"), 4) + "*** end of line segment ***\n")
	f.Add(slurp(f, "orogens.dig"))
	f.Add("A\n1,2\n***\n3,4\n\xff\nB\n")
	f.Fuzz(func(t *testing.T, s string) {
		out, tally, err := ReadDig("f", strings.NewReader(s))
		if err != nil {
			return
		}
		sound(t, tally, len(out))
		for _, o := range out {
			if len(o.Path) < 2 || o.Line < 1 {
				t.Fatalf("outline %+v", o)
			}
		}
		zones := Zones(out, &tally)
		sound(t, tally, len(zones))
	})
}

func FuzzPoles(f *testing.F) {
	f.Add(slurp(f, "poles.dat"))
	f.Add("AF  +59.000   -73.000   0.9000\nAF")
	f.Fuzz(func(t *testing.T, s string) {
		poles, tally, err := ReadPoles("f", strings.NewReader(s), BirdCodes())
		if err != nil {
			return
		}
		sound(t, tally, len(poles))
		for _, p := range poles {
			if err := p.Check(bundle.PoleForm); err != nil {
				t.Fatalf("pole %+v was taken: %v", p, err)
			}
		}
	})
}

func FuzzSlab2(f *testing.F) {
	f.Add("240.5,0,-20.25\n241,0,-40.5\n240.5,0.5,NaN\n241,0.5,-41\n", "dep")
	f.Add("240.5,0,0.25\n241,0,350\n240.5,0.5,NaN\n241,0.5,360\n", "str")
	f.Add("170,0,-1\n190,0,-2\n170,20,nan\n190,20,-0\n", "dep")
	f.Fuzz(func(t *testing.T, s, layer string) {
		if _, ok := layerRange[layer]; !ok {
			return
		}
		l, tally, err := readGrid(*text("f", s), layer)
		if err != nil || len(l.Values) > 1<<20 {
			return
		}
		sound(t, tally, tally.Read)
		if layer != "dep" {
			return
		}
		for _, v := range l.Values {
			if v < 0 || v > 800 || math.Signbit(float64(v)) && v == 0 {
				t.Fatalf("depth %g was taken", v)
			}
		}
		cut := slab.Layers{Depth: l}.Crop()
		if _, err := slab.NewGrid(slab.Layers{Depth: l}); err == nil && cut.Depth.Cols > 1 && cut.Depth.Rows > 1 {
			if _, err := slab.NewGrid(cut); err != nil {
				t.Fatalf("a grid is one, and cropped it is none: %v", err)
			}
		}
	})
}

func FuzzMapping(f *testing.F) {
	f.Add("type=K,left_plate=L,type:R=spreading_ridge", `{"features":[{"properties":{"K":"R","L":"AF","right_plate":"BB"},"geometry":{"type":"MultiLineString","coordinates":[[[0,0],[1,1]]]}}]}`)
	f.Add("type='OSR'", `{"features":[{"properties":{"left_plate":"AA","right_plate":"BB"},"geometry":{"type":"LineString","coordinates":[[0,0],[1,1]]}}]}`)
	f.Fuzz(func(t *testing.T, mapping, s string) {
		m, err := ParseMapping(mapping)
		if err != nil {
			return
		}
		list, tally, err := ReadGeoJSON("f", strings.NewReader(s), m, BirdCodes())
		if err != nil {
			return
		}
		if tally.Read > len(list) {
			t.Fatalf("%d features became %d boundaries", tally.Read, len(list))
		}
		sound(t, tally, tally.Read)
		if len(list) == 0 || len(list) > 100 {
			return
		}
		if _, err := boundary.NewNetwork(list); err != nil {
			t.Fatal(err)
		}
	})
}

func FuzzVelocities(f *testing.F) {
	f.Add(slurp(f, "velocities.csv"))
	f.Add("plate,wx_mas_yr,wy_mas_yr,wz_mas_yr,sx_mas_yr,sy_mas_yr,sz_mas_yr\nNB,1,2,3,4,5,6\n")
	f.Add("plate,wx_mas_yr,wy_mas_yr,wz_mas_yr,cxx,cxy,cxz,cyy,cyz,czz\nPA,1,2,3,1,0,0,1,0,1\n\"\n")
	plates := knownPlates()
	f.Fuzz(func(t *testing.T, s string) {
		form, rows, tally, err := ReadVelocities("f", strings.NewReader(s), plates, BirdCodes())
		if err != nil {
			return
		}
		sound(t, tally, len(rows))
		seen := map[string]bool{}
		for _, r := range rows {
			if err := r.Check(form); err != nil || !isCode(r.Plate) || seen[r.Plate] {
				t.Fatalf("row %+v was taken: %v", r, err)
			}
			seen[r.Plate] = true
		}
	})
}
