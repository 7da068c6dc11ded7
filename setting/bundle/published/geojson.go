package published

import (
	"bytes"
	"encoding/json"
	"fmt"
	"io"
	"strconv"

	"nearmargin/setting/boundary"
)

// maxGeoJSONBytes bounds a GeoJSON file.
const maxGeoJSONBytes = 256 << 20

// ReadGeoJSON reads boundaries from a GeoJSON FeatureCollection of LineStrings and
// MultiLineStrings; each part of the latter becomes a boundary. Positions of more
// than two numbers lose the rest. A feature at fault is left out and named by the
// line on which it begins; a text that is no such collection is an error.
func ReadGeoJSON(name string, text io.Reader, m *Mapping, codes Codes) ([]*boundary.Boundary, Tally, error) {
	t := Tally{File: name}
	raw, err := io.ReadAll(io.LimitReader(text, maxGeoJSONBytes+1))
	if err != nil {
		return nil, t, fmt.Errorf("%s: %w", name, err)
	}
	if len(raw) > maxGeoJSONBytes {
		return nil, t, fmt.Errorf("%s: has more than %d bytes", name, maxGeoJSONBytes)
	}
	var out []*boundary.Boundary
	seen := map[string]int{}
	number := 0
	err = eachFeature(bytes.TrimPrefix(raw, []byte("\ufeff")), func(line int, raw json.RawMessage) {
		number++
		list, err := readFeature(name, number, raw, m, codes)
		for _, b := range list {
			if at := seen[b.ID()]; at > 0 && err == nil {
				err = fmt.Errorf("id %q stands in line %d already", b.ID(), at)
			}
		}
		if err != nil {
			t.reject(line, "feature %d: %v", number, err)
			return
		}
		for _, b := range list {
			seen[b.ID()] = line
		}
		out = append(out, list...)
		t.Read++
	})
	if err != nil {
		return nil, t, fmt.Errorf("%s: %w", name, err)
	}
	return out, t, nil
}

// eachFeature visits the members of the array "features" of an object.
func eachFeature(raw []byte, visit func(line int, raw json.RawMessage)) error {
	d := json.NewDecoder(bytes.NewReader(raw))
	if tok, err := d.Token(); err != nil || tok != json.Delim('{') {
		return fmt.Errorf("is no GeoJSON FeatureCollection: it does not begin with {")
	}
	found := false
	line, counted := 1, 0
	for d.More() {
		key, err := d.Token()
		if err != nil {
			return err
		}
		if key != "features" {
			var other json.RawMessage
			if err := d.Decode(&other); err != nil {
				return err
			}
			continue
		}
		if tok, err := d.Token(); err != nil || tok != json.Delim('[') {
			return fmt.Errorf(`"features" is no array`)
		}
		found = true
		for d.More() {
			var f json.RawMessage
			if err := d.Decode(&f); err != nil {
				return err
			}
			start := int(d.InputOffset()) - len(f)
			line += bytes.Count(raw[counted:start], []byte("\n"))
			counted = start
			visit(line, f)
		}
		if _, err := d.Token(); err != nil {
			return err
		}
	}
	if _, err := d.Token(); err != nil {
		return fmt.Errorf("the FeatureCollection does not end: %w", err)
	}
	if !found {
		return fmt.Errorf(`is no GeoJSON FeatureCollection: it has no "features"`)
	}
	return nil
}

type theirFeature struct {
	Properties map[string]any `json:"properties"`
	Geometry   *struct {
		Type        string          `json:"type"`
		Coordinates json.RawMessage `json:"coordinates"`
	} `json:"geometry"`
}

func readFeature(file string, number int, raw json.RawMessage, m *Mapping, codes Codes) ([]*boundary.Boundary, error) {
	d := json.NewDecoder(bytes.NewReader(raw))
	d.UseNumber()
	var f theirFeature
	if err := d.Decode(&f); err != nil {
		return nil, err
	}
	if f.Geometry == nil {
		return nil, fmt.Errorf("it has no geometry")
	}
	var parts [][][]float64
	var err error
	switch f.Geometry.Type {
	case "LineString":
		parts = make([][][]float64, 1)
		err = json.Unmarshal(f.Geometry.Coordinates, &parts[0])
	case "MultiLineString":
		err = json.Unmarshal(f.Geometry.Coordinates, &parts)
	default:
		err = fmt.Errorf("geometry is %q; it must be LineString or MultiLineString", f.Geometry.Type)
	}
	if err != nil {
		return nil, err
	}
	spec, err := specOf(file, number, m, m.values(f.Properties), codes)
	if err != nil {
		return nil, err
	}
	id := spec.ID
	var out []*boundary.Boundary
	for i, part := range parts {
		if len(parts) > 1 {
			spec.ID = fmt.Sprintf("%s-%d", id, i+1)
		}
		spec.Path = nil
		for _, c := range part {
			if len(c) < 2 {
				return nil, fmt.Errorf("a position has %d numbers; it needs longitude and latitude", len(c))
			}
			p, err := place(c[0], c[1])
			if err != nil {
				return nil, err
			}
			if n := len(spec.Path); n == 0 || spec.Path[n-1] != p {
				spec.Path = append(spec.Path, p)
			}
		}
		b, err := boundary.New(spec)
		if err != nil {
			return nil, err
		}
		out = append(out, b)
	}
	if len(out) == 0 {
		return nil, fmt.Errorf("its geometry is empty")
	}
	return out, nil
}

// specOf fills what a boundary is, all but its path.
func specOf(file string, number int, m *Mapping, v map[string]string, codes Codes) (boundary.Spec, error) {
	s := boundary.Spec{
		ID: v["id"], Name: v["name"], Source: v["source"], SourceStatus: boundary.Consulted,
		Left: codes.of(v["left_plate"]), Right: codes.of(v["right_plate"]),
	}
	for _, f := range [...]string{"type", "left_plate", "right_plate"} {
		if v[f] == "" {
			return s, fmt.Errorf("property %q, for %s, is missing; map another with %s=PROPERTY", m.property[f], f, f)
		}
	}
	for _, code := range [...]string{s.Left, s.Right} {
		if !isCode(code) {
			return s, fmt.Errorf("plate %q is not a code of two upper-case letters", code)
		}
	}
	var err error
	if s.Type, err = m.typeOf(v["type"]); err != nil {
		return s, err
	}
	switch down := v["subducting_plate"]; down {
	case "left":
		s.Subducting = s.Left
	case "right":
		s.Subducting = s.Right
	default:
		s.Subducting = codes.of(down)
	}
	s.SigmaKm = classSigmaKm[s.Type]
	if v["sigma_km"] != "" {
		if s.SigmaKm, err = strconv.ParseFloat(v["sigma_km"], 64); err != nil {
			return s, fmt.Errorf("sigma_km is %q; it must be a number", v["sigma_km"])
		}
	}
	if s.ID == "" {
		s.ID = fmt.Sprintf("boundary-%d", number)
	}
	s.ID = slug(s.ID)
	if s.Name == "" {
		s.Name = s.ID
	}
	if s.Source == "" {
		s.Source = File{Name: file}.base()
	}
	return s, nil
}

// slug replaces what may not stand in an id, blanks and control characters.
func slug(s string) string {
	out := []rune(s)
	for i, r := range out {
		if r <= ' ' || r >= 0x7f && r <= 0xa0 {
			out[i] = '-'
		}
	}
	return string(out)
}
