package bundle

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"maps"
	"slices"
	"strings"

	"nearmargin/setting"
	"nearmargin/setting/boundary"
	"nearmargin/setting/motion"
	"nearmargin/setting/slab"
)

// Identity is what a model says of itself.
type Identity struct {
	ID, Edition, Title, Licence string
	Citations                   []string
	DefaultMotion               string // "" for the only or first motion model
}

// MotionForm is one of the forms in which a table gives angular velocities.
type MotionForm uint8

// The forms, with the numbers of a row in their order; see [Draft.SetMotion].
const (
	PoleForm       MotionForm = 1 // lat_deg, lon_deg, rate_deg_myr, rate_sigma_deg_myr (may be empty)
	CartesianForm  MotionForm = 2 // wx, wy, wz, sx, sy, sz in mas/yr
	CovarianceForm MotionForm = 3 // wx, wy, wz in mas/yr, cxx, cxy, cxz, cyy, cyz, czz in (mas/yr)²
)

// MotionColumns returns the names of a form's numbers in model files.
func MotionColumns(f MotionForm) []string {
	all := motionColumns(f)
	if all == nil {
		return nil
	}
	return slices.Clone(all[1 : len(all)-1])
}

func motionColumns(f MotionForm) []string {
	switch f {
	case PoleForm:
		return poleColumns
	case CartesianForm:
		return cartesianColumns
	case CovarianceForm:
		return covarianceColumns
	}
	return nil
}

// MotionRow is one plate's angular velocity: its numbers as they are spelt where
// they come from, so that none is rounded on the way.
type MotionRow struct {
	Plate   string
	Numbers []string
}

// Check reports why a model's table would not take the row, nil where it would.
func (r MotionRow) Check(form MotionForm) error {
	t := table{header: motionColumns(form), rows: [][]string{append(append([]string{r.Plate}, r.Numbers...), motion.Published)}, lines: []int{0}}
	_, _, err := readMotion(motion.Info{Name: "row"}, t.write())
	if f := (*FileError)(nil); errors.As(err, &f) {
		if f.Err != nil {
			return f.Err
		}
		return errors.New(f.Detail)
	}
	return err
}

// Draft is a model directory in the making. Parts that are not set are those of
// the bundle it began from. It is not safe for concurrent use.
type Draft struct {
	base  *Bundle
	info  info
	files map[string][]byte
}

// NewDraft begins a draft from a bundle, or from nothing where base is nil.
func NewDraft(base *Bundle) (*Draft, error) {
	d := &Draft{base: base, files: map[string][]byte{}}
	if base == nil {
		return d, nil
	}
	d.files = maps.Clone(base.files)
	return d, decodeStrictly(base.files[infoFile], &d.info)
}

// SetIdentity says what the model is.
func (d *Draft) SetIdentity(i Identity) {
	d.info.ID, d.info.Edition, d.info.Title, d.info.Licence = i.ID, i.Edition, i.Title, i.Licence
	d.info.Citations, d.info.DefaultMotion = slices.Clone(i.Citations), i.DefaultMotion
}

// Motions returns the names of the draft's motion models.
func (d *Draft) Motions() []string {
	var out []string
	for _, m := range d.info.Motions {
		out = append(out, m.Name)
	}
	return out
}

// SetPlates replaces the table of plates.
func (d *Draft) SetPlates(plates []setting.Plate) { d.files[platesFile] = writePlates(plates) }

// SetBoundaries replaces the boundaries, and with them the names of junctions,
// which hold for the places of the old ones.
func (d *Draft) SetBoundaries(list []*boundary.Boundary) error {
	delete(d.files, junctionsFile)
	var err error
	d.files[boundariesFile], err = writeBoundaries(list)
	return err
}

// SetZones replaces the zones of diffuse deformation.
func (d *Draft) SetZones(zones []*setting.Zone) error {
	delete(d.files, zonesFile)
	if len(zones) == 0 {
		return nil
	}
	var err error
	d.files[zonesFile], err = writeZones(zones)
	return err
}

// SetWarnings replaces the known faults of the data.
func (d *Draft) SetWarnings(ws []setting.Warning) {
	delete(d.files, warningsFile)
	if len(ws) > 0 {
		d.files[warningsFile] = writeWarnings(ws)
	}
}

