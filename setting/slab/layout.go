package slab

import (
	"fmt"
	"math"
)

// MaxNodes bounds one layer of a gridded slab.
const MaxNodes = 50_000_000

// Node is a value at a place, as files of grids list them; NaN stands for none.
type Node struct{ Lon, Lat, Value float64 }

// LayOut puts nodes, in any order, on the regular grid that they lie on. A node
// left out has no value. Longitudes must run on across ±180°, as 170…190.
func LayOut(nodes []Node) (*Layer, error) {
	if len(nodes) < 4 {
		return nil, fmt.Errorf("%d nodes; a grid has at least 4", len(nodes))
	}
	lo, hi := nodes[0], nodes[0]
	step := math.Inf(1)
	for i, n := range nodes {
		lo.Lon, lo.Lat = math.Min(lo.Lon, n.Lon), math.Min(lo.Lat, n.Lat)
		hi.Lon, hi.Lat = math.Max(hi.Lon, n.Lon), math.Max(hi.Lat, n.Lat)
		if i > 0 {
			for _, d := range [...]float64{math.Abs(n.Lon - nodes[i-1].Lon), math.Abs(n.Lat - nodes[i-1].Lat)} {
				if d > 1e-6 && d < step {
					step = d
				}
			}
		}
	}
	// the step over the whole width is better known than between two rounded nodes
	cols := math.Round((hi.Lon-lo.Lon)/step) + 1
	rows := math.Round((hi.Lat-lo.Lat)/step) + 1
	if cols > 1 {
		step = (hi.Lon - lo.Lon) / (cols - 1)
	}
	if !(cols >= 2) || !(rows >= 2) || cols*rows > MaxNodes {
		return nil, fmt.Errorf("the nodes make a grid of %g by %g; want at least 2 by 2 and at most %d nodes", cols, rows, MaxNodes)
	}
	l := &Layer{West: lo.Lon, South: lo.Lat, Step: step, Cols: int(cols), Rows: int(rows)}
	l.Values = make([]float32, l.Cols*l.Rows)
	for i := range l.Values {
		l.Values[i] = float32(math.NaN())
	}
	for _, n := range nodes {
		x, y := (n.Lon-lo.Lon)/step, (n.Lat-lo.Lat)/step
		col, row := math.Round(x), math.Round(y)
		if math.Abs(x-col) > 0.02 || math.Abs(y-row) > 0.02 {
			return nil, fmt.Errorf("node %g, %g does not lie on a grid with step %g from %g, %g", n.Lon, n.Lat, step, lo.Lon, lo.Lat)
		}
		l.Values[int(row)*l.Cols+int(col)] = float32(n.Value)
	}
	return l, nil
}
