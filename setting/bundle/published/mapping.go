package published

import (
	"fmt"
	"slices"
	"strings"

	"nearmargin/setting/boundary"
)

// mapped are the fields that a mapping may fill.
var mapped = []string{"id", "name", "type", "left_plate", "right_plate", "subducting_plate", "sigma_km", "source"}

// Mapping says which property of a GeoJSON feature fills which field of a
// boundary.
type Mapping struct {
	property map[string]string        // field → property
	constant map[string]string        // field → value for all features
	kind     map[string]boundary.Type // a publisher's word for a type → the type
}

// ParseMapping reads a comma-separated list of
//
//	field=PROPERTY     the field is filled from the feature's property
//	field='text'       the field is the same for all features
//	type:WORD=TYPE     the publisher's word for a type; the project's words and
//	                   the classes of Bird (2003), such as SUB, need none
//
// The fields are id, name, type, left_plate, right_plate, subducting_plate,
// sigma_km and source. A field that is not listed is filled from a property of its
// own name; type, left_plate and right_plate are needed.
func ParseMapping(s string) (*Mapping, error) {
	m := &Mapping{map[string]string{}, map[string]string{}, map[string]boundary.Type{}}
	for _, f := range mapped {
		m.property[f] = f
	}
	seen := map[string]bool{}
	for _, part := range strings.Split(s, ",") {
		if part = strings.TrimSpace(part); part == "" {
			continue
		}
		field, value, ok := strings.Cut(part, "=")
		if !ok || value == "" {
			return nil, fmt.Errorf("mapping %q: want field=PROPERTY, field='text' or type:WORD=TYPE", part)
		}
		if seen[field] {
			return nil, fmt.Errorf("mapping: %q stands twice", field)
		}
		seen[field] = true
		if word, ok := strings.CutPrefix(field, "type:"); ok {
			t, err := boundary.ParseType(value)
			if err != nil {
				return nil, fmt.Errorf("mapping %q: %w", part, err)
			}
			m.kind[word] = t
			continue
		}
		if !slices.Contains(mapped, field) {
			return nil, fmt.Errorf("mapping %q: there is no field %q; the fields are %s", part, field, strings.Join(mapped, ", "))
		}
		if text, ok := strings.CutPrefix(value, "'"); ok {
			if text, ok = strings.CutSuffix(text, "'"); !ok {
				return nil, fmt.Errorf("mapping %q: the closing ' is missing; a text cannot hold a comma", part)
			}
			m.constant[field] = text
			continue
		}
		m.property[field] = value
	}
	return m, nil
}

// typeOf returns the type that a publisher's word stands for.
func (m *Mapping) typeOf(word string) (boundary.Type, error) {
	if t, ok := m.kind[word]; ok {
		return t, nil
	}
	if t, ok := classes[word]; ok {
		return t, nil
	}
	t, err := boundary.ParseType(word)
	if err != nil {
		return t, fmt.Errorf("%w; map the publisher's word with type:%s=TYPE", err, word)
	}
	return t, nil
}

// values fills the fields from a feature's properties.
func (m *Mapping) values(properties map[string]any) map[string]string {
	out := map[string]string{}
	for _, f := range mapped {
		if text, ok := m.constant[f]; ok {
			out[f] = text
			continue
		}
		switch v := properties[m.property[f]].(type) {
		case nil:
		case string:
			out[f] = strings.Map(printable, strings.TrimSpace(v))
		default:
			out[f] = fmt.Sprint(v) // a json.Number as it is spelt
		}
	}
	return out
}
