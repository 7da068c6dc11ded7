package annotate

import (
	"github.com/tidwall/gjson"

	"nearmargin/api/geojson"
)

// isArea reports whether a Feature has a geometry that is an area.
func isArea(f gjson.Result) bool {
	t := f.Get("geometry.type")
	return f.Get("type").Str == "Feature" && (t.Str == "Polygon" || t.Str == "MultiPolygon")
}

// askArea answers for the geometry of a Feature into k.area.
func (k *asker) askArea(f gjson.Result) error {
	a, err := geojson.FeatureArea(f)
	if err != nil {
		return err
	}
	return k.o.Lookup.Area(k.ctx, a, &k.area)
}
