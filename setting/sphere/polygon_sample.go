package sphere

import "math"

// Sample appends n places inside the polygon.
//
// Method: place k has a share of (k+½)/n of the area below it, and on its height
// the golden ratio's k-th fraction of the area to the left of it. That maps the
// golden lattice on the unit square onto the polygon and keeps areas, whatever
// the polygon's form, so that none is thrown away; and since no two coordinates
// of that lattice's steps are both small, it stays even where the map stretches
// it. The area below a height is summed over n narrow strips; along a line of
// constant height it has a closed form, since a gnomonic plane has
// (1+x²+y²)^(-3/2) steradians per unit.
//
// Special cases: where a height meets more than 200 edges on average, as in a
// comb of many thousand teeth, there are fewer places, so that the cost is bounded.
//
// Accuracy: every place is inside; shares of area are good to 1/(2n).
func (p *Polygon) Sample(n int, out []Sample) []Sample {
	low, high, sum := math.Inf(1), math.Inf(-1), 0.0
	for i := range p.edges {
		e := &p.edges[i]
		low, high, sum = min(low, e.minY()), max(high, e.maxY()), sum+e.maxY()-e.minY()
	}
	const most = 200
	if met := sum / (high - low); met > most {
		n = max(1, n/8, int(float64(n)*most/met))
	}
	step := (high - low) / float64(n)
	below := make([]float64, n+1)
	var xs []float64
	for k := range n {
		y := low + (float64(k)+0.5)*step
		xs = p.crossings(y, -1, xs[:0])
		below[k+1] = below[k] + lineArea(xs, y)
	}
	strip := 0
	for k := range n {
		share := (float64(k) + 0.5) / float64(n) * below[n]
		for below[strip+1] <= share && strip < n-1 {
			strip++
		}
		within := (share - below[strip]) / (below[strip+1] - below[strip])
		for _, w := range [...]float64{within, 0.5} { // the strip's middle is never empty
			y := low + (float64(strip)+w)*step
			xs = p.crossings(y, -1, xs[:0])
			if area := lineArea(xs, y); area > 0 {
				v := p.round(planar{xOfArea(xs, y, golden(k)*area), y})
				out = append(out, Sample{v, AreaDensity(v)})
				break
			}
		}
	}
	return out
}

// lineArea returns the steradians, per unit of height, of the stretches between
// pairs of crossings at a height.
func lineArea(xs []float64, y float64) float64 {
	sum := 0.0
	for i := 1; i < len(xs); i += 2 {
		sum += areaLeft(xs[i], y) - areaLeft(xs[i-1], y)
	}
	return sum
}

// areaLeft is the integral of (1+x²+y²)^(-3/2) from 0 to x.
func areaLeft(x, y float64) float64 {
	c := 1 + y*y
	return x / (c * math.Sqrt(c+x*x))
}

// xOfArea returns the x with the given area of the stretches to its left.
func xOfArea(xs []float64, y, area float64) float64 {
	c := 1 + y*y
	for i := 1; i < len(xs); i += 2 {
		from := areaLeft(xs[i-1], y)
		if part := areaLeft(xs[i], y) - from; area > part && i+2 < len(xs) {
			area -= part
			continue
		}
		g := (from + area) * c
		return min(max(g*math.Sqrt(c/(1-g*g)), xs[i-1]), xs[i])
	}
	return 0
}
