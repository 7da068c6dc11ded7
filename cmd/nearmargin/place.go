package main

import (
	"strconv"

	"nearmargin/setting"
)

// site returns the place that the two arguments and the flags name.
func (f *flags) site() (setting.Site, error) {
	if err := f.wantArgs(2, 2); err != nil {
		return setting.Site{}, err
	}
	var xy [2]float64
	for i, name := range [...]string{"LON", "LAT"} {
		var err error
		if xy[i], err = strconv.ParseFloat(f.args[i], 64); err != nil {
			return setting.Site{}, usageError("%s: %q is not a number in decimal degrees", name, f.args[i])
		}
	}
	site := setting.SiteAt(xy[0], xy[1])
	for _, o := range [...]struct {
		from *optional
		to   *float64
	}{{&f.depthKm, &site.DepthKm}, {&f.uncertaintyKm, &site.UncertaintyKm}, {&f.ageMa, &site.AgeMa}} {
		if o.from.given {
			*o.to = o.from.value
		}
	}
	return site, nil
}
