package annotate

import (
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"regexp"

	"github.com/tidwall/gjson"

	"nearmargin/api/wire"
	"nearmargin/setting"
)

// The members that are added to an object.
const (
	memberAnswer = "tectonic"
	memberError  = "tectonic_error"
)

// asker answers for JSON objects and features, one after the other.
type asker struct {
	ctx    context.Context
	o      *Options
	answer setting.Answer
	area   setting.AreaAnswer
	isArea bool // area holds the answer, not answer
}

// object appends raw, a valid JSON object, with the answer added. It reports
// whether there is one.
func (k *asker) object(b []byte, raw []byte) ([]byte, bool) {
	k.isArea = false
	obj := gjson.ParseBytes(raw)
	if obj.Get("type").Str == "Feature" && obj.Get("geometry").Exists() {
		return k.feature(b, raw)
	}
	s, err := k.siteOf(obj)
	if err == nil {
		err = k.o.Lookup.At(s, &k.answer)
	}
	b = append(b, '{')
	b = appendMembers(b, obj)
	return append(k.appendResult(b, err), '}'), err == nil
}

// appendMembers appends the members of an object as they are spelt, those that
// are ours left out. Each is followed by a comma.
func appendMembers(b []byte, obj gjson.Result) []byte {
	obj.ForEach(func(key, value gjson.Result) bool {
		if key.Str != memberAnswer && key.Str != memberError {
			b = append(b, key.Raw...)
			b = append(b, ':')
			b = append(b, value.Raw...)
			b = append(b, ',')
		}
		return true
	})
	return b
}

// appendResult appends the answer, or the reason why there is none, as a member.
func (k *asker) appendResult(b []byte, err error) []byte {
	if err != nil {
		b = append(b, `"`+memberError+`":`...)
		return wire.AppendString(b, err.Error())
	}
	b = append(b, `"`+memberAnswer+`":`...)
	if k.isArea {
		return wire.AppendArea(b, &k.area)
	}
	return wire.AppendAnswer(b, &k.answer)
}

func (k *asker) siteOf(obj gjson.Result) (setting.Site, error) {
	lon, err := member(obj, k.o.LonColumn, "longitude", lonName)
	if err != nil {
		return setting.Site{}, err
	}
	lat, err := member(obj, k.o.LatColumn, "latitude", latName)
	if err != nil {
		return setting.Site{}, err
	}
	return k.withExtras(obj, lon, lat, "")
}

// withExtras adds depth, uncertainty and elevation, where asked for, from an
// object's members; depth is taken where no member is named for it.
func (k *asker) withExtras(obj gjson.Result, lon, lat, depth string) (setting.Site, error) {
	c := cells{lon: lon, lat: lat, depth: depth}
	for _, x := range [...]struct {
		name string
		into *string
	}{{k.o.DepthColumn, &c.depth}, {k.o.UncertaintyColumn, &c.uncertainty}, {k.o.ElevationColumn, &c.elevation}} {
		if x.name == "" || x.name == ThirdCoordinate {
			continue
		}
		var err error
		if *x.into, err = member(obj, x.name, x.name, nil); err != nil && !errors.Is(err, errMissing) {
			return setting.Site{}, err
		}
	}
	return k.o.site(c, false)
}

// member returns the text of a number member: the one named, or else the only
// one whose name fits.
func member(obj gjson.Result, given, what string, fits *regexp.Regexp) (string, error) {
	var found gjson.Result
	name, twice := "", ""
	obj.ForEach(func(key, value gjson.Result) bool {
		if given != "" && key.Str != given || given == "" && !(mayFit(key.Str) && fits.MatchString(key.Str)) {
			return true
		}
		if name != "" {
			twice = key.Str
			return false
		}
		name, found = key.Str, value
		return true
	})
	switch {
	case twice != "":
		return "", fmt.Errorf("members %q and %q could both be the %s", clip(name), clip(twice), what)
	case name == "":
		return "", fmt.Errorf("%s %w: there is no such member", what, errMissing)
	}
	return numberText(found, name)
}

// mayFit is a quick test that every name of a coordinate passes.
func mayFit(name string) bool {
	for i := range len(name) {
		switch name[i] {
		case ' ', '\t', '\n', '\f', '\r':
		case 'l', 'L':
			return true
		default:
			return false
		}
	}
	return false
}

// numberText returns the text of a JSON number, or of a string that may hold
// one; "" for null.
func numberText(v gjson.Result, name string) (string, error) {
	switch v.Type {
	case gjson.Number:
		return v.Raw, nil
	case gjson.String:
		return v.Str, nil
	case gjson.Null:
		return "", nil
	}
	return "", fmt.Errorf("%s is %s; it must be a number", clip(name), clip(v.Raw))
}

// feature appends a GeoJSON Feature with the answer among its properties.
func (k *asker) feature(b []byte, raw []byte) ([]byte, bool) {
	f := gjson.ParseBytes(raw)
	err := k.askFeature(f)
	b = append(b, '{')
	done := false
	f.ForEach(func(key, value gjson.Result) bool {
		b = append(b, key.Raw...)
		b = append(b, ':')
		if key.Str == "properties" && !done {
			done = true
			b = append(b, '{')
			if value.IsObject() {
				b = appendMembers(b, value)
			}
			b = append(k.appendResult(b, err), '}')
		} else {
			b = append(b, value.Raw...)
		}
		b = append(b, ',')
		return true
	})
	if !done {
		b = append(b, `"properties":{`...)
		b = append(k.appendResult(b, err), '}', ',')
	}
	b[len(b)-1] = '}'
	return b, err == nil
}

// askFeature answers for a Feature of a Point, a Polygon or a MultiPolygon.
func (k *asker) askFeature(f gjson.Result) error {
	if k.isArea = isArea(f); k.isArea {
		return k.askArea(f)
	}
	s, err := k.siteOfFeature(f)
	if err != nil {
		return err
	}
	return k.o.Lookup.At(s, &k.answer)
}

func (k *asker) siteOfFeature(f gjson.Result) (setting.Site, error) {
	if t := f.Get("type"); t.Str != "Feature" {
		return setting.Site{}, fmt.Errorf(`type is %s; it must be "Feature"`, orMissing(t.Raw))
	}
	g := f.Get("geometry")
	if !g.IsObject() {
		return setting.Site{}, fmt.Errorf("geometry is %s; it must be a Point", orMissing(clip(g.Raw)))
	}
	if t := g.Get("type"); t.Str != "Point" {
		return setting.Site{}, fmt.Errorf("geometry is %s; only a Point, a Polygon and a MultiPolygon have an answer", orMissing(clip(t.Raw)))
	}
	c := g.Get("coordinates").Array()
	if len(c) < 2 || c[0].Type != gjson.Number || c[1].Type != gjson.Number {
		return setting.Site{}, errors.New("coordinates must be at least two numbers, longitude and latitude")
	}
	depth := ""
	if k.o.DepthColumn == ThirdCoordinate && len(c) > 2 {
		depth = c[2].Raw
	}
	return k.withExtras(f.Get("properties"), c[0].Raw, c[1].Raw, depth)
}

func orMissing(raw string) string {
	if raw == "" {
		return "missing"
	}
	return raw
}

// jsonFault says what is wrong with JSON text, and where.
func jsonFault(raw []byte) error {
	var syntax *json.SyntaxError
	var v any
	err := json.Unmarshal(raw, &v)
	if errors.As(err, &syntax) {
		return fmt.Errorf("not JSON: %v, at byte %d", syntax, syntax.Offset)
	}
	if err != nil {
		return fmt.Errorf("not JSON: %w", err)
	}
	return nil
}
