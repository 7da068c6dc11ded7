package setting

import (
	"fmt"

	"nearmargin/setting/sphere"
)

// Land is a rough outline of land near a spreading ridge: the age that distance
// from a ridge makes says little there.
type Land struct {
	Name   string
	Ring   []sphere.LonLat // closed
	region *sphere.Region
}

// NewLand checks an outline and prepares it for look-up.
func NewLand(name string, ring []sphere.LonLat) (*Land, error) {
	if name == "" {
		return nil, fmt.Errorf("land: name is empty")
	}
	region, err := sphere.NewRegion(ring)
	if err != nil {
		return nil, fmt.Errorf("land %q: %w", name, err)
	}
	return &Land{name, ring, region}, nil
}

// landAt reports whether the place is on land near a spreading ridge.
func (m *Model) landAt(p sphere.Vec) bool {
	for _, l := range m.c.Land {
		if l.region.Contains(p) {
			return true
		}
	}
	return false
}
