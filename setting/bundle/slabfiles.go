package bundle

import (
	"encoding/json"
	"fmt"
	"io/fs"
	"maps"
	"path"
	"slices"
	"strings"

	"nearmargin/setting"
	"nearmargin/setting/boundary"
	"nearmargin/setting/slab"
)

const (
	slabsFile    = "slabs/slabs.csv"
	contoursFile = "slabs/contours.geojson"
	gridPattern  = "slabs/*/*.xyz*"
)

var slabsColumns = []string{"slab", "name", "kind", "boundary_ids", "subducting_plate", "overriding_plate", "arc_min_depth_km", "source", "source_status"}

type contourProperties struct {
	Slab    string  `json:"slab"`
	DepthKm float64 `json:"depth_km"`
	SigmaKm float64 `json:"sigma_km"`
}

// slabs reads the slabs: the written form, or the table with contours and grids.
func (r *reader) slabs(c *setting.Contents) error {
	written, err := fs.Glob(r.dir, "slabs/*.txt")
	if err != nil {
		return err
	}
	raw, err := r.file(slabsFile, true)
	if err != nil {
		return err
	}
	switch {
	case raw != nil && len(written) > 0:
		return fault(slabsFile, 0, "stands beside slabs/*.txt; a model has one or the other")
	case raw != nil:
		c.Slabs, err = r.tableSlabs(raw, c.Boundaries)
		return err
	}
	if err := r.noSlabFilesWithoutTable(); err != nil {
		return err
	}
	resolve := lineResolver(c.Boundaries)
	slices.Sort(written)
	for _, name := range written {
		raw, err := r.file(name, false)
		if err != nil {
			return err
		}
		drafts, err := parseSlabs(name, string(raw))
		if err != nil {
			return err
		}
		for _, d := range drafts {
			s, err := d.finish(resolve)
			if err != nil {
				return err
			}
			c.Slabs = append(c.Slabs, s)
		}
	}
	return nil
}

// noSlabFilesWithoutTable refuses contours and grids that no table names: they
// would be passed over in silence.
func (r *reader) noSlabFilesWithoutTable() error {
	for _, pattern := range [...]string{contoursFile, gridPattern} {
		names, err := fs.Glob(r.dir, pattern)
		if err != nil {
			return err
		}
		if len(names) > 0 {
			return fault(names[0], 0, "stands without %s, which names the slabs", slabsFile)
		}
	}
	return nil
}

// lineResolver returns a function that gives the ids of the boundaries of a line:
// of its subduction runs, else of its other convergent runs, else of all.
func lineResolver(boundaries []*boundary.Boundary) func(string) []string {
	rank := func(t boundary.Type) int {
		switch t {
		case boundary.Subduction:
			return 0
		case boundary.ContinentalConvergent, boundary.OceanicConvergent:
			return 1
		}
		return 2
	}
	return func(line string) []string {
		var out []string
		best := 3
		for _, b := range boundaries {
			number, ok := strings.CutPrefix(b.ID(), line+"-")
			if b.ID() != line && (!ok || strings.Trim(number, "0123456789") != "") {
				continue
			}
			switch k := rank(b.Type()); {
			case k < best:
				best, out = k, []string{b.ID()}
			case k == best:
				out = append(out, b.ID())
			}
		}
		return out
	}
}

// tableSlabs reads slabs.csv with contours.geojson and grids.
func (r *reader) tableSlabs(raw []byte, boundaries []*boundary.Boundary) ([]*slab.Slab, error) {
	known := map[string]bool{}
	for _, b := range boundaries {
		known[b.ID()] = true
	}
	t, err := readTable(slabsFile, raw, slabsColumns)
	if err != nil {
		return nil, err
	}
	contours := map[string][]slab.Contour{}
	if raw, err = r.file(contoursFile, true); err != nil {
		return nil, err
	} else if raw != nil {
		if contours, err = readContours(raw); err != nil {
			return nil, err
		}
	}
	var out []*slab.Slab
	first := map[string]int{} // row of each slab
	for i := range t.rows {
		s := slab.Spec{
			ID: t.cell(i, "slab"), Name: t.cell(i, "name"), BoundaryIDs: strings.Fields(t.cell(i, "boundary_ids")),
			Subducting: t.cell(i, "subducting_plate"), Overriding: t.cell(i, "overriding_plate"),
			Source: t.cell(i, "source"), SourceStatus: t.cell(i, "source_status"),
		}
		if !nameForm.MatchString(s.ID) {
			return nil, t.fault(i, "slab %q must be lower-case letters, digits and hyphens", s.ID)
		}
		if row, twice := first[s.ID]; twice {
			return nil, t.fault(i, "slab %q stands already at line %d", s.ID, t.lines[row])
		}
		first[s.ID] = i
		for _, id := range s.BoundaryIDs {
			if !known[id] {
				return nil, t.fault(i, "slab %q: there is no boundary %q", s.ID, id)
			}
		}
		if s.Kind, err = slab.ParseKind(t.cell(i, "kind")); err != nil {
			return nil, t.fault(i, "%v", err)
		}
		if s.ArcMinDepthKm, err = t.number(i, "arc_min_depth_km"); err != nil {
			return nil, err
		}
		if s.Surface, err = r.surface(s.ID, contours[s.ID]); err != nil {
			return nil, err
		}
		delete(contours, s.ID)
		built, err := slab.New(s)
		if err != nil {
			return nil, t.fault(i, "%v", err)
		}
		out = append(out, built)
	}
	for _, id := range slices.Sorted(maps.Keys(contours)) {
		return nil, fault(contoursFile, 0, "slab %q is not in %s", id, slabsFile)
	}
	grids, err := fs.Glob(r.dir, gridPattern)
	if err != nil {
		return nil, err
	}
	for _, name := range grids {
		if id := path.Base(path.Dir(name)); !slices.ContainsFunc(out, func(s *slab.Slab) bool { return s.ID == id }) {
			return nil, fault(name, 0, "slab %q is not in %s", id, slabsFile)
		}
	}
	return out, nil
}

