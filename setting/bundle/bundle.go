package bundle

import (
	"bytes"
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"errors"
	"fmt"
	"io/fs"
	"maps"
	"os"
	"path/filepath"
	"slices"

	"nearmargin/setting"
	"nearmargin/setting/motion"
)

const infoFile = "model.json"

// info is model.json.
type info struct {
	ID            string       `json:"id"`
	Edition       string       `json:"edition"`
	Title         string       `json:"title"`
	Licence       string       `json:"licence"`
	Citations     []string     `json:"citations"`
	DefaultMotion string       `json:"default_motion"`
	Motions       []motionInfo `json:"motion_models"`
}

type motionInfo struct {
	Name       string `json:"name"`
	Title      string `json:"title"`
	Frame      string `json:"frame"`
	TimeSpan   string `json:"time_span"`
	Citation   string `json:"citation"`
	RelativeTo string `json:"relative_to,omitempty"`
}

// Bundle is a model with the files that make it, in their canonical form.
type Bundle struct {
	Model *setting.Model
	files map[string][]byte
}

// Read reads a model directory. The error is, or wraps, a *FileError for every
// fault of one file. A network that is open or inconsistent is no error here;
// see boundary.Network.Faults.
func Read(dir fs.FS) (*Bundle, error) {
	r := reader{dir: dir, grids: map[string][]byte{}}
	c, tables, err := r.contents()
	if err != nil {
		return nil, err
	}
	m, err := setting.NewModel(c)
	if err != nil {
		return nil, err
	}
	b := &Bundle{files: maps.Clone(r.grids)}
	if err := b.encode(r.info, m, tables); err != nil {
		return nil, err
	}
	c.SHA256 = b.checksum()
	b.Model, err = setting.NewModel(c)
	return b, err
}

type reader struct {
	dir   fs.FS
	info  info
	grids map[string][]byte // files of gridded slabs, which are kept as they are
}

// maxFileBytes bounds one file of a model directory.
const maxFileBytes = 256 << 20

// file reads a file; where it may be absent it returns nil for one that is.
func (r *reader) file(name string, optional bool) ([]byte, error) {
	st, err := fs.Stat(r.dir, name)
	switch {
	case errors.Is(err, fs.ErrNotExist) && optional:
		return nil, nil
	case errors.Is(err, fs.ErrNotExist):
		return nil, fault(name, 0, "the file is missing")
	case err != nil:
		return nil, &FileError{File: name, Err: err}
	case st.Size() > maxFileBytes:
		return nil, fault(name, 0, "the file has %d bytes; %d are the limit", st.Size(), maxFileBytes)
	}
	raw, err := fs.ReadFile(r.dir, name)
	if err != nil {
		return nil, &FileError{File: name, Err: err}
	}
	return raw, nil
}

func (r *reader) contents() (c setting.Contents, tables map[string]*table, err error) {
	raw, err := r.file(infoFile, false)
	if err != nil {
		return c, nil, err
	}
	if err := decodeStrictly(raw, &r.info); err != nil {
		return c, nil, &FileError{File: infoFile, Err: err}
	}
	c = setting.Contents{
		ID: r.info.ID, Edition: r.info.Edition, Title: r.info.Title, Licence: r.info.Licence,
		Citations: r.info.Citations, DefaultMotion: r.info.DefaultMotion,
	}
	if raw, err = r.file(platesFile, false); err != nil {
		return c, nil, err
	}
	if c.Plates, err = readPlates(raw); err != nil {
		return c, nil, err
	}
	if err = r.boundaries(&c); err != nil {
		return c, nil, err
	}
	if raw, err = r.file(zonesFile, true); err != nil {
		return c, nil, err
	} else if raw != nil {
		if c.Zones, err = readZones(raw); err != nil {
			return c, nil, err
		}
	}
	if raw, err = r.file(hotspotsFile, true); err != nil {
		return c, nil, err
	} else if raw != nil {
		if c.Hotspots, err = readHotspots(raw); err != nil {
			return c, nil, err
		}
	}
	if raw, err = r.file(landFile, true); err != nil {
		return c, nil, err
	} else if raw != nil {
		if c.Land, err = readLand(raw); err != nil {
			return c, nil, err
		}
	}
	if raw, err = r.file(warningsFile, true); err != nil {
		return c, nil, err
	} else if raw != nil {
		if c.Warnings, err = readWarnings(raw); err != nil {
			return c, nil, err
		}
	}
	if err = r.slabs(&c); err != nil {
		return c, nil, err
	}
	tables, err = r.motions(&c)
	return c, tables, err
}

