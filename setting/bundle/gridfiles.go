package bundle

import (
	"bufio"
	"bytes"
	"compress/gzip"
	"fmt"
	"io"
	"math"
	"slices"
	"strconv"
	"strings"

	"nearmargin/setting/slab"
)

// maxGridNodes bounds one layer of a gridded slab.
const maxGridNodes = 50_000_000

// grid reads a slab's layers; Depth is nil where it has no grid.
func (r *reader) grid(id string) (slab.Layers, error) {
	var l slab.Layers
	for _, f := range [...]struct {
		name string
		into **slab.Layer
	}{{"depth", &l.Depth}, {"sigma", &l.Sigma}, {"dip", &l.Dip}, {"strike", &l.Strike}, {"thickness", &l.Thickness}} {
		name := "slabs/" + id + "/" + f.name + ".xyz"
		raw, err := r.file(name, true)
		if err == nil && raw == nil {
			name += ".gz"
			raw, err = r.file(name, true)
		}
		if err != nil {
			return l, err
		}
		if raw == nil {
			continue
		}
		r.grids[name] = raw
		text := io.Reader(bytes.NewReader(raw))
		if strings.HasSuffix(name, ".gz") {
			z, err := gzip.NewReader(text)
			if err != nil {
				return l, &FileError{File: name, Err: err}
			}
			text = io.LimitReader(z, maxFileBytes*4)
		}
		if *f.into, err = readLayer(name, text); err != nil {
			return l, err
		}
	}
	return l, nil
}

// node is one line of an .xyz file.
type node struct{ lon, lat, value float64 }

// readLayer reads lon,lat,value lines in any order, on a regular grid; a value of
// NaN, or a node left out, has none.
func readLayer(name string, text io.Reader) (*slab.Layer, error) {
	var nodes []node
	sc := bufio.NewScanner(text)
	for line := 1; sc.Scan(); line++ {
		s := strings.TrimSpace(sc.Text())
		if s == "" {
			continue
		}
		n, err := parseNode(s)
		if err != nil {
			return nil, fault(name, line, "%v", err)
		}
		if nodes = append(nodes, n); len(nodes) > maxGridNodes {
			return nil, fault(name, line, "more than %d nodes", maxGridNodes)
		}
	}
	if err := sc.Err(); err != nil {
		return nil, &FileError{File: name, Err: err}
	}
	return layOut(name, nodes)
}

func parseNode(s string) (node, error) {
	f := strings.FieldsFunc(s, func(r rune) bool { return r == ',' || r == ' ' || r == '\t' })
	if len(f) != 3 {
		return node{}, fmt.Errorf("%q has %d numbers; want lon,lat,value", s, len(f))
	}
	var x [3]float64
	for i := range f {
		var err error
		if x[i], err = strconv.ParseFloat(f[i], 64); err != nil {
			return node{}, fmt.Errorf("%q is not a number", f[i])
		}
	}
	if !(x[0] >= -180 && x[0] <= 360) || !(x[1] >= -90 && x[1] <= 90) {
		return node{}, fmt.Errorf("%g, %g is not a longitude and a latitude", x[0], x[1])
	}
	return node{x[0], x[1], x[2]}, nil
}

// layOut puts nodes on a grid.
func layOut(name string, nodes []node) (*slab.Layer, error) {
	if len(nodes) < 4 {
		return nil, fault(name, 0, "%d nodes; a grid has at least 4", len(nodes))
	}
	lo, hi := extent(nodes)
	if hi.lon-lo.lon > 180 { // across ±180°
		for i := range nodes {
			if nodes[i].lon < 0 {
				nodes[i].lon += 360
			}
		}
		lo, hi = extent(nodes)
	}
	lons, lats := make([]float64, len(nodes)), make([]float64, len(nodes))
	for i, n := range nodes {
		lons[i], lats[i] = n.lon, n.lat
	}
	step, stepLat := leastGap(lons), leastGap(lats)
	if !(math.Abs(step-stepLat) <= 0.02*min(step, stepLat)) { // true for +Inf, a single row or column
		return nil, fault(name, 0, "the longitudes are %.6g degrees apart and the latitudes %.6g; want a grid with one step, at least 2 by 2", step, stepLat)
	}
	// the step over the whole width is better known than between two rounded nodes
	cols := math.Round((hi.lon-lo.lon)/step) + 1
	rows := math.Round((hi.lat-lo.lat)/step) + 1
	if mean := (hi.lon - lo.lon) / (cols - 1); math.Abs(mean-step) <= 0.02*step { // false where cols is 1
		step = mean
	}
	if !(cols >= 2) || !(rows >= 2) || cols*rows > maxGridNodes {
		return nil, fault(name, 0, "the nodes make a grid of %g by %g; want at least 2 by 2 and at most %d nodes", cols, rows, maxGridNodes)
	}
	if cells := cols * rows; cells > 10_000+200*float64(len(nodes)) {
		return nil, fault(name, 0, "%d nodes on a grid of %g by %g with step %.6g; is one of them misplaced?", len(nodes), cols, rows, step)
	}
	l := &slab.Layer{West: lo.lon, South: lo.lat, Step: step, Cols: int(cols), Rows: int(rows)}
	l.Values = make([]float32, l.Cols*l.Rows)
	for i := range l.Values {
		l.Values[i] = float32(math.NaN())
	}
	for _, n := range nodes {
		x, y := (n.lon-lo.lon)/step, (n.lat-lo.lat)/step
		col, row := math.Round(x), math.Round(y)
		if math.Abs(x-col) > 0.02 || math.Abs(y-row) > 0.02 {
			return nil, fault(name, 0, "node %g, %g does not lie on a grid with step %g from %g, %g", n.lon, n.lat, step, lo.lon, lo.lat)
		}
		at, value := &l.Values[int(row)*l.Cols+int(col)], float32(n.value)
		if have := *at; have == have && have != value { // not NaN
			return nil, fault(name, 0, "node %g, %g stands twice, with %g and %g", n.lon, n.lat, have, value)
		}
		*at = value
	}
	return l, nil
}

// extent returns the least and the greatest longitude and latitude of nodes.
func extent(nodes []node) (lo, hi node) {
	lo, hi = nodes[0], nodes[0]
	for _, n := range nodes[1:] {
		lo.lon, lo.lat = math.Min(lo.lon, n.lon), math.Min(lo.lat, n.lat)
		hi.lon, hi.lat = math.Max(hi.lon, n.lon), math.Max(hi.lat, n.lat)
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
