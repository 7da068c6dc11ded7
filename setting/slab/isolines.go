package slab

import (
	"math"

	"nearmargin/setting/sphere"
)

// isoDepths are the depths in km at which lines are drawn on a gridded slab.
var isoDepths = [...]float64{20, 40, 60, 80, 100, 150, 200, 300, 400, 500, 600, 700}

// Isolines returns lines of equal depth on a surface: the contours that it was built
// from, or lines drawn on its grid at 20, 40, 60, 80, 100, 150 and 200 km and every
// 100 km below. They are worked out once for a surface.
//
// Method: marching squares on the cells whose four nodes have a depth, so that a line
// lies on the surface that [Surface.At] reads, exactly where it meets a cell's edge; in
// a saddle the depth of the bilinear surface's own saddle point decides. Vertices that
// lie within 0.5 km of the line without them are left out. SigmaKm is the mean of σ
// along the line, NaN where the grid has none.
func Isolines(s Surface) []Contour {
	g, ok := s.(*gridSurface)
	if !ok {
		return Contours(s)
	}
	g.isoOnce.Do(func() { g.iso = g.isolines() })
	return g.iso
}

// edgeID names an edge of the grid: twice its western or southern node, and 1 more for
// an edge that runs north.
type edgeID int

// crossing is a piece of line through one cell, deeper to the right.
type crossing struct{ from, to edgeID }

func (g *gridSurface) isolines() []Contour {
	var found [len(isoDepths)][]crossing
	d := g.Depth
	for row := range d.Rows - 1 {
		for col := range d.Cols - 1 {
			v := [4]float64{d.node(col, row), d.node(col+1, row), d.node(col+1, row+1), d.node(col, row+1)}
			lo, hi := math.Min(math.Min(v[0], v[1]), math.Min(v[2], v[3])), math.Max(math.Max(v[0], v[1]), math.Max(v[2], v[3]))
			for i, z := range isoDepths {
				if lo < z && z <= hi { // false where a node is NaN
					found[i] = g.cross(found[i], col, row, v, z)
				}
			}
		}
	}
	var out []Contour
	for i, list := range found {
		for _, line := range chained(list) {
			if c := g.contour(line, isoDepths[i]); len(c.Path) > 1 {
				out = append(out, c)
			}
		}
	}
	return out
}

// cross appends the pieces of the line at depth z through a cell with the depths v at
// its corners, from the south-west counterclockwise.
func (g *gridSurface) cross(to []crossing, col, row int, v [4]float64, z float64) []crossing {
	node := edgeID(row*g.Depth.Cols + col)
	edges := [4]edgeID{2 * node, 2*(node+1) + 1, 2 * (node + edgeID(g.Depth.Cols)), 2*node + 1} // edge i leads from corner i to the next
	var into, outOf []int                                                                       // edges at which deep corners begin and end, counterclockwise
	for i := range v {
		switch a, b := v[i] >= z, v[(i+1)%4] >= z; {
		case b && !a:
			into = append(into, i)
		case a && !b:
			outOf = append(outOf, i)
		}
	}
	if len(into) == 1 {
		return append(to, crossing{edges[into[0]], edges[outOf[0]]})
	}
	saddle := (v[0]*v[2] - v[1]*v[3]) / (v[0] + v[2] - v[1] - v[3])
	for _, i := range into {
		end := (i + 1) % 4 // the deep corner stands alone
		if saddle >= z {
			end = (i + 3) % 4 // the shallow corner stands alone
		}
		to = append(to, crossing{edges[i], edges[end]})
	}
	return to
}

// chained joins pieces to lines of edges: open ones first, then closed ones, whose last
// edge is the first again.
func chained(list []crossing) (lines [][]edgeID) {
	next, entered := make(map[edgeID]edgeID, len(list)), make(map[edgeID]bool, len(list))
	for _, c := range list {
		next[c.from] = c.to
		entered[c.to] = true
	}
	for _, closed := range [...]bool{false, true} {
		for _, c := range list {
			if _, left := next[c.from]; !left || entered[c.from] != closed {
				continue
			}
			line := []edgeID{c.from}
			for at, ok := next[c.from]; ok; at, ok = next[line[len(line)-1]] {
				delete(next, line[len(line)-1])
				line = append(line, at)
			}
			lines = append(lines, line)
		}
	}
	return lines
}

// contour places a line of edges at depth z.
func (g *gridSurface) contour(line []edgeID, z float64) Contour {
	c := Contour{DepthKm: z, SigmaKm: math.NaN()}
	sum, n := 0.0, 0
	for _, e := range line {
		col, row := int(e/2)%g.Depth.Cols, int(e/2)/g.Depth.Cols
		dc, dr := 1-int(e%2), int(e%2)
		a, b := g.Depth.node(col, row), g.Depth.node(col+dc, row+dr)
		t := (z - a) / (b - a)
		p := sphere.LonLat{
			Lon: sphere.WrapLon(g.Depth.West + (float64(col)+t*float64(dc))*g.Depth.Step),
			Lat: math.Max(-90, math.Min(90, g.Depth.South+(float64(row)+t*float64(dr))*g.Depth.Step)),
		}
		if s := g.Sigma.node(col, row)*(1-t) + g.Sigma.node(col+dc, row+dr)*t; !math.IsNaN(s) {
			sum, n = sum+s, n+1
		}
		if len(c.Path) == 0 || c.Path[len(c.Path)-1] != p { // a line through a node meets several edges there
			c.Path = append(c.Path, p)
		}
	}
	if n > 0 {
		c.SigmaKm = sum / float64(n)
	}
	c.Path = thinned(c.Path)
	return c
}

const thinKm = 0.5 // within which a vertex may be left out

// thinned leaves out the vertices of a path that lie within thinKm of it without them.
//
// Method: Douglas and Peucker (1973), on the sphere; libraries do it on the plane of
// longitude and latitude, where a tolerance is no distance.
func thinned(path []sphere.LonLat) []sphere.LonLat {
	if len(path) < 3 {
		return path
	}
	vecs, keep := make([]sphere.Vec, len(path)), make([]bool, len(path))
	for i, p := range path {
		vecs[i] = sphere.FromLonLat(p)
	}
	keep[0], keep[len(path)-1] = true, true
	todo := [][2]int{{0, len(path) - 1}}
	for len(todo) > 0 {
		from, to := todo[len(todo)-1][0], todo[len(todo)-1][1]
		todo = todo[:len(todo)-1]
		arc, ok := sphere.NewArc(vecs[from], vecs[to])
		far, most := -1, sphere.KmToRad(thinKm)
		for i := from + 1; i < to; i++ {
			q := vecs[from] // a closed line starts and ends there
			if ok {
				q, _ = arc.Nearest(vecs[i])
			}
			if rad := sphere.Angle(vecs[i], q); rad > most {
				far, most = i, rad
			}
		}
		if far >= 0 {
			keep[far] = true
			todo = append(todo, [2]int{from, far}, [2]int{far, to})
		}
	}
	out := path[:0:0]
	for i, p := range path {
		if keep[i] {
			out = append(out, p)
		}
	}
	return out
}