// SetMotion adds a motion model, or replaces that of the same name.
func (d *Draft) SetMotion(i motion.Info, form MotionForm, rows []MotionRow) error {
	if err := checkMotionName(i.Name); err != nil {
		return err
	}
	t := table{header: motionColumns(form)}
	for _, r := range rows {
		if len(r.Numbers) != len(t.header)-2 {
			return fmt.Errorf("motion model %q: plate %q has %d numbers, want %v", i.Name, r.Plate, len(r.Numbers), MotionColumns(form))
		}
		t.rows = append(t.rows, append(append([]string{r.Plate}, r.Numbers...), motion.Published))
	}
	slices.SortStableFunc(t.rows, func(a, b []string) int { return strings.Compare(a[0], b[0]) })
	d.files[motionFile(i.Name)] = t.write()
	d.info.Motions = slices.DeleteFunc(slices.Clone(d.info.Motions), func(m motionInfo) bool { return m.Name == i.Name })
	d.info.Motions = append(d.info.Motions, motionInfo(i))
	return nil
}

// KeepMotionsOf drops from every motion model the plates that are not listed,
// save those that another plate's velocity was composed on. It returns the codes
// of all plates that some motion model holds then.
func (d *Draft) KeepMotionsOf(plates []string) ([]string, error) {
	have := map[string]bool{}
	for _, m := range d.info.Motions {
		file := motionFile(m.Name)
		t, err := readAnyTable(file, d.files[file])
		if err != nil {
			return nil, err
		}
		keep := map[string]bool{}
		for i := range t.rows {
			if slices.Contains(plates, t.cell(i, "plate")) {
				keep[t.cell(i, "plate")] = true
				if anchor, ok := strings.CutPrefix(t.cell(i, "basis"), motion.Composed("")); ok {
					keep[anchor] = true
				}
			}
		}
		t.rows = slices.DeleteFunc(t.rows, func(row []string) bool { return !keep[row[0]] })
		d.files[file] = t.write()
		maps.Copy(have, keep)
	}
	return slices.Sorted(maps.Keys(have)), nil
}

// SetSlabs replaces the slabs. Those with a surface of the bundle that the draft
// began from keep their grid files byte for byte.
func (d *Draft) SetSlabs(list []*slab.Slab) error {
	slabs := slices.Clone(list)
	slices.SortFunc(slabs, func(a, b *slab.Slab) int { return strings.Compare(a.ID, b.ID) })
	files := map[string][]byte{}
	for _, s := range slabs {
		if !nameForm.MatchString(s.ID) {
			return fmt.Errorf("slab %q must be lower-case letters, digits and hyphens", s.ID)
		}
		layers, ok := slab.GridLayers(s.Surface)
		if !ok {
			continue
		}
		folder := "slabs/" + s.ID + "/"
		if d.baseHas(s) {
			for name, raw := range d.files {
				if strings.HasPrefix(name, folder) {
					files[name] = raw
				}
			}
			continue
		}
		for name, raw := range writeLayers(layers) {
			files[folder+name] = raw
		}
	}
	maps.DeleteFunc(d.files, func(name string, _ []byte) bool { return strings.HasPrefix(name, "slabs/") })
	maps.Copy(d.files, files)
	b := Bundle{files: d.files}
	return b.encodeSlabs(slabs)
}

func (d *Draft) baseHas(s *slab.Slab) bool {
	if d.base == nil {
		return false
	}
	return slices.ContainsFunc(d.base.Model.Slabs(), func(b *slab.Slab) bool { return b.ID == s.ID && b.Surface == s.Surface })
}

// Bundle checks the draft as [Read] checks a directory, and returns it as a
// model.
func (d *Draft) Bundle() (*Bundle, error) {
	if d.info.DefaultMotion == "" && len(d.info.Motions) > 0 {
		d.info.DefaultMotion = d.info.Motions[0].Name
	}
	var raw bytes.Buffer
	if err := json.NewEncoder(&raw).Encode(d.info); err != nil {
		return nil, err
	}
	d.files[infoFile] = raw.Bytes()
	return Read(memory(d.files))
}
