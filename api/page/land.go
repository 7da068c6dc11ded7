package page

import (
	"fmt"

	"github.com/tidwall/gjson"

	"nearmargin/setting/sphere"
)

// Land returns the land as polygons, each an outer ring, clockwise on the map, and
// holes; coarse (1:110 million), or fine (1:50 million). Rings are cut at ±180°. The
// data are Natural Earth's, in the public domain.
func Land(fine bool) ([][][]sphere.LonLat, error) {
	name := "static/vendor/land-110m.json"
	if fine {
		name = "static/vendor/land-50m.json"
	}
	b, err := static.ReadFile(name)
	if err != nil {
		return nil, err
	}
	return decodeTopology(b)
}

// decodeTopology reads the object "land" of a quantised TopoJSON document: arcs of
// whole-number steps, and polygons as lists of arcs, where ^i is arc i backwards.
func decodeTopology(b []byte) ([][][]sphere.LonLat, error) {
	d := gjson.ParseBytes(b)
	s, t := d.Get("transform.scale").Array(), d.Get("transform.translate").Array()
	if len(s) != 2 || len(t) != 2 {
		return nil, fmt.Errorf("page: the topology has no transform")
	}
	var arcs [][]sphere.LonLat
	for _, a := range d.Get("arcs").Array() {
		var x, y float64
		var arc []sphere.LonLat
		for _, p := range a.Array() {
			x, y = x+p.Get("0").Float(), y+p.Get("1").Float()
			arc = append(arc, sphere.LonLat{Lon: x*s[0].Float() + t[0].Float(), Lat: y*s[1].Float() + t[1].Float()})
		}
		arcs = append(arcs, arc)
	}
	var out [][][]sphere.LonLat
	for _, g := range d.Get("objects.land.geometries").Array() {
		polygons := g.Get("arcs").Array()
		if g.Get("type").String() == "Polygon" {
			polygons = []gjson.Result{g.Get("arcs")}
		}
		for _, p := range polygons {
			var rings [][]sphere.LonLat
			for _, r := range p.Array() {
				ring, err := ringOf(arcs, r)
				if err != nil {
					return nil, err
				}
				rings = append(rings, ring)
			}
			out = append(out, rings)
		}
	}
	return out, nil
}

func ringOf(arcs [][]sphere.LonLat, list gjson.Result) ([]sphere.LonLat, error) {
	var ring []sphere.LonLat
	for _, n := range list.Array() {
		i, back := int(n.Int()), false
		if i < 0 {
			i, back = ^i, true
		}
		if i >= len(arcs) {
			return nil, fmt.Errorf("page: the topology has no arc %d", i)
		}
		arc := arcs[i]
		for k := range arc {
			p := arc[k]
			if back {
				p = arc[len(arc)-1-k]
			}
			if k == 0 && len(ring) > 0 {
				continue // the end of the arc before
			}
			ring = append(ring, p)
		}
	}
	return ring, nil
}
