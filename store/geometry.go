package store

import (
	"fmt"

	"github.com/paulmach/orb"
	"github.com/paulmach/orb/encoding/wkb"

	"nearmargin/setting/sphere"
)

// Geography travels as well-known binary, which keeps every bit of a coordinate.

func point(p sphere.LonLat) orb.Point { return orb.Point{p.Lon, p.Lat} }

func lineBytes(path []sphere.LonLat) ([]byte, error) {
	line := make(orb.LineString, len(path))
	for i, p := range path {
		line[i] = point(p)
	}
	return wkb.Marshal(line)
}

func polygonBytes(rings [][]sphere.LonLat) ([]byte, error) {
	poly := make(orb.Polygon, len(rings))
	for i, ring := range rings {
		poly[i] = make(orb.Ring, len(ring))
		for j, p := range ring {
			poly[i][j] = point(p)
		}
	}
	return wkb.Marshal(poly)
}

func pointBytes(p sphere.LonLat) ([]byte, error) { return wkb.Marshal(point(p)) }

func positions(pts []orb.Point) []sphere.LonLat {
	out := make([]sphere.LonLat, len(pts))
	for i, p := range pts {
		out[i] = sphere.LonLat{Lon: p[0], Lat: p[1]}
	}
	return out
}

// geometryOf reads well-known binary that must hold a G.
func geometryOf[G orb.Geometry](raw []byte) (G, error) {
	var none G
	g, err := wkb.Unmarshal(raw)
	if err != nil {
		return none, err
	}
	want, ok := g.(G)
	if !ok {
		return none, fmt.Errorf("the geometry is a %s; want a %s", g.GeoJSONType(), none.GeoJSONType())
	}
	return want, nil
}

func readLine(raw []byte) ([]sphere.LonLat, error) {
	g, err := geometryOf[orb.LineString](raw)
	return positions(g), err
}

func readPolygon(raw []byte) ([][]sphere.LonLat, error) {
	g, err := geometryOf[orb.Polygon](raw)
	var rings [][]sphere.LonLat
	for _, ring := range g {
		rings = append(rings, positions(ring))
	}
	return rings, err
}

func readPoint(raw []byte) (sphere.LonLat, error) {
	g, err := geometryOf[orb.Point](raw)
	return sphere.LonLat{Lon: g[0], Lat: g[1]}, err
}
