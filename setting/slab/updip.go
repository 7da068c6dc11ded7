package slab

import (
	"math"

	"nearmargin/setting/sphere"
)

// RimPoint is a place on a surface's rim.
type RimPoint struct {
	At            sphere.Vec
	DipAzimuthDeg float64 // NaN where the surface is flat
}

// upDipEveryKm is how far the places along a contour are apart, at most.
const upDipEveryKm = 10

// upDipRangeKm is how much deeper than its shallowest place the up-dip rim of a
// grid may lie.
const upDipRangeKm = 30

// UpDipRim returns places along the end of a surface that lies towards the trench:
// every 10 km of the shallowest contour, or the rim nodes of a grid that lie at most
// 30 km deeper than the shallowest of them.
func UpDipRim(s Surface) []RimPoint {
	var out []RimPoint
	switch s := s.(type) {
	case *contourSurface:
		top := s.contours[0].path
		for i := range top.Len() {
			leg := top.Leg(i)
			n := math.Ceil(sphere.RadToKm(leg.Length()) / upDipEveryKm)
			for k := 0.5; k < n; k++ {
				at := leg.At(k / n)
				out = append(out, RimPoint{at, sphere.Wrap360(at.Azimuth(leg.Tangent(at)) + 90)})
			}
		}
	case *gridSurface:
		top := math.Inf(1)
		for i := range s.rim {
			top = math.Min(top, s.Depth.node(s.rim[i].col, s.rim[i].row))
		}
		for i := range s.rim {
			n := &s.rim[i]
			if z := s.Depth.node(n.col, n.row); z <= top+upDipRangeKm {
				out = append(out, RimPoint{n.v, s.reading(n.col, n.row, 0, 0, z).DipAzimuthDeg})
			}
		}
	}
	return out
}

// Spots returns places all over a surface's footprint: the vertices of its
// contours, or every tenth node of its grid each way.
func Spots(s Surface) []sphere.Vec {
	var out []sphere.Vec
	switch s := s.(type) {
	case *contourSurface:
		for i := range s.contours {
			for _, p := range s.contours[i].given.Path {
				out = append(out, sphere.FromLonLat(p))
			}
		}
	case *gridSurface:
		for row := 0; row < s.Depth.Rows; row += 10 {
			for col := 0; col < s.Depth.Cols; col += 10 {
				if !math.IsNaN(s.Depth.node(col, row)) {
					out = append(out, s.vec(col, row))
				}
			}
		}
	}
	return out
}

// Crop returns the layers cut down to the nodes around those that have a depth,
// with the longitude of the west side within [-180, 180).
func (l Layers) Crop() Layers {
	d := l.Depth
	if d == nil {
		return l
	}
	c0, c1, r0, r1 := d.Cols, -1, d.Rows, -1
	for row := range d.Rows {
		for col := range d.Cols {
			if !math.IsNaN(d.node(col, row)) {
				c0, c1, r0, r1 = min(c0, col), max(c1, col), min(r0, row), max(r1, row)
			}
		}
	}
	if c1 < 0 {
		return l
	}
	cut := func(x *Layer) *Layer {
		if x == nil {
			return nil
		}
		west := x.West + float64(c0)*x.Step
		if west >= 180 {
			west -= 360
		}
		y := &Layer{West: west, South: x.South + float64(r0)*x.Step, Step: x.Step, Cols: c1 - c0 + 1, Rows: r1 - r0 + 1}
		for row := r0; row <= r1; row++ {
			y.Values = append(y.Values, x.Values[row*x.Cols+c0:row*x.Cols+c1+1]...)
		}
		return y
	}
	return Layers{cut(l.Depth), cut(l.Sigma), cut(l.Dip), cut(l.Strike), cut(l.Thickness)}
}
