package setting

import (
	"fmt"

	"nearmargin/setting/sphere"
)

// ZoneKind says how a diffuse zone deforms.
type ZoneKind uint8

// The kinds of zone; the zero value is none.
const (
	NoKind        ZoneKind = 0
	CollisionKind ZoneKind = 1
	ExtensionKind ZoneKind = 2
	ShearKind     ZoneKind = 3
	MixedKind     ZoneKind = 4
)

// AllZoneKinds lists the kinds.
var AllZoneKinds = [...]ZoneKind{CollisionKind, ExtensionKind, ShearKind, MixedKind}

var zoneKindNames = [...]string{"none", "collision", "extension", "shear", "mixed"}

// String returns the kind as model files and answers spell it.
func (k ZoneKind) String() string {
	if int(k) < len(zoneKindNames) {
		return zoneKindNames[k]
	}
	return fmt.Sprintf("ZoneKind(%d)", uint8(k))
}

// ParseZoneKind returns the kind of that name.
func ParseZoneKind(s string) (ZoneKind, error) {
	for _, k := range AllZoneKinds {
		if zoneKindNames[k] == s {
			return k, nil
		}
	}
	return NoKind, fmt.Errorf("zone kind %q is unknown; the kinds are %v", s, AllZoneKinds)
}

// Zone is a belt of diffuse deformation, where the motion between two plates is
// taken up over a width rather than on one line.
type Zone struct {
	Name   string
	Kind   ZoneKind
	Source string
	Rings  [][]sphere.LonLat // the outer ring first, then holes; closed
	region *sphere.Region
}

// NewZone checks a zone and prepares it for look-up.
func NewZone(z Zone) (*Zone, error) {
	switch {
	case z.Name == "":
		return nil, fmt.Errorf("zone: name is empty")
	case z.Kind == NoKind:
		return nil, fmt.Errorf("zone %q: kind is missing; the kinds are %v", z.Name, AllZoneKinds)
	case z.Source == "":
		return nil, fmt.Errorf("zone %q: source is empty", z.Name)
	}
	region, err := sphere.NewRegion(z.Rings...)
	if err != nil {
		return nil, fmt.Errorf("zone %q: %w", z.Name, err)
	}
	z.region = region
	return &z, nil
}

// Parts returns the outline as polygons cut at ±180°; see
// [sphere.CutRingsAtAntimeridian].
func (z *Zone) Parts() [][][]sphere.LonLat { return sphere.CutRingsAtAntimeridian(z.Rings) }

// Hotspot is a place of volcanism within a plate that no boundary explains.
type Hotspot struct {
	Name   string
	At     sphere.LonLat
	Source string
}

// The reach within which an answer names a triple junction and a hotspot.
const (
	JunctionReachKm = 500
	HotspotReachKm  = 200
)
