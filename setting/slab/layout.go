package slab

import (
	"fmt"
	"math"
	"slices"
)

// MaxNodes bounds one layer of a gridded slab.
const MaxNodes = 50_000_000

// Node is a value at a place, as files of grids list them; NaN stands for none.
type Node struct{ Lon, Lat, Value float64 }

// LayOut puts nodes, in any order, on the regular grid that they lie on. A node
// left out has no value. Longitudes may run on across ±180°, as 170…190, or turn
// to negative ones there; those of nodes are then changed.
func LayOut(nodes []Node) (*Layer, error) {
	if len(nodes) < 4 {
		return nil, fmt.Errorf("%d nodes; a grid has at least 4", len(nodes))
	}
	lo, hi := extent(nodes)
	if hi.Lon-lo.Lon > 180 { // across ±180°
		for i := range nodes {
			if nodes[i].Lon < 0 {
				nodes[i].Lon += 360
			}
		}
		lo, hi = extent(nodes)
	}
	lons, lats := make([]float64, len(nodes)), make([]float64, len(nodes))
	for i, n := range nodes {
		lons[i], lats[i] = n.Lon, n.Lat
	}
	step, stepLat := leastGap(lons), leastGap(lats)
	if !(math.Abs(step-stepLat) <= 0.02*min(step, stepLat)) { // true for +Inf, a single row or column
		return nil, fmt.Errorf("the longitudes are %.6g degrees apart and the latitudes %.6g; want a grid with one step, at least 2 by 2", step, stepLat)
	}
	// the step over the whole width is better known than between two rounded nodes
	cols := math.Round((hi.Lon-lo.Lon)/step) + 1
	if mean := (hi.Lon - lo.Lon) / (cols - 1); math.Abs(mean-step) <= 0.02*step { // false where cols is 1
		step = mean
	}
	rows := math.Round((hi.Lat-lo.Lat)/step) + 1
	if !(cols >= 2) || !(rows >= 2) || cols*rows > MaxNodes {
		return nil, fmt.Errorf("the nodes make a grid of %g by %g; want at least 2 by 2 and at most %d nodes", cols, rows, MaxNodes)
	}
	if cells := cols * rows; cells > 10_000+200*float64(len(nodes)) {
		return nil, fmt.Errorf("%d nodes on a grid of %g by %g with step %.6g; is one of them misplaced?", len(nodes), cols, rows, step)
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
		at, value := &l.Values[int(row)*l.Cols+int(col)], float32(n.Value)
		if have := *at; have == have && have != value { // not NaN
			return nil, fmt.Errorf("node %g, %g stands twice, with %g and %g", n.Lon, n.Lat, have, value)
		}
		*at = value
	}
	return l, nil
}

// extent returns the least and the greatest longitude and latitude of nodes.
func extent(nodes []Node) (lo, hi Node) {
	lo, hi = nodes[0], nodes[0]
	for _, n := range nodes[1:] {
		lo.Lon, lo.Lat = math.Min(lo.Lon, n.Lon), math.Min(lo.Lat, n.Lat)
		hi.Lon, hi.Lat = math.Max(hi.Lon, n.Lon), math.Max(hi.Lat, n.Lat)
	}
	return lo, hi
}

// leastGap returns the least difference between two of the numbers that is more
// than rounding, +Inf where there is none.
func leastGap(x []float64) float64 {
	const rounding = 1e-4 // degrees, 11 m
	slices.Sort(x)
	least := math.Inf(1)
	for i := 1; i < len(x); i++ {
		if d := x[i] - x[i-1]; d > rounding && d < least {
			least = d
		}
	}
	return least
}
