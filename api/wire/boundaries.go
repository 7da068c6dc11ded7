package wire

import (
	"nearmargin/setting/boundary"
	"nearmargin/setting/sphere"
)

// AppendBoundaries appends a GeoJSON FeatureCollection of boundaries, one
// feature a line.
func AppendBoundaries(b []byte, list []*boundary.Boundary) []byte {
	b = append(b, `{"type":"FeatureCollection","features":[`...)
	for i, bd := range list {
		if i > 0 {
			b = append(b, ',')
		}
		b = append(b, '\n')
		b = appendFeature(b, bd)
	}
	return append(b, "\n]}\n"...)
}

func appendFeature(b []byte, bd *boundary.Boundary) []byte {
	f := open(b)
	f.str("type", "Feature")
	f.str("id", bd.ID())
	f.key("properties")
	p := open(f.b)
	p.str("id", bd.ID())
	p.str("name", bd.Name())
	p.str("type", bd.Type().String())
	p.str("left_plate", bd.Left())
	p.str("right_plate", bd.Right())
	p.strOrNull("subducting_plate", bd.Subducting())
	p.num("sigma_km", bd.SigmaKm(), decimalsSigma)
	p.num("length_km", bd.LengthKm(), decimalsSigma)
	p.str("source", bd.Source())
	p.str("source_status", string(bd.SourceStatus()))
	f.b = p.close()
	f.key("geometry")
	f.b = appendLines(f.b, bd.Parts())
	return f.close()
}

func appendLine(b []byte, line []sphere.LonLat) []byte {
	b = append(b, '[')
	for i, p := range line {
		if i > 0 {
			b = append(b, ',')
		}
		b = append(b, '[')
		b = appendRounded(b, p.Lon, 6)
		b = append(b, ',')
		b = appendRounded(b, p.Lat, 6)
		b = append(b, ']')
	}
	return append(b, ']')
}