// boundaries reads boundaries.geojson, or the files of the written form.
func (r *reader) boundaries(c *setting.Contents) error {
	written, err := fs.Glob(r.dir, "boundaries/*.txt")
	if err != nil {
		return err
	}
	raw, err := r.file(boundariesFile, len(written) > 0)
	if err != nil {
		return err
	}
	if raw != nil {
		if len(written) > 0 {
			return fault(boundariesFile, 0, "stands beside boundaries/*.txt; a model has one or the other")
		}
		if c.Boundaries, err = readBoundaries(raw); err != nil {
			return err
		}
		if raw, err = r.file(junctionsFile, true); err != nil || raw == nil {
			return err
		}
		c.JunctionNames, err = readJunctions(raw)
		return err
	}
	set := lineSet{nodes: map[string]*lineNode{}}
	slices.Sort(written)
	for _, name := range written {
		raw, err := r.file(name, false)
		if err != nil {
			return err
		}
		if err := set.parse(name, string(raw)); err != nil {
			return err
		}
	}
	c.Boundaries, c.JunctionNames, err = set.boundaries()
	return err
}

func (r *reader) motions(c *setting.Contents) (map[string]*table, error) {
	tables := map[string]*table{}
	for _, mi := range r.info.Motions {
		if err := checkMotionName(mi.Name); err != nil {
			return nil, &FileError{File: infoFile, Err: err}
		}
		raw, err := r.file(motionFile(mi.Name), false)
		if err != nil {
			return nil, err
		}
		m, t, err := readMotion(motion.Info(mi), raw)
		if err != nil {
			return nil, err
		}
		c.Motions = append(c.Motions, m)
		tables[mi.Name] = t
	}
	return tables, nil
}

// encode makes the canonical files of a model.
func (b *Bundle) encode(in info, m *setting.Model, tables map[string]*table) error {
	var raw bytes.Buffer
	e := json.NewEncoder(&raw)
	e.SetEscapeHTML(false)
	e.SetIndent("", "  ")
	if err := e.Encode(in); err != nil {
		return err
	}
	b.files[infoFile] = raw.Bytes()
	b.files[platesFile] = writePlates(m.Plates())
	var err error
	if b.files[boundariesFile], err = writeBoundaries(m.Network().Boundaries()); err != nil {
		return err
	}
	b.files[junctionsFile] = writeJunctions(m.Junctions())
	for name, t := range tables {
		b.files[motionFile(name)] = t.write()
	}
	if zones := m.Zones(); len(zones) > 0 {
		if b.files[zonesFile], err = writeZones(zones); err != nil {
			return err
		}
	}
	if land := m.Land(); len(land) > 0 {
		if b.files[landFile], err = writeLand(land); err != nil {
			return err
		}
	}
	if err := b.encodeSlabs(m.Slabs()); err != nil {
		return err
	}
	if hs := m.Hotspots(); len(hs) > 0 {
		b.files[hotspotsFile] = writeHotspots(hs)
	}
	if ws := m.Warnings(); len(ws) > 0 {
		b.files[warningsFile] = writeWarnings(ws)
	}
	return nil
}

// checksum returns the SHA-256, in hex, over the names, sizes and bytes of the
// canonical files in the order of their names.
func (b *Bundle) checksum() string {
	h := sha256.New()
	for _, name := range slices.Sorted(maps.Keys(b.files)) {
		fmt.Fprintf(h, "%s %d\n", name, len(b.files[name]))
		h.Write(b.files[name])
	}
	return hex.EncodeToString(h.Sum(nil))
}

// Files returns the names of the canonical files, sorted.
func (b *Bundle) Files() []string { return slices.Sorted(maps.Keys(b.files)) }

// File returns a copy of one canonical file, nil where there is none of the name.
func (b *Bundle) File(name string) []byte { return slices.Clone(b.files[name]) }

// Write writes the canonical files into a directory, which must be empty or
// absent: a model is never mixed with the remains of another.
func (b *Bundle) Write(dir string) error {
	if have, err := os.ReadDir(dir); err == nil && len(have) > 0 {
		return fmt.Errorf("%s is not empty; name a new directory", dir)
	}
	for _, name := range b.Files() {
		path := filepath.Join(dir, filepath.FromSlash(name))
		if err := os.MkdirAll(filepath.Dir(path), 0o755); err != nil { // #nosec G301 -- a model is for everybody to read
			return err
		}
		if err := os.WriteFile(path, b.files[name], 0o644); err != nil { // #nosec G306 -- a model is for everybody to read
			return err
		}
	}
	return nil
}
