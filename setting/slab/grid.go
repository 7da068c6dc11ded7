package slab

import (
	"fmt"
	"math"
	"sync"

	"nearmargin/setting/sphere"
)

// Layer is one quantity of a gridded slab: values on a regular grid of longitude
// and latitude, row by row from the south-west corner. NaN stands for no value.
type Layer struct {
	West, South float64 // of the first node, degrees
	Step        float64 // between nodes, degrees
	Cols, Rows  int
	Values      []float32
}

func (l *Layer) check(name string) error {
	if l.Cols < 2 || l.Rows < 2 || len(l.Values) != l.Cols*l.Rows || !(l.Step > 0) {
		return fmt.Errorf("%s: %d values on a grid of %d by %d nodes with step %g", name, len(l.Values), l.Cols, l.Rows, l.Step)
	}
	return nil
}

// within checks that every value there is lies within a range.
func (l *Layer) within(name, unit string, least, most float64) error {
	for i, v := range l.Values {
		if x := float64(v); x < least || x > most { // false for NaN
			lon, lat := l.West+float64(i%l.Cols)*l.Step, l.South+float64(i/l.Cols)*l.Step
			return fmt.Errorf("%s: the node at %.6g, %.6g has %.6g; it must be within %g and %g%s", name, lon, lat, x, least, most, unit)
		}
	}
	return nil
}

// node returns the value at a node, NaN outside of the grid.
func (l *Layer) node(col, row int) float64 {
	if l == nil || col < 0 || row < 0 || col >= l.Cols || row >= l.Rows {
		return math.NaN()
	}
	return float64(l.Values[row*l.Cols+col])
}

// Layers are the quantities of a gridded slab. Depth is needed; the others may be
// nil, and have the same nodes as Depth.
type Layers struct{ Depth, Sigma, Dip, Strike, Thickness *Layer }

// gridSurface is a surface on a grid.
//
// Method: bilinear between the four nodes around a place, all of which must have
// a depth unless their weight is nothing. Dip and its direction come from their
// own layers where given (nearest to bilinear on unit vectors for the strike),
// else from differences of depth within the cell, which are one-sided at the rim.
type gridSurface struct {
	Layers
	rim    []rimNode
	centre sphere.Vec
	cosCap float64
	capRad float64

	isoOnce sync.Once
	iso     []Contour // of Isolines
}

type rimNode struct {
	v        sphere.Vec
	col, row int
}

// NewGrid builds a surface from layers.
func NewGrid(l Layers) (Surface, error) {
	if l.Depth == nil {
		return nil, fmt.Errorf("the depth layer is missing")
	}
	for _, x := range [...]struct {
		name        string
		layer       *Layer
		unit        string
		least, most float64
	}{
		{"depth", l.Depth, ", km positive down", 0, 800}, {"sigma", l.Sigma, " km", 0, 800}, {"thickness", l.Thickness, " km", 0, 800},
		{"dip", l.Dip, " degrees", 0, 90}, {"strike", l.Strike, " degrees", -360, 360},
	} {
		if x.layer == nil {
			continue
		}
		if err := x.layer.check(x.name); err != nil {
			return nil, err
		}
		if err := x.layer.within(x.name, x.unit, x.least, x.most); err != nil {
			return nil, err
		}
		d := l.Depth
		if x.layer.Cols != d.Cols || x.layer.Rows != d.Rows || x.layer.West != d.West || x.layer.South != d.South || x.layer.Step != d.Step {
			return nil, fmt.Errorf("%s: its nodes are not those of the depth layer", x.name)
		}
	}
	g := &gridSurface{Layers: l}
	g.findRim()
	if len(g.rim) == 0 {
		return nil, fmt.Errorf("depth: no node has a value")
	}
	return g, nil
}

func (g *gridSurface) vec(col, row int) sphere.Vec {
	return sphere.FromLonLat(sphere.LonLat{Lon: g.Depth.West + float64(col)*g.Depth.Step, Lat: g.Depth.South + float64(row)*g.Depth.Step})
}

// findRim lists the nodes with a depth that have a neighbour without one.
func (g *gridSurface) findRim() {
	for row := range g.Depth.Rows {
		for col := range g.Depth.Cols {
			if math.IsNaN(g.Depth.node(col, row)) {
				continue
			}
			for _, d := range [...][2]int{{1, 0}, {-1, 0}, {0, 1}, {0, -1}} {
				if math.IsNaN(g.Depth.node(col+d[0], row+d[1])) {
					v := g.vec(col, row)
					g.rim = append(g.rim, rimNode{v, col, row})
					g.centre = g.centre.Add(v)
					break
				}
			}
		}
	}
	g.centre = g.centre.Unit()
	for _, n := range g.rim {
		g.capRad = max(g.capRad, sphere.Angle(g.centre, n.v))
	}
	g.cosCap = math.Cos(g.capRad)
}

