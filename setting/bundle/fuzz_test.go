package bundle

import (
	"errors"
	"os"
	"path/filepath"
	"reflect"
	"testing"

	"nearmargin/setting/boundary"
	"nearmargin/setting/motion"
)

// seeds adds files to a fuzz corpus.
func seeds(f *testing.F, patterns ...string) {
	f.Helper()
	for _, p := range patterns {
		names, err := filepath.Glob(p)
		if err != nil || len(names) == 0 {
			f.Fatalf("%s: %v, %d files", p, err, len(names))
		}
		for _, name := range names {
			raw, err := os.ReadFile(name)
			if err != nil {
				f.Fatal(err)
			}
			f.Add(raw)
		}
	}
}

// refused checks that an error names its file.
func refused(t *testing.T, err error) {
	t.Helper()
	var fe *FileError
	if !errors.As(err, &fe) || fe.File == "" || fe.Line < 0 {
		t.Fatalf("error %v (%T), want a *FileError that names its file", err, err)
	}
}

// writesAlike writes boundaries, reads what was written, writes that, and wants
// the same bytes.
func writesAlike(t *testing.T, list []*boundary.Boundary) {
	t.Helper()
	first, err := writeBoundaries(list)
	if err != nil {
		t.Fatal(err)
	}
	again, err := readBoundaries(first)
	if err != nil {
		t.Fatalf("cannot read what was written: %v\n%s", err, first)
	}
	if len(again) != len(list) {
		t.Fatalf("%d boundaries came back as %d", len(list), len(again))
	}
	second, err := writeBoundaries(again)
	if err != nil {
		t.Fatal(err)
	}
	if string(first) != string(second) {
		t.Fatalf("written:\n%s\nread and written again:\n%s", first, second)
	}
}

func FuzzLines(f *testing.F) {
	seeds(f, "testdata/written/boundaries/*.txt")
	f.Add([]byte("node a 180 0\nnode b 170 0\nline l\nname L\nplates AA BB\nsigma_km 1\nsource s\nsource_status memory\n@a ridge\n180 10\n-170 20 transform T\n@b\n"))
	f.Fuzz(func(t *testing.T, raw []byte) {
		set := lineSet{nodes: map[string]*lineNode{}}
		if err := set.parse("boundaries/a.txt", string(raw)); err != nil {
			refused(t, err)
			return
		}
		list, titles, err := set.boundaries()
		if err != nil {
			refused(t, err)
			return
		}
		if len(titles) > len(set.nodes) {
			t.Fatalf("%d titles of %d nodes", len(titles), len(set.nodes))
		}
		writesAlike(t, list)
	})
}

func FuzzBoundaries(f *testing.F) {
	seeds(f, "testdata/geojson/boundaries.geojson")
	const head = `{"type":"FeatureCollection","features":[{"type":"Feature","properties":{"id":"a","name":"A","type":"subduction","left_plate":"AA","right_plate":"BB","subducting_plate":"BB","sigma_km":1,"source":"s","source_status":"memory"},"geometry":`
	f.Add([]byte(head + `{"type":"MultiLineString","coordinates":[[],[[180,0],[179,0]]]}}]}`))
	f.Add([]byte(head + `{"type":"MultiLineString","coordinates":[[[170,0],[180,0]],[[-180,0],[-170,0]]]}}]}`))
	f.Add([]byte(head + `{"type":"LineString","coordinates":[[-170,0],[180,5],[170,10]]}}]}`))
	f.Fuzz(func(t *testing.T, raw []byte) {
		list, err := readBoundaries(raw)
		if err != nil {
			refused(t, err)
			return
		}
		writesAlike(t, list)
	})
}

func FuzzZones(f *testing.F) {
	seeds(f, "testdata/written/zones.geojson")
	f.Fuzz(func(t *testing.T, raw []byte) {
		zones, err := readZones(raw)
		if err != nil {
			refused(t, err)
			return
		}
		first, err := writeZones(zones)
		if err != nil {
			t.Fatal(err)
		}
		again, err := readZones(first)
		if err != nil {
			t.Fatalf("cannot read what was written: %v\n%s", err, first)
		}
		if !reflect.DeepEqual(again, zones) {
			t.Fatalf("the zones differ after\n%s", first)
		}
	})
}

func FuzzMotion(f *testing.F) {
	seeds(f, "testdata/written/motion/*.csv")
	f.Fuzz(func(t *testing.T, raw []byte) {
		info := motion.Info{Name: "m"}
		m, table, err := readMotion(info, raw)
		if err != nil {
			refused(t, err)
			return
		}
		again, _, err := readMotion(info, table.write())
		if err != nil {
			t.Fatalf("cannot read what was written: %v\n%s", err, table.write())
		}
		if !reflect.DeepEqual(again, m) {
			t.Fatalf("the angular velocities differ after\n%s", table.write())
		}
		for _, e := range m.Entries() {
			if n := e.Vector.Norm(); !(n >= 0 && n < 5) {
				t.Fatalf("plate %q turns at %g rad/Myr", e.Plate, n)
			}
		}
	})
}

// FuzzTables reads every kind of small table from the same bytes.
func FuzzTables(f *testing.F) {
	seeds(f, "testdata/written/*.csv", "testdata/geojson/junctions.csv")
	f.Add([]byte("name,lon,lat\n\"a \"\"b\"\", c\",-180,-90\n"))
	f.Fuzz(func(t *testing.T, raw []byte) {
		if plates, err := readPlates(raw); err != nil {
			refused(t, err)
		} else if again, err := readPlates(writePlates(plates)); err != nil || !reflect.DeepEqual(again, plates) {
			t.Fatalf("%v came back as %v, %v", plates, again, err)
		}
		if hotspots, err := readHotspots(raw); err != nil {
			refused(t, err)
		} else if again, err := readHotspots(writeHotspots(hotspots)); err != nil || !reflect.DeepEqual(again, hotspots) {
			t.Fatalf("%v came back as %v, %v", hotspots, again, err)
		}
		if names, err := readJunctions(raw); err != nil {
			refused(t, err)
		} else {
			for at, name := range names {
				if name == "" || at.Lon < -180 || at.Lon > 180 || at.Lat < -90 || at.Lat > 90 {
					t.Fatalf("junction %q at %v was accepted", name, at)
				}
			}
		}
	})
}
