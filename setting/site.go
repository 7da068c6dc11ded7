package setting

import (
	"fmt"
	"math"
)

// Site is a place that is asked about. NaN stands for "not given".
type Site struct {
	Lon, Lat      float64 // degrees; longitude -180…360
	DepthKm       float64 // positive down from sea level, -10…800
	UncertaintyKm float64 // 1σ of the horizontal position, 0…1000
	AgeMa         float64 // age of the rock in millions of years, 0…4600
}

// SiteAt returns a site at a position, nothing else given.
func SiteAt(lon, lat float64) Site {
	return Site{Lon: lon, Lat: lat, DepthKm: math.NaN(), UncertaintyKm: math.NaN(), AgeMa: math.NaN()}
}

// FieldError says which field of an input is wrong, and what would be right.
type FieldError struct {
	Field  string // such as "lat"
	Detail string
}

func (e *FieldError) Error() string { return e.Field + ": " + e.Detail }

// Validate returns a *FieldError for the first field that is out of range.
func (s Site) Validate() error {
	bad := func(field, format string, args ...any) error {
		return &FieldError{field, fmt.Sprintf(format, args...)}
	}
	switch {
	case math.IsNaN(s.Lat) || math.IsInf(s.Lat, 0):
		return bad("lat", "%g is not a latitude; give degrees from -90 to 90", s.Lat)
	case math.IsNaN(s.Lon) || math.IsInf(s.Lon, 0):
		return bad("lon", "%g is not a longitude; give degrees from -180 to 360", s.Lon)
	case s.Lat < -90 || s.Lat > 90:
		if math.Abs(s.Lon) <= 90 && s.Lat >= -180 && s.Lat <= 360 {
			return bad("lat", "%g is out of range -90 to 90; are lon and lat swapped?", s.Lat)
		}
		return bad("lat", "%g is out of range -90 to 90", s.Lat)
	case s.Lon < -180 || s.Lon > 360:
		return bad("lon", "%g is out of range -180 to 360", s.Lon)
	case math.IsInf(s.DepthKm, 0) || s.DepthKm < -10 || s.DepthKm > 800:
		return bad("depth_km", "%g is out of range -10 to 800 (km, positive down from sea level)", s.DepthKm)
	case math.IsInf(s.UncertaintyKm, 0) || s.UncertaintyKm < 0 || s.UncertaintyKm > 1000:
		return bad("uncertainty_km", "%g is out of range 0 to 1000 (km, one standard deviation)", s.UncertaintyKm)
	case math.IsInf(s.AgeMa, 0) || s.AgeMa < 0 || s.AgeMa > 4600:
		return bad("age_ma", "%g is out of range 0 to 4600 (millions of years)", s.AgeMa)
	}
	return nil
}

// sigmaKm is the site's own uncertainty, 0 where none is given.
func (s Site) sigmaKm() float64 {
	if s.UncertaintyKm > 0 { // false for NaN
		return s.UncertaintyKm
	}
	return 0
}
