package geojson

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"math"
	"strconv"
	"strings"

	"github.com/tidwall/gjson"

	"nearmargin/setting"
	"nearmargin/setting/sphere"
)

// Fault says what is wrong with a document, and where.
type Fault struct {
	Kind         setting.AreaFault
	Pointer      string // JSON pointer, "" for the whole document
	Line, Column int    // from 1, where the text is no JSON; else 0
	Detail       string // what was wrong and what would be right
}

func (f *Fault) Error() string {
	switch {
	case f.Line > 0:
		return fmt.Sprintf("line %d, column %d: %s", f.Line, f.Column, f.Detail)
	case f.Pointer != "":
		return f.Pointer + ": " + f.Detail
	}
	return f.Detail
}

func formFault(pointer, format string, args ...any) error {
	return &Fault{Kind: setting.AreaForm, Pointer: pointer, Detail: fmt.Sprintf(format, args...)}
}

// DecodeArea reads a Polygon, a MultiPolygon, or a Feature of one. Third and
// further numbers of a position are not read; members that are not known are
// passed over. The error is a *Fault.
func DecodeArea(text []byte) (*setting.Area, error) {
	if !json.Valid(text) {
		return nil, syntaxFault(text)
	}
	doc := gjson.ParseBytes(text)
	if !doc.IsObject() {
		return nil, formFault("", "the body is %s; it must be a GeoJSON Polygon, MultiPolygon, or Feature of one", kindOf(doc))
	}
	if err := checkCRS(doc); err != nil {
		return nil, err
	}
	kind, err := typeOf(doc, "")
	if err != nil {
		return nil, err
	}
	switch kind {
	case "Polygon", "MultiPolygon":
		return geometry(doc, kind, "")
	case "Feature":
		return FeatureArea(doc)
	}
	return nil, formFault("/type", "type is %q; an area is a Polygon, a MultiPolygon, or a Feature of one; /v1/annotate takes a FeatureCollection", clip(kind))
}

// FeatureArea reads the geometry of a Feature, an object of valid JSON.
func FeatureArea(feature gjson.Result) (*setting.Area, error) {
	if err := checkCRS(feature); err != nil {
		return nil, err
	}
	g, err := member(feature, "geometry", "")
	if err != nil {
		return nil, err
	}
	if !g.IsObject() {
		return nil, formFault("/geometry", "geometry is %s; it must be a Polygon or a MultiPolygon", kindOf(g))
	}
	kind, err := typeOf(g, "/geometry")
	if err != nil {
		return nil, err
	}
	if kind != "Polygon" && kind != "MultiPolygon" {
		return nil, formFault("/geometry/type", "type is %q; it must be Polygon or MultiPolygon", clip(kind))
	}
	return geometry(g, kind, "/geometry")
}

// geometry reads the coordinates of a Polygon or MultiPolygon below a pointer.
func geometry(g gjson.Result, kind, pointer string) (*setting.Area, error) {
	c, err := member(g, "coordinates", pointer)
	if err != nil {
		return nil, err
	}
	pointer += "/coordinates"
	if !c.IsArray() {
		return nil, formFault(pointer, "coordinates is %s; it must be an array of rings", kindOf(c))
	}
	r := reader{}
	if kind == "Polygon" {
		rings, err := r.rings(c, pointer)
		if err != nil {
			return nil, err
		}
		a, err := setting.NewArea(rings)
		return a, at(err, func(_ int) string { return pointer })
	}
	var polygons [][][]sphere.LonLat
	err = each(c, func(i int, p gjson.Result) error {
		rings, err := r.rings(p, fmt.Sprintf("%s/%d", pointer, i))
		polygons = append(polygons, rings)
		return err
	})
	if err != nil {
		return nil, err
	}
	if len(polygons) == 0 {
		return nil, formFault(pointer, "coordinates is empty; a MultiPolygon needs at least one polygon")
	}
	a, err := setting.NewArea(polygons...)
	return a, at(err, func(i int) string { return fmt.Sprintf("%s/%d", pointer, i) })
}

// at puts the pointer to a fault of an area.
func at(err error, polygon func(int) string) error {
	var e *setting.AreaError
	if !errors.As(err, &e) {
		return err
	}
	f := &Fault{Kind: e.Fault, Pointer: polygon(max(0, e.Polygon)), Detail: e.Detail}
	for _, i := range [...]int{e.Ring, e.Position} {
		if i < 0 {
			break
		}
		f.Pointer += "/" + strconv.Itoa(i)
	}
	return f
}

// reader counts what is read, to stop early.
type reader struct{ nRings, nPositions int }

// rings reads the rings of one polygon.
func (r *reader) rings(p gjson.Result, pointer string) ([][]sphere.LonLat, error) {
	if !p.IsArray() {
		return nil, formFault(pointer, "a polygon is %s; it must be an array of rings", kindOf(p))
	}
	var out [][]sphere.LonLat
	err := each(p, func(i int, ring gjson.Result) error {
		pointer := fmt.Sprintf("%s/%d", pointer, i)
		if r.nRings++; r.nRings > setting.MaxAreaRings {
			return &Fault{Kind: setting.AreaTooLarge, Pointer: pointer, Detail: fmt.Sprintf("the area has more than %d rings, which is the limit", setting.MaxAreaRings)}
		}
		if !ring.IsArray() {
			return formFault(pointer, "a ring is %s; it must be an array of positions", kindOf(ring))
		}
		positions, err := r.ring(ring, pointer)
		out = append(out, positions)
		return err
	})
	if err == nil && len(out) == 0 {
		err = formFault(pointer, "the polygon is empty; it needs an outer ring")
	}
	return out, err
}

