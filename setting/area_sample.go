package setting

import (
	"math"

	"nearmargin/setting/sphere"
)

// lattice is a sampling of an area: the places of each of its shapes after those
// of the one before. Weights add up to 1.
type lattice struct {
	at    []sphere.Sample
	parts []latticePart
}

type latticePart struct {
	from, to int
	share    float64 // of the area
}

// sample spreads about n places over the area, at least one in each shape.
func (a *Area) sample(n int) lattice {
	g := lattice{at: make([]sphere.Sample, 0, n+len(a.shapes))}
	for _, s := range a.shapes {
		p := latticePart{from: len(g.at), share: s.AreaKm2() / a.km2}
		g.at = s.Sample(max(1, int(math.Round(float64(n)*p.share))), g.at)
		p.to = len(g.at)
		sum := 0.0
		for _, x := range g.at[p.from:p.to] {
			sum += x.Weight
		}
		for i := p.from; i < p.to; i++ {
			g.at[i].Weight *= p.share / sum
		}
		g.parts = append(g.parts, p)
	}
	return g
}

// steps returns how far apart in the list neighbours on the lattice stand: on a
// golden lattice of N places by the two Fibonacci numbers around √N.
func (p *latticePart) steps() [2]int {
	f, next := 1, 1
	for next*next < p.to-p.from {
		f, next = next, f+next
	}
	return [2]int{f, next}
}

// spacingKm returns the side of the square that one place stands for.
func (g *lattice) spacingKm(km2 float64) float64 { return math.Sqrt(km2 / float64(len(g.at))) }

// standardError returns the largest standard error of the shares of classes, of
// which every place has one; see [Sampling].
//
// Method: a line through the lattice parts about
// as many such pairs as it crosses cells, and a cell with one random place adds
// 1/6 of its square to the variance, on average over where the line crosses it.
func (g *lattice) standardError(class []uint16, classes int) float64 {
	variance := make([]float64, classes)
	for _, p := range g.parts {
		one := p.share / float64(p.to-p.from)
		for _, step := range p.steps() {
			for i := p.from; i+step < p.to; i++ {
				if a, b := class[i], class[i+step]; a != b {
					variance[a] += one * one / 6
					variance[b] += one * one / 6
				}
			}
		}
	}
	most := 0.5 / float64(len(g.at))
	for _, v := range variance {
		most = max(most, math.Sqrt(v))
	}
	return min(most, 0.5)
}
