package bundle

import (
	"bytes"
	"encoding/json"
	"fmt"
	"math"
	"strconv"
	"unicode/utf8"

	"nearmargin/setting/boundary"
	"nearmargin/setting/sphere"
)

// feature is a GeoJSON Feature of a model file.
type feature[P any] struct {
	Type       string   `json:"type"`
	ID         any      `json:"id,omitempty"`
	Properties P        `json:"properties"`
	Geometry   geometry `json:"geometry"`
}

type geometry struct {
	Type        string          `json:"type"`
	Coordinates json.RawMessage `json:"coordinates"`
}

type collection[P any] struct {
	Type     string       `json:"type"`
	Features []feature[P] `json:"features"`
}

// readFeatures decodes a FeatureCollection strictly.
func readFeatures[P any](file string, raw []byte) ([]feature[P], error) {
	var c collection[P]
	if err := decodeStrictly(raw, &c); err != nil {
		return nil, &FileError{File: file, Err: err}
	}
	if c.Type != "FeatureCollection" {
		return nil, fault(file, 0, `type is %q; it must be "FeatureCollection"`, c.Type)
	}
	for i := range c.Features {
		if got := c.Features[i].Type; got != "Feature" {
			return nil, fault(file, 0, `features[%d]: type is %q; it must be "Feature"`, i, got)
		}
	}
	return c.Features, nil
}

// decodeStrictly decodes one JSON value, without unknown members and without
// anything after it.
func decodeStrictly(raw []byte, into any) error {
	if !utf8.Valid(raw) {
		return errNotUTF8
	}
	d := json.NewDecoder(bytes.NewReader(raw))
	d.DisallowUnknownFields()
	if err := d.Decode(into); err != nil {
		return err
	}
	if d.More() {
		return fmt.Errorf("something follows the JSON value, at byte %d", d.InputOffset())
	}
	return nil
}

type boundaryProperties struct {
	ID           string  `json:"id"`
	Name         string  `json:"name"`
	Type         string  `json:"type"`
	Left         string  `json:"left_plate"`
	Right        string  `json:"right_plate"`
	Subducting   *string `json:"subducting_plate"`
	SigmaKm      float64 `json:"sigma_km"`
	Source       string  `json:"source"`
	SourceStatus string  `json:"source_status"`
}

const boundariesFile = "boundaries.geojson"

// readBoundaries decodes boundaries.geojson.
func readBoundaries(raw []byte) ([]*boundary.Boundary, error) {
	features, err := readFeatures[boundaryProperties](boundariesFile, raw)
	if err != nil {
		return nil, err
	}
	var out []*boundary.Boundary
	for i, f := range features {
		in := func(err error) error {
			return &FileError{File: boundariesFile, Detail: fmt.Sprintf("features[%d] (id %q)", i, f.Properties.ID), Err: err}
		}
		path, err := readPath(f.Geometry)
		if err != nil {
			return nil, in(err)
		}
		kind, err := boundary.ParseType(f.Properties.Type)
		if err != nil {
			return nil, in(err)
		}
		s := boundary.Spec{
			ID: f.Properties.ID, Name: f.Properties.Name, Type: kind,
			Left: f.Properties.Left, Right: f.Properties.Right,
			SigmaKm: f.Properties.SigmaKm, Source: f.Properties.Source,
			SourceStatus: boundary.SourceStatus(f.Properties.SourceStatus), Path: path,
		}
		if f.Properties.Subducting != nil {
			s.Subducting = *f.Properties.Subducting
		}
		b, err := boundary.New(s)
		if err != nil {
			return nil, in(err)
		}
		out = append(out, b)
	}
	return out, nil
}

// readPath returns the path of a LineString, or of a MultiLineString that was cut
// at ±180°.
func readPath(g geometry) ([]sphere.LonLat, error) {
	var parts [][][]float64
	var err error
	switch g.Type {
	case "LineString":
		parts = make([][][]float64, 1)
		err = json.Unmarshal(g.Coordinates, &parts[0])
	case "MultiLineString":
		err = json.Unmarshal(g.Coordinates, &parts)
	default:
		err = fmt.Errorf("geometry is %q; it must be LineString, or MultiLineString where it is cut at ±180°", g.Type)
	}
	if err != nil {
		return nil, err
	}
	return joinParts(parts)
}