// surface builds a slab's surface from its contours or its grid.
func (r *reader) surface(id string, contours []slab.Contour) (slab.Surface, error) {
	layers, err := r.grid(id)
	if err != nil {
		return nil, err
	}
	switch {
	case layers.Depth == nil && layers != (slab.Layers{}):
		return nil, fault("slabs/"+id+"/depth.xyz", 0, "the file is missing, and other layers of the slab are there")
	case layers.Depth != nil && len(contours) > 0:
		return nil, fault(slabsFile, 0, "slab %q has contours and a grid; a slab has one or the other", id)
	case layers.Depth != nil:
		s, err := slab.NewGrid(layers)
		if err != nil {
			return nil, &FileError{File: "slabs/" + id, Err: err}
		}
		return s, nil
	}
	s, err := slab.NewContours(contours)
	if err != nil {
		return nil, &FileError{File: contoursFile, Detail: "slab " + id, Err: err}
	}
	return s, nil
}

func readContours(raw []byte) (map[string][]slab.Contour, error) {
	features, err := readFeatures[contourProperties](contoursFile, raw)
	if err != nil {
		return nil, err
	}
	out := map[string][]slab.Contour{}
	for i, f := range features {
		in := func(err error) error {
			return &FileError{File: contoursFile, Detail: fmt.Sprintf("features[%d] (slab %q)", i, f.Properties.Slab), Err: err}
		}
		line, err := readPath(f.Geometry)
		if err != nil {
			return nil, in(err)
		}
		id := f.Properties.Slab
		out[id] = append(out[id], slab.Contour{DepthKm: f.Properties.DepthKm, SigmaKm: f.Properties.SigmaKm, Path: line})
	}
	return out, nil
}

// encodeSlabs adds the canonical files of the slabs.
func (b *Bundle) encodeSlabs(list []*slab.Slab) error {
	if len(list) == 0 {
		return nil
	}
	t := table{header: slabsColumns}
	var features []feature[contourProperties]
	for _, s := range list {
		t.rows = append(t.rows, []string{s.ID, s.Name, s.Kind.String(), strings.Join(s.BoundaryIDs, " "), s.Subducting, s.Overriding, decimal(s.ArcMinDepthKm), s.Source, s.SourceStatus})
		for _, c := range slab.Contours(s.Surface) {
			features = append(features, feature[contourProperties]{
				Type: "Feature", Properties: contourProperties{s.ID, c.DepthKm, c.SigmaKm}, Geometry: lineGeometry(c.Path),
			})
		}
	}
	b.files[slabsFile] = t.write()
	if len(features) == 0 {
		return nil
	}
	var err error
	b.files[contoursFile], err = writeCollection(features)
	return err
}

const landFile = "land.geojson"

type landProperties struct {
	Name string `json:"name"`
}

func readLand(raw []byte) ([]*setting.Land, error) {
	features, err := readFeatures[landProperties](landFile, raw)
	if err != nil {
		return nil, err
	}
	var out []*setting.Land
	for i, f := range features {
		rings, err := readRings(f.Geometry)
		if err == nil && len(rings) != 1 {
			err = fmt.Errorf("an outline has one ring, not %d", len(rings))
		}
		var l *setting.Land
		if err == nil {
			l, err = setting.NewLand(f.Properties.Name, rings[0])
		}
		if err != nil {
			return nil, &FileError{File: landFile, Detail: fmt.Sprintf("features[%d] (%q)", i, f.Properties.Name), Err: err}
		}
		out = append(out, l)
	}
	return out, nil
}

func writeLand(list []*setting.Land) ([]byte, error) {
	features := make([]feature[landProperties], len(list))
	for i, l := range list {
		raw := append(appendPositions([]byte{'['}, l.Ring), ']')
		features[i] = feature[landProperties]{Type: "Feature", Properties: landProperties{l.Name}, Geometry: geometry{"Polygon", json.RawMessage(raw)}}
	}
	return writeCollection(features)
}
