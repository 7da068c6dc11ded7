package bundle

import (
	"bytes"
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"regexp"
	"slices"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"

	"nearmargin/setting"
	"nearmargin/setting/sphere"
)

// table is a CSV file with a header.
type table struct {
	file   string
	header []string
	rows   [][]string
	lines  []int // of the file, one a row
}

// readTable reads a CSV file that must have the columns wanted, in that order,
// and may have those that are optional after them.
func readTable(file string, raw []byte, want []string, optional ...string) (*table, error) {
	t, err := readAnyTable(file, raw)
	if err != nil {
		return nil, err
	}
	if n := len(want); len(t.header) < n || !slices.Equal(t.header[:n], want) {
		return nil, fault(file, 1, "the columns are %s; they must start with %s", strings.Join(t.header, ","), strings.Join(want, ","))
	}
	for _, h := range t.header[len(want):] {
		if !slices.Contains(optional, h) {
			return nil, fault(file, 1, "column %q is unknown", h)
		}
	}
	return t, nil
}

func readAnyTable(file string, raw []byte) (*table, error) {
	if !utf8.Valid(raw) {
		return nil, &FileError{File: file, Err: errNotUTF8}
	}
	r := csv.NewReader(bytes.NewReader(raw))
	t := &table{file: file}
	for {
		row, err := r.Read()
		if err == io.EOF {
			break
		}
		if err != nil {
			if p := (*csv.ParseError)(nil); errors.As(err, &p) {
				return nil, &FileError{File: file, Line: p.StartLine, Err: p.Err}
			}
			return nil, &FileError{File: file, Err: err}
		}
		line, _ := r.FieldPos(0)
		for i, s := range row {
			if strings.ContainsFunc(s, unicode.IsControl) {
				return nil, fault(file, line, "field %d, %q, holds a line break or another control character", i+1, s)
			}
		}
		if t.header == nil {
			t.header = row
			continue
		}
		t.rows, t.lines = append(t.rows, row), append(t.lines, line)
	}
	if t.header == nil {
		return nil, fault(file, 1, "the file is empty; the first line names the columns")
	}
	return t, nil
}

// cell returns a row's value in a column, "" where there is no such column.
func (t *table) cell(row int, column string) string {
	if i := slices.Index(t.header, column); i >= 0 {
		return t.rows[row][i]
	}
	return ""
}

// number returns a row's number in a column.
func (t *table) number(row int, column string) (float64, error) {
	s := t.cell(row, column)
	x, err := strconv.ParseFloat(s, 64)
	if err != nil || x != x || x-x != 0 {
		return 0, t.fault(row, "%s is %q; it must be a number", column, s)
	}
	return x, nil
}

func (t *table) numbers(row int, columns ...string) ([]float64, error) {
	out := make([]float64, len(columns))
	for i, c := range columns {
		var err error
		if out[i], err = t.number(row, c); err != nil {
			return nil, err
		}
	}
	return out, nil
}

func (t *table) fault(row int, format string, args ...any) error {
	return fault(t.file, t.lines[row], format, args...)
}

func (t *table) write() []byte {
	var b bytes.Buffer
	w := csv.NewWriter(&b)
	_ = w.Write(t.header) // a bytes.Buffer takes all
	_ = w.WriteAll(t.rows)
	return b.Bytes()
}

const (
	platesFile    = "plates.csv"
	junctionsFile = "junctions.csv"
	hotspotsFile  = "hotspots.csv"
)

var (
	platesColumns    = []string{"code", "name"}
	junctionsColumns = []string{"name", "lon", "lat"}
	hotspotsColumns  = []string{"name", "lon", "lat", "source"}
)

var plateCodeForm = regexp.MustCompile(`^[A-Z]{2}$`)

func readPlates(raw []byte) ([]setting.Plate, error) {
	t, err := readTable(platesFile, raw, platesColumns)
	if err != nil {
		return nil, err
	}
	var out []setting.Plate
	for i, r := range t.rows {
		if !plateCodeForm.MatchString(r[0]) {
			return nil, t.fault(i, "code %q must be two upper-case letters", r[0])
		}
		if r[1] == "" {
			return nil, t.fault(i, "plate %s has no name", r[0])
		}
		out = append(out, setting.Plate{Code: r[0], Name: r[1]})
	}
	return out, nil
}

