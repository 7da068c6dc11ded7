package annotate

import (
	"errors"
	"fmt"
	"regexp"

	"nearmargin/setting"
)

// Units of a depth column.
const (
	UnitKm = "km"
	UnitM  = "m"
	UnitFt = "ft"
)

// Datums of a depth column: what depths are counted from, positive down.
const (
	SeaLevel = "sea_level"
	Ground   = "ground" // the surface at the site; needs an elevation column
)

// kmPer is the length of each unit in km; the foot is the international one.
var kmPer = map[string]float64{UnitKm: 1, UnitM: 1e-3, UnitFt: 0.3048e-3}

// alongHole are words for depths measured along a borehole.
var alongHole = regexp.MustCompile(`(?i)^(md|mdrkb|mdkb|measured[ _-]?depth|along[ _-]?hole.*|ahd|drilled[ _-]?depth)$`)

const alongHoleDetail = "depths along the hole are not depths: a deviated well's is shallower, and only its survey says by how much. Give true vertical depth"

// fillDepth checks the options on depth.
func (o *Options) fillDepth() error {
	if o.DepthUnit == "" {
		o.DepthUnit = UnitKm
	}
	if o.DepthDatum == "" {
		o.DepthDatum = SeaLevel
	}
	bad := func(parameter, format string, args ...any) error {
		return &InputError{Parameter: parameter, Detail: fmt.Sprintf(format, args...)}
	}
	switch {
	case kmPer[o.DepthUnit] == 0:
		return bad("depth_unit", "%q is unknown; want km, m or ft", clip(o.DepthUnit))
	case alongHole.MatchString(o.DepthDatum):
		return bad("depth_datum", "%s, counted from sea_level or ground", alongHoleDetail)
	case o.DepthDatum != SeaLevel && o.DepthDatum != Ground:
		return bad("depth_datum", "%q is unknown; want sea_level or ground", clip(o.DepthDatum))
	case alongHole.MatchString(o.DepthColumn):
		return bad("depth_column", "%q looks like a depth along the hole: %s, in a column of another name", clip(o.DepthColumn), alongHoleDetail)
	case o.DepthDatum == Ground && o.ElevationColumn == "":
		return bad("elevation_column", "is missing; depths below ground need the ground's elevation, in the unit of the depths, positive up")
	case o.DepthDatum == SeaLevel && o.ElevationColumn != "":
		return bad("elevation_column", "is of use only with depth_datum=ground")
	}
	return nil
}

// cells are the values of one row that make its site, as they are written.
type cells struct{ lon, lat, depth, uncertainty, elevation string }

// site puts a row's values together. Missing depth and uncertainty are absent; a
// missing coordinate is an error, as is a missing elevation where it is needed.
func (o *Options) site(c cells, comma bool) (setting.Site, error) {
	s := setting.SiteAt(0, 0)
	var elevation float64
	for _, f := range [...]struct {
		name  string
		value string
		into  *float64
		must  bool
	}{{"lon", c.lon, &s.Lon, true}, {"lat", c.lat, &s.Lat, true}, {"depth", c.depth, &s.DepthKm, false}, {"uncertainty_km", c.uncertainty, &s.UncertaintyKm, false}} {
		x, err := parseNumber(f.value, comma)
		switch {
		case err == nil:
			*f.into = x
		case errors.Is(err, errMissing) && !f.must:
		default:
			return s, fmt.Errorf("%s: %w", f.name, err)
		}
	}
	if s.DepthKm != s.DepthKm { // no depth
		return s, nil
	}
	if o.DepthDatum == Ground {
		var err error
		if elevation, err = parseNumber(c.elevation, comma); err != nil {
			return s, fmt.Errorf("elevation: %w; a depth below ground needs it", err)
		}
	}
	s.DepthKm = (s.DepthKm - elevation) * kmPer[o.DepthUnit]
	return s, nil
}
