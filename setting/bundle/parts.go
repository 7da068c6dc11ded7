package bundle

import (
	"encoding/json"
	"maps"
	"slices"
	"strings"

	"nearmargin/setting"
	"nearmargin/setting/boundary"
	"nearmargin/setting/motion"
	"nearmargin/setting/slab"
	"nearmargin/setting/sphere"
)

// Parts is what a model's canonical files say, for those who keep a model in
// another form than files, such as the rows of a database. [Bundle.Parts] takes a
// model apart, [FromParts] puts it together again, to the same bytes.
type Parts struct {
	ID, Edition, Title, Licence string
	Citations                   []string // nil and empty are told apart, as the file does
	DefaultMotion               string
	Motions                     []MotionTable // in the order of model.json
	Plates                      []setting.Plate
	Boundaries                  []*boundary.Boundary
	Junctions                   []Junction
	Zones                       []*setting.Zone
	Hotspots                    []setting.Hotspot
	Land                        []*setting.Land
	Warnings                    []setting.Warning
	Slabs                       []slab.Spec // Surface is nil where the slab has a grid
	Grids                       []Grid
}

// Junction is a triple junction's name and place.
type Junction struct {
	Name string
	At   sphere.LonLat
}

// MotionTable is a motion model with its table as it is spelt: published numbers
// keep their digits.
type MotionTable struct {
	Info    motion.Info
	Columns []string   // one of the forms that motion/NAME.csv may have
	Rows    [][]string // in the order of the file
}

// Grid is one layer of a gridded slab, as its file holds it.
type Grid struct {
	Slab    string
	Layer   string // depth, sigma, dip, strike or thickness
	Gzipped bool
	Content []byte
}

func (g Grid) file() string {
	name := "slabs/" + g.Slab + "/" + g.Layer + ".xyz"
	if g.Gzipped {
		name += ".gz"
	}
	return name
}

// Parts takes the model apart. Content of grids is shared with the bundle and must
// not be changed.
func (b *Bundle) Parts() (Parts, error) {
	var in info
	if err := decodeStrictly(b.files[infoFile], &in); err != nil {
		return Parts{}, &FileError{File: infoFile, Err: err}
	}
	m := b.Model
	p := Parts{
		ID: in.ID, Edition: in.Edition, Title: in.Title, Licence: in.Licence, Citations: in.Citations, DefaultMotion: in.DefaultMotion,
		Plates: m.Plates(), Boundaries: m.Network().Boundaries(), Zones: m.Zones(), Hotspots: m.Hotspots(), Land: m.Land(), Warnings: m.Warnings(),
	}
	for _, mi := range in.Motions {
		t, err := readAnyTable(motionFile(mi.Name), b.files[motionFile(mi.Name)])
		if err != nil {
			return Parts{}, err
		}
		p.Motions = append(p.Motions, MotionTable{motion.Info(mi), t.header, t.rows})
	}
	for _, j := range m.Junctions() {
		p.Junctions = append(p.Junctions, Junction{j.Name, j.At})
	}
	for _, s := range m.Slabs() {
		spec := s.Spec
		if slab.Contours(spec.Surface) == nil {
			spec.Surface = nil
		}
		p.Slabs = append(p.Slabs, spec)
	}
	for _, name := range slices.Sorted(maps.Keys(b.files)) {
		if g, ok := gridOf(name); ok {
			g.Content = b.files[name]
			p.Grids = append(p.Grids, g)
		}
	}
	return p, nil
}

// gridOf reads the name of a grid's file.
func gridOf(name string) (Grid, bool) {
	base, gzipped := strings.CutSuffix(name, ".gz")
	base, ok := strings.CutSuffix(base, ".xyz")
	f := strings.Split(base, "/")
	if !ok || len(f) != 3 || f[0] != "slabs" {
		return Grid{}, false
	}
	return Grid{Slab: f[1], Layer: f[2], Gzipped: gzipped}, true
}

// FromParts puts a model together: it writes the canonical files and reads them
// as [Read] reads a directory, with all its checks and errors.
func FromParts(p Parts) (*Bundle, error) {
	in := info{ID: p.ID, Edition: p.Edition, Title: p.Title, Licence: p.Licence, Citations: p.Citations, DefaultMotion: p.DefaultMotion}
	b := &Bundle{files: map[string][]byte{}}
	for _, t := range p.Motions {
		if err := checkMotionName(t.Info.Name); err != nil {
			return nil, &FileError{File: infoFile, Err: err}
		}
		in.Motions = append(in.Motions, motionInfo(t.Info))
		b.files[motionFile(t.Info.Name)] = (&table{header: t.Columns, rows: t.Rows}).write()
	}
	var slabs []*slab.Slab
	for _, s := range p.Slabs {
		slabs = append(slabs, &slab.Slab{Spec: s})
	}
	for _, g := range p.Grids {
		name := g.file()
		switch {
		case b.files[name] != nil:
			return nil, fault(name, 0, "the grid stands twice")
		case !slices.ContainsFunc(p.Slabs, func(s slab.Spec) bool { return s.ID == g.Slab }):
			return nil, fault(name, 0, "there is no slab %q", g.Slab)
		}
		b.files[name] = g.Content
	}
	if err := b.encodeParts(in, p); err != nil {
		return nil, err
	}
	if err := b.encodeSlabs(slabs); err != nil {
		return nil, err
	}
	return Read(memory(b.files))
}

// encodeParts writes the files that need no model.
func (b *Bundle) encodeParts(in info, p Parts) error {
	raw, err := json.MarshalIndent(in, "", "  ") // escapes are read back as what they stand for
	if err != nil {
		return err
	}
	b.files[infoFile] = raw
	b.files[platesFile] = writePlates(p.Plates)
	if b.files[boundariesFile], err = writeBoundaries(p.Boundaries); err != nil {
		return err
	}
	js := make([]setting.Junction, len(p.Junctions))
	for i, j := range p.Junctions {
		js[i] = setting.Junction{Name: j.Name, At: j.At}
	}
	b.files[junctionsFile] = writeJunctions(js)
	if len(p.Zones) > 0 {
		if b.files[zonesFile], err = writeZones(p.Zones); err != nil {
			return err
		}
	}
	if len(p.Land) > 0 {
		if b.files[landFile], err = writeLand(p.Land); err != nil {
			return err
		}
	}
	if len(p.Warnings) > 0 {
		b.files[warningsFile] = writeWarnings(p.Warnings)
	}
	if len(p.Hotspots) > 0 {
		b.files[hotspotsFile] = writeHotspots(p.Hotspots)
	}
	return nil
}