func (r *reader) ring(ring gjson.Result, pointer string) ([]sphere.LonLat, error) {
	var out []sphere.LonLat
	return out, each(ring, func(i int, p gjson.Result) error {
		if r.nPositions++; r.nPositions > setting.MaxAreaPositions {
			return &Fault{Kind: setting.AreaTooLarge, Pointer: fmt.Sprintf("%s/%d", pointer, i), Detail: fmt.Sprintf("the area has more than %d positions, which is the limit; generalise it", setting.MaxAreaPositions)}
		}
		at, err := position(p)
		if err != "" {
			return formFault(fmt.Sprintf("%s/%d", pointer, i), "%s", err)
		}
		out = append(out, at)
		return nil
	})
}

// position reads longitude and latitude, or says what is wrong.
func position(p gjson.Result) (at sphere.LonLat, fault string) {
	if !p.IsArray() {
		return at, "a position is " + kindOf(p) + "; it must be an array of longitude and latitude"
	}
	n := 0
	p.ForEach(func(_, x gjson.Result) bool {
		if x.Type != gjson.Number {
			fault = fmt.Sprintf("number %d of the position is %s; longitude and latitude must be numbers", n+1, kindOf(x))
			return false
		}
		if n < 2 {
			v, err := strconv.ParseFloat(x.Raw, 64)
			if err != nil && math.IsInf(v, 0) {
				fault = fmt.Sprintf("%s is beyond the range of numbers", clip(x.Raw))
				return false
			}
			if n == 0 {
				at.Lon = v
			} else {
				at.Lat = v
			}
		}
		n++
		return true
	})
	if fault == "" && n < 2 {
		fault = fmt.Sprintf("the position has %d numbers; it needs two, longitude and latitude", n)
	}
	return at, fault
}

// each calls f for the elements of an array until one is at fault.
func each(array gjson.Result, f func(i int, element gjson.Result) error) error {
	i := 0
	var err error
	array.ForEach(func(_, element gjson.Result) bool {
		err = f(i, element)
		i++
		return err == nil
	})
	return err
}

// member returns the member of a name, which must stand once.
func member(obj gjson.Result, name, pointer string) (gjson.Result, error) {
	var found gjson.Result
	n := 0
	obj.ForEach(func(key, value gjson.Result) bool {
		if key.Str == name {
			found = value
			n++
		}
		return true
	})
	switch n {
	case 0:
		return found, formFault(pointer, "the member %s is missing", name)
	case 1:
		return found, nil
	}
	return found, formFault(pointer+"/"+name, "%s stands %d times; give it once", name, n)
}

func typeOf(obj gjson.Result, pointer string) (string, error) {
	t, err := member(obj, "type", pointer)
	if err != nil {
		return "", err
	}
	if t.Type != gjson.String {
		return "", formFault(pointer+"/type", "type is %s; it must be a string, such as \"Polygon\"", kindOf(t))
	}
	return t.Str, nil
}

// checkCRS refuses coordinates that are said not to be WGS84: the member crs of
// the specification of 2008, which RFC 7946 took out.
func checkCRS(obj gjson.Result) error {
	crs := obj.Get("crs")
	if !crs.Exists() || crs.Type == gjson.Null {
		return nil
	}
	name := crs.Get("properties.name").Str
	if strings.HasSuffix(name, "CRS84") || strings.HasSuffix(name, ":4326") {
		return nil
	}
	return formFault("/crs", "crs %q is not read; coordinates must be WGS84 longitude and latitude in degrees", clip(name))
}

// syntaxFault says where a text stops being JSON.
func syntaxFault(text []byte) error {
	if len(bytes.TrimSpace(text)) == 0 {
		return formFault("", "the body is empty; it must be a GeoJSON Polygon, MultiPolygon, or Feature of one")
	}
	var v json.RawMessage
	err := json.Unmarshal(text, &v)
	offset := len(text)
	var syntax *json.SyntaxError
	if errors.As(err, &syntax) {
		offset = int(min(max(syntax.Offset-1, 0), int64(len(text))))
	}
	before := text[:offset]
	return &Fault{
		Kind:   setting.AreaForm,
		Line:   1 + bytes.Count(before, []byte("\n")),
		Column: 1 + offset - (1 + bytes.LastIndexByte(before, '\n')),
		Detail: fmt.Sprintf("not JSON: %v", err),
	}
}

// kindOf names a JSON value for a message.
func kindOf(v gjson.Result) string {
	switch {
	case !v.Exists():
		return "missing"
	case v.IsObject():
		return "an object"
	case v.IsArray():
		return "an array"
	case v.Type == gjson.String:
		return "a string"
	case v.Type == gjson.Number:
		return "a number"
	}
	return clip(v.Raw)
}

// clip shortens a value for a message.
func clip(s string) string {
	const most = 40
	s = strings.ToValidUTF8(s, "\uFFFD")
	if r := []rune(s); len(r) > most {
		return string(r[:most]) + "..."
	}
	return s
}
