package wire

import (
	"nearmargin/setting"
	"nearmargin/setting/slab"
	"nearmargin/setting/sphere"
)

// AppendSlabContours appends a GeoJSON FeatureCollection of the depth contours of
// slabs, one feature a line. Those of gridded slabs are worked out; see [slab.Isolines].
func AppendSlabContours(b []byte, slabs []*slab.Slab) []byte {
	c := openCollection(b)
	for _, s := range slabs {
		for _, k := range slab.Isolines(s.Surface) {
			c.next()
			f := open(c.b)
			f.str("type", "Feature")
			f.key("properties")
			p := open(f.b)
			p.str("slab", s.ID)
			p.str("name", s.Name)
			p.str("kind", s.Kind.String())
			p.str("subducting_plate", s.Subducting)
			p.str("overriding_plate", s.Overriding)
			p.num("depth_km", k.DepthKm, decimalsDepth)
			p.num("sigma_km", k.SigmaKm, decimalsSigma)
			f.b = p.close()
			f.key("geometry")
			f.b = appendLines(f.b, sphere.CutAtAntimeridian(k.Path))
			c.b = f.close()
		}
	}
	return c.close()
}

// AppendZones appends a GeoJSON FeatureCollection of zones of diffuse deformation.
// They are cut at the antimeridian.
func AppendZones(b []byte, zones []*setting.Zone) []byte {
	c := openCollection(b)
	for _, z := range zones {
		c.next()
		f := open(c.b)
		f.str("type", "Feature")
		f.key("properties")
		p := open(f.b)
		p.str("name", z.Name)
		p.str("kind", z.Kind.String())
		p.str("source", z.Source)
		f.b = p.close()
		f.key("geometry")
		f.b = appendPolygons(f.b, z.Parts())
		c.b = f.close()
	}
	return c.close()
}

// AppendHotspots appends a GeoJSON FeatureCollection of hotspots.
func AppendHotspots(b []byte, list []setting.Hotspot) []byte {
	c := openCollection(b)
	for i := range list {
		c.next()
		f := open(c.b)
		f.str("type", "Feature")
		f.key("properties")
		p := open(f.b)
		p.str("name", list[i].Name)
		p.str("source", list[i].Source)
		f.b = p.close()
		f.key("geometry")
		g := open(f.b)
		g.str("type", "Point")
		g.key("coordinates")
		g.b = appendPosition(g.b, list[i].At)
		f.b = g.close()
		c.b = f.close()
	}
	return c.close()
}

// collection is a FeatureCollection that is being written, one feature a line.
type collection struct {
	b     []byte
	count int
}

func openCollection(b []byte) *collection {
	return &collection{b: append(b, `{"type":"FeatureCollection","features":[`...)}
}

func (c *collection) next() {
	if c.count > 0 {
		c.b = append(c.b, ',')
	}
	c.count++
	c.b = append(c.b, '\n')
}

func (c *collection) close() []byte { return append(c.b, "\n]}\n"...) }

// appendLines appends a LineString of one part, or a MultiLineString.
func appendLines(b []byte, parts [][]sphere.LonLat) []byte {
	g := open(b)
	if len(parts) == 1 {
		g.str("type", "LineString")
		g.key("coordinates")
		g.b = appendLine(g.b, parts[0])
	} else {
		g.str("type", "MultiLineString")
		g.key("coordinates")
		g.b = appendEach(g.b, parts)
	}
	return g.close()
}

// appendPolygons appends a Polygon of one part, or a MultiPolygon.
func appendPolygons(b []byte, parts [][][]sphere.LonLat) []byte {
	g := open(b)
	if len(parts) == 1 {
		g.str("type", "Polygon")
		g.key("coordinates")
		g.b = appendEach(g.b, parts[0])
		return g.close()
	}
	g.str("type", "MultiPolygon")
	g.key("coordinates")
	g.b = append(g.b, '[')
	for i, rings := range parts {
		if i > 0 {
			g.b = append(g.b, ',')
		}
		g.b = appendEach(g.b, rings)
	}
	g.b = append(g.b, ']')
	return g.close()
}

func appendEach(b []byte, lines [][]sphere.LonLat) []byte {
	b = append(b, '[')
	for i, l := range lines {
		if i > 0 {
			b = append(b, ',')
		}
		b = appendLine(b, l)
	}
	return append(b, ']')
}
