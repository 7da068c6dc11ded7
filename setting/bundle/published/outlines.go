package published

import (
	"fmt"
	"maps"
	"slices"
	"strings"

	"nearmargin/setting"
	"nearmargin/setting/boundary"
	"nearmargin/setting/sphere"
)

const (
	outlineInKm  = 5  // how far inside an outline the network is asked
	outlineLeast = 15 // the shortest edge that is a test
)

// CheckOutlines holds the outlines of plates against a network: just inside the
// middle of every edge (outlines run counter-clockwise, so on its left) the
// network must give the plate. Plates that bound nothing in the network, plates
// without an outline, and plates of which edges disagree become warnings.
func CheckOutlines(outlines []Outline, n *boundary.Network, codes Codes) []setting.Warning {
	var out []setting.Warning
	warn := func(at *sphere.LonLat, format string, args ...any) {
		w := setting.Warning{Code: "plate_outline", Detail: fmt.Sprintf(format, args...)}
		if at != nil {
			w.Placed, w.At = true, *at
		}
		out = append(out, w)
	}
	lacking := map[string]bool{}
	for _, code := range n.Plates() {
		lacking[code] = true
	}
	for _, o := range outlines {
		code := codes.of(strings.TrimSpace(o.Title))
		if !slices.Contains(n.Plates(), code) {
			warn(nil, "plate %s has an outline (line %d) and bounds nothing in the table of steps", code, o.Line)
			continue
		}
		delete(lacking, code)
		tried, wrong, first := 0, 0, sphere.LonLat{}
		for i := 1; i < len(o.Path); i++ {
			inside, ok := leftOf(o.Path[i-1], o.Path[i])
			if !ok {
				continue
			}
			tried++
			if got, _ := n.Locate(boundary.PlaceAt(inside)); got != code {
				if wrong++; wrong == 1 {
					first = inside
				}
			}
		}
		if wrong > 0 {
			warn(&first, "plate %s: at %d of %d places %d km inside of its outline the network gives another plate; this is the first", code, wrong, tried, outlineInKm)
		}
	}
	for _, code := range slices.Sorted(maps.Keys(lacking)) {
		warn(nil, "plate %s bounds something in the table of steps and has no outline", code)
	}
	return out
}

// leftOf returns the place to the left of an edge's middle; false for an edge so
// short that the place says nothing.
func leftOf(a, b sphere.LonLat) (sphere.LonLat, bool) {
	arc, ok := sphere.NewArc(sphere.FromLonLat(a), sphere.FromLonLat(b))
	if !ok || sphere.RadToKm(arc.Length()) < outlineLeast {
		return sphere.LonLat{}, false
	}
	in := sphere.KmToRad(outlineInKm)
	p := arc.Midpoint().Add(arc.N.Unit().Scale(in)).Unit().LonLat()
	p.Lon, p.Lat = round6(p.Lon), round6(p.Lat)
	return p, true
}