// cell returns the node south-west of a place and the place's fractions of a step
// from it.
func (g *gridSurface) cell(p sphere.Vec) (col, row int, fx, fy float64) {
	at := p.LonLat()
	x := math.Mod(at.Lon-g.Depth.West+720, 360) / g.Depth.Step
	if x > 360/g.Depth.Step-0.5 { // just west of the first column
		x -= 360 / g.Depth.Step
	}
	y := (at.Lat - g.Depth.South) / g.Depth.Step
	const snap = 1e-6 // a node is met in spite of rounding
	if r := math.Round(x); math.Abs(x-r) < snap {
		x = r
	}
	if r := math.Round(y); math.Abs(y-r) < snap {
		y = r
	}
	return int(math.Floor(x)), int(math.Floor(y)), x - math.Floor(x), y - math.Floor(y)
}

// bilinear returns the value of a layer within a cell, NaN where a node that
// counts has none.
func (l *Layer) bilinear(col, row int, fx, fy float64) float64 {
	if l == nil {
		return math.NaN()
	}
	sum := 0.0
	for _, n := range [...]struct {
		dc, dr int
		w      float64
	}{{0, 0, (1 - fx) * (1 - fy)}, {1, 0, fx * (1 - fy)}, {0, 1, (1 - fx) * fy}, {1, 1, fx * fy}} {
		if n.w == 0 {
			continue
		}
		sum += n.w * l.node(col+n.dc, row+n.dr)
	}
	return sum
}

func (g *gridSurface) Cap() (sphere.Vec, float64) { return g.centre, g.capRad }

func (g *gridSurface) At(p sphere.Vec) (Reading, bool) {
	if p.Dot(g.centre) < g.cosCap-1e-9 {
		return Reading{}, false
	}
	col, row, fx, fy := g.cell(p)
	z := g.Depth.bilinear(col, row, fx, fy)
	if math.IsNaN(z) {
		return Reading{}, false
	}
	return g.reading(col, row, fx, fy, z), true
}

func (g *gridSurface) reading(col, row int, fx, fy, z float64) Reading {
	r := Reading{DepthKm: z, SigmaKm: g.Sigma.bilinear(col, row, fx, fy), ThicknessKm: g.Thickness.bilinear(col, row, fx, fy)}
	east, north := g.slope(col, row, fx, fy)
	r.DipDeg = math.Atan(math.Hypot(east, north)) * 180 / math.Pi
	r.DipAzimuthDeg = math.NaN()
	if east != 0 || north != 0 {
		r.DipAzimuthDeg = sphere.Wrap360(math.Atan2(east, north) * 180 / math.Pi)
	}
	if dip := g.Dip.bilinear(col, row, fx, fy); !math.IsNaN(dip) {
		r.DipDeg = dip
	}
	if strike := g.Strike.node(col+int(fx+0.5), row+int(fy+0.5)); !math.IsNaN(strike) {
		r.DipAzimuthDeg = sphere.Wrap360(strike + 90)
	}
	return r
}

// slope returns the increase of depth per km to the east and to the north,
// one-sided where a neighbour has no depth.
func (g *gridSurface) slope(col, row int, fx, fy float64) (east, north float64) {
	col, row = col+int(fx+0.5), row+int(fy+0.5) // the nearest node
	diff := func(dc, dr int) float64 {
		a, b := g.Depth.node(col-dc, row-dr), g.Depth.node(col+dc, row+dr)
		here := g.Depth.node(col, row)
		switch {
		case !math.IsNaN(a) && !math.IsNaN(b):
			return (b - a) / 2
		case !math.IsNaN(b):
			return b - here
		case !math.IsNaN(a):
			return here - a
		}
		return 0
	}
	stepKm := sphere.RadToKm(g.Depth.Step * math.Pi / 180)
	lat := (g.Depth.South + (float64(row))*g.Depth.Step) * math.Pi / 180
	east, north = diff(1, 0)/(stepKm*math.Cos(lat)), diff(0, 1)/stepKm
	if math.IsNaN(east) || math.IsNaN(north) {
		return 0, 0
	}
	return east, north
}

func (g *gridSurface) Outside(p sphere.Vec, withinKm float64) (Outside, bool) {
	if sphere.Angle(p, g.centre) > g.capRad+sphere.KmToRad(withinKm) {
		return Outside{}, false
	}
	best, dot := -1, -2.0
	for i := range g.rim {
		if d := p.Dot(g.rim[i].v); d > dot {
			best, dot = i, d
		}
	}
	n := &g.rim[best]
	km := sphere.RadToKm(sphere.Angle(p, n.v))
	if km > withinKm {
		return Outside{}, false
	}
	r := g.reading(n.col, n.row, 0, 0, g.Depth.node(n.col, n.row))
	return Outside{outward(n.v, p, r), km, r}, true
}

// GridLayers returns the layers of a surface that was built from them.
func GridLayers(s Surface) (Layers, bool) {
	g, ok := s.(*gridSurface)
	if !ok {
		return Layers{}, false
	}
	return g.Layers, true
}
