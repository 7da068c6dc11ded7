package published

import (
	"nearmargin/setting"
	"nearmargin/setting/sphere"
)

func vec(lon, lat float64) sphere.Vec { return sphere.FromLonLat(sphere.LonLat{Lon: lon, Lat: lat}) }

// knownPlates lists the plates whose names the package knows.
func knownPlates() []setting.Plate {
	b := builder{names: plateNames}
	return b.namedPlates()
}
