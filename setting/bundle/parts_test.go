package bundle_test

import (
	"bytes"
	"errors"
	"io/fs"
	"slices"
	"testing"
	"testing/fstest"

	"nearmargin/setting/builtin"
	"nearmargin/setting/bundle"
)

func TestPartsMakeTheSameBytes(t *testing.T) {
	b, err := builtin.Load()
	if err != nil {
		t.Fatal(err)
	}
	dir := fstest.MapFS{}
	for _, name := range b.Files() {
		dir[name] = &fstest.MapFile{Data: b.File(name)}
	}
	kept := bytes.Split(dir["slabs/contours.geojson"].Data, []byte("\n"))
	kept = slices.DeleteFunc(kept, func(line []byte) bool { return bytes.Contains(line, []byte(`"slab":"alaska"`)) })
	gridded := fstest.MapFS{}
	for name, f := range dir {
		gridded[name] = f
	}
	gridded["slabs/contours.geojson"] = &fstest.MapFile{Data: bytes.Join(kept, []byte("\n"))}
	gridded["slabs/alaska/depth.xyz"] = &fstest.MapFile{Data: []byte("-150,58,30.0\n-149,58,30\n-150,59,40\n-149,59,40\n")}
	for name, files := range map[string]fs.FS{"contours": dir, "a grid": gridded} {
		want, err := bundle.Read(files)
		if err != nil {
			t.Fatal(err)
		}
		p, err := want.Parts()
		if err != nil {
			t.Fatal(err)
		}
		got, err := bundle.FromParts(p)
		if err != nil {
			t.Fatal(err)
		}
		if !slices.Equal(got.Files(), want.Files()) || got.Model.SHA256() != want.Model.SHA256() {
			t.Errorf("%s: files %v, sha256 %s; want %v, %s", name, got.Files(), got.Model.SHA256(), want.Files(), want.Model.SHA256())
		}
		for _, f := range want.Files() {
			if !bytes.Equal(got.File(f), want.File(f)) {
				t.Errorf("%s: %s differs", name, f)
			}
		}
	}
}

func TestPartsThatDoNotFit(t *testing.T) {
	b, err := builtin.Load()
	if err != nil {
		t.Fatal(err)
	}
	for name, spoil := range map[string]func(*bundle.Parts){
		"no plates":          func(p *bundle.Parts) { p.Plates = nil },
		"a motion's name":    func(p *bundle.Parts) { p.Motions[0].Info.Name = "../up" },
		"a motion's columns": func(p *bundle.Parts) { p.Motions[0].Columns = []string{"plate"} },
		"the default motion": func(p *bundle.Parts) { p.DefaultMotion = "none" },
		"a slab's surface":   func(p *bundle.Parts) { p.Slabs[0].Surface = nil },
		"a grid of rubbish": func(p *bundle.Parts) {
			p.Grids = []bundle.Grid{{Slab: p.Slabs[0].ID, Layer: "depth", Content: []byte("x")}}
		},
		"a grid beside it": func(p *bundle.Parts) {
			p.Grids = []bundle.Grid{{Slab: "nowhere", Layer: "depth", Content: []byte("1,2,3")}}
		},
		"a grid that is twice": func(p *bundle.Parts) {
			g := bundle.Grid{Slab: p.Slabs[0].ID, Layer: "depth", Content: []byte("x")}
			p.Grids = []bundle.Grid{g, g}
		},
	} {
		t.Run(name, func(t *testing.T) {
			p, err := b.Parts()
			if err != nil {
				t.Fatal(err)
			}
			spoil(&p)
			got, err := bundle.FromParts(p)
			if err == nil {
				t.Fatalf("accepted: %v", got.Files())
			}
			if fault := (*bundle.FileError)(nil); errors.As(err, &fault) && fault.File == "" {
				t.Errorf("%v names no file", err)
			}
		})
	}
}