func writePlates(plates []setting.Plate) []byte {
	t := table{header: platesColumns}
	for _, p := range plates {
		t.rows = append(t.rows, []string{p.Code, p.Name})
	}
	return t.write()
}

func (t *table) position(row int) (sphere.LonLat, error) {
	xy, err := t.numbers(row, "lon", "lat")
	if err != nil {
		return sphere.LonLat{}, err
	}
	p, err := position(xy[0], xy[1])
	if err != nil {
		return p, t.fault(row, "%v", err)
	}
	return p, nil
}

func readJunctions(raw []byte) (map[sphere.LonLat]string, error) {
	t, err := readTable(junctionsFile, raw, junctionsColumns)
	if err != nil {
		return nil, err
	}
	out := map[sphere.LonLat]string{}
	for i := range t.rows {
		p, err := t.position(i)
		if err != nil {
			return nil, err
		}
		name := t.cell(i, "name")
		if name == "" {
			return nil, t.fault(i, "the junction at %g, %g has no name", p.Lon, p.Lat)
		}
		if have, ok := out[p]; ok {
			return nil, t.fault(i, "the junction at %g, %g is named already: %q", p.Lon, p.Lat, have)
		}
		out[p] = name
	}
	return out, nil
}

func writeJunctions(js []setting.Junction) []byte {
	t := table{header: junctionsColumns}
	for _, j := range js {
		t.rows = append(t.rows, []string{j.Name, decimal(j.At.Lon), decimal(j.At.Lat)})
	}
	return t.write()
}

func readHotspots(raw []byte) ([]setting.Hotspot, error) {
	t, err := readTable(hotspotsFile, raw, hotspotsColumns)
	if err != nil {
		return nil, err
	}
	var out []setting.Hotspot
	for i := range t.rows {
		p, err := t.position(i)
		if err != nil {
			return nil, err
		}
		h := setting.Hotspot{Name: t.cell(i, "name"), At: p, Source: t.cell(i, "source")}
		if h.Name == "" || h.Source == "" {
			return nil, t.fault(i, "a hotspot needs a name and a source")
		}
		out = append(out, h)
	}
	return out, nil
}

func writeHotspots(hs []setting.Hotspot) []byte {
	t := table{header: hotspotsColumns}
	for _, h := range hs {
		t.rows = append(t.rows, []string{h.Name, decimal(h.At.Lon), decimal(h.At.Lat), h.Source})
	}
	return t.write()
}

func decimal(x float64) string { return strconv.FormatFloat(x, 'f', -1, 64) }

const zonesFile = "zones.geojson"

type zoneProperties struct {
	Name   string `json:"name"`
	Kind   string `json:"kind"`
	Source string `json:"source"`
}

func readZones(raw []byte) ([]*setting.Zone, error) {
	features, err := readFeatures[zoneProperties](zonesFile, raw)
	if err != nil {
		return nil, err
	}
	var out []*setting.Zone
	for i, f := range features {
		z, err := readZone(f)
		if err != nil {
			return nil, &FileError{File: zonesFile, Detail: fmt.Sprintf("features[%d]", i), Err: err}
		}
		out = append(out, z)
	}
	return out, nil
}

func readZone(f feature[zoneProperties]) (*setting.Zone, error) {
	kind, err := setting.ParseZoneKind(f.Properties.Kind)
	if err != nil {
		return nil, fmt.Errorf("zone %q: %w", f.Properties.Name, err)
	}
	rings, err := readRings(f.Geometry)
	if err != nil {
		return nil, fmt.Errorf("zone %q: %w", f.Properties.Name, err)
	}
	return setting.NewZone(setting.Zone{Name: f.Properties.Name, Kind: kind, Source: f.Properties.Source, Rings: rings})
}

func writeZones(zones []*setting.Zone) ([]byte, error) {
	features := make([]feature[zoneProperties], len(zones))
	for i, z := range zones {
		raw := []byte{'['}
		for j, ring := range z.Rings {
			if j > 0 {
				raw = append(raw, ',')
			}
			raw = appendPositions(raw, ring)
		}
		features[i] = feature[zoneProperties]{
			Type:       "Feature",
			Properties: zoneProperties{z.Name, z.Kind.String(), z.Source},
			Geometry:   geometry{"Polygon", append(raw, ']')},
		}
	}
	return writeCollection(features)
}