// readRings returns the rings of a Polygon.
func readRings(g geometry) ([][]sphere.LonLat, error) {
	if g.Type != "Polygon" {
		return nil, fmt.Errorf("geometry is %q; it must be Polygon", g.Type)
	}
	var rings [][][]float64
	if err := decodeStrictly(g.Coordinates, &rings); err != nil {
		return nil, err
	}
	var out [][]sphere.LonLat
	for _, ring := range rings {
		var pts []sphere.LonLat
		for _, c := range ring {
			if len(c) < 2 {
				return nil, fmt.Errorf("a position has %d numbers; it needs longitude and latitude", len(c))
			}
			p, err := position(c[0], c[1])
			if err != nil {
				return nil, err
			}
			pts = append(pts, p)
		}
		out = append(out, pts)
	}
	return out, nil
}

// joinParts makes one path of lines that were cut at ±180°.
func joinParts(parts [][][]float64) ([]sphere.LonLat, error) {
	var path []sphere.LonLat
	for i, part := range parts {
		if len(part) < 2 {
			return nil, fmt.Errorf("part %d has %d positions; a line has at least 2", i+1, len(part))
		}
		for j, c := range part {
			if len(c) < 2 {
				return nil, fmt.Errorf("a position has %d numbers; it needs longitude and latitude", len(c))
			}
			p, err := position(c[0], c[1])
			if err != nil {
				return nil, err
			}
			if i > 0 && j == 0 {
				prev := parts[i-1]
				end := prev[len(prev)-1]
				if math.Abs(end[0]) != 180 || c[0] != -end[0] || end[1] != c[1] {
					return nil, fmt.Errorf("part %d starts at %v; the parts of a MultiLineString must join at ±180°, where the one before ends at %v", i+1, c, end)
				}
				if len(part[1]) >= 2 && isCut(path[len(path)-2], p, sphere.LonLat{Lon: part[1][0], Lat: part[1][1]}) {
					path = path[:len(path)-1]
				}
				continue
			}
			path = append(path, p)
		}
	}
	return path, nil
}

// isCut reports whether q is where writing would cut the arc from a to b, and so
// no vertex of its own.
func isCut(a, q, b sphere.LonLat) bool {
	if _, ok := sphere.NewArc(sphere.FromLonLat(a), sphere.FromLonLat(b)); !ok {
		return false
	}
	parts := sphere.CutAtAntimeridian([]sphere.LonLat{a, b})
	return len(parts) == 2 && parts[0][1].Lat == q.Lat
}

// writeBoundaries encodes boundaries.geojson, one feature a line.
func writeBoundaries(list []*boundary.Boundary) ([]byte, error) {
	features := make([]feature[boundaryProperties], len(list))
	for i, b := range list {
		p := boundaryProperties{
			ID: b.ID(), Name: b.Name(), Type: b.Type().String(), Left: b.Left(), Right: b.Right(),
			SigmaKm: b.SigmaKm(), Source: b.Source(), SourceStatus: string(b.SourceStatus()),
		}
		if s := b.Subducting(); s != "" {
			p.Subducting = &s
		}
		features[i] = feature[boundaryProperties]{Type: "Feature", Properties: p, Geometry: lineGeometry(b.Path())}
	}
	return writeCollection(features)
}

func writeCollection[P any](features []feature[P]) ([]byte, error) {
	var out bytes.Buffer
	out.WriteString("{\"type\":\"FeatureCollection\",\"features\":[")
	for i, f := range features {
		if i > 0 {
			out.WriteByte(',')
		}
		out.WriteByte('\n')
		raw, err := marshal(f)
		if err != nil {
			return nil, err
		}
		out.Write(raw)
	}
	out.WriteString("\n]}\n")
	return out.Bytes(), nil
}

// marshal encodes without escaping <, > and &.
func marshal(v any) ([]byte, error) {
	var b bytes.Buffer
	e := json.NewEncoder(&b)
	e.SetEscapeHTML(false)
	if err := e.Encode(v); err != nil {
		return nil, err
	}
	return bytes.TrimRight(b.Bytes(), "\n"), nil
}

// lineGeometry returns a LineString, or a MultiLineString cut at ±180°.
func lineGeometry(path []sphere.LonLat) geometry {
	parts := sphere.CutAtAntimeridian(path)
	if len(parts) == 1 {
		return geometry{"LineString", appendPositions(nil, parts[0])}
	}
	raw := []byte{'['}
	for i, p := range parts {
		if i > 0 {
			raw = append(raw, ',')
		}
		raw = appendPositions(raw, p)
	}
	return geometry{"MultiLineString", append(raw, ']')}
}

func appendPositions(b []byte, path []sphere.LonLat) []byte {
	b = append(b, '[')
	for i, p := range path {
		if i > 0 {
			b = append(b, ',')
		}
		b = append(b, '[')
		b = strconv.AppendFloat(b, p.Lon, 'f', -1, 64)
		b = append(b, ',')
		b = strconv.AppendFloat(b, p.Lat, 'f', -1, 64)
		b = append(b, ']')
	}
	return append(b, ']')
}
