package annotate

import (
	"nearmargin/setting"
)

// Check fills in what is left out of the options and refuses what cannot be. The
// error is an *InputError.
func (o *Options) Check() error { return o.fill() }

// SiteAt puts together the site of a position in degrees that comes as numbers, and of
// a depth, an uncertainty in km and an elevation as they are written in a table, ""
// where they are missing; the options must have been checked.
func (o *Options) SiteAt(lon, lat float64, depth, uncertaintyKm, elevation string) (setting.Site, error) {
	s, err := o.site(cells{lon: "0", lat: "0", depth: depth, uncertainty: uncertaintyKm, elevation: elevation}, false)
	s.Lon, s.Lat = lon, lat
	return s, err
}
