package figure

import "math"

// scale maps a quantity to px along one axis.
type scale struct {
	from float64 // the quantity at px at
	at   float64
	k    float64 // px per unit
}

func (s scale) px(x float64) float64 { return s.at + (x-s.from)*s.k }

// tickSteps are the distances between labelled ticks, in km.
var tickSteps = [...]float64{5, 10, 20, 25, 50, 100, 200, 250, 500, 1000}

// tickStep returns the smallest step that keeps labels leastPx apart.
func tickStep(k, leastPx float64) float64 {
	for _, s := range tickSteps {
		if s*k >= leastPx {
			return s
		}
	}
	return tickSteps[len(tickSteps)-1]
}

// ticks returns the multiples of a step within a range.
func ticks(from, to, step float64) (at []float64) {
	for i := math.Ceil(from / step); i*step <= to; i++ {
		at = append(at, i*step+0)
	}
	return at
}

// exaggerations are the vertical exaggerations that a flat section may get.
var exaggerations = [...]float64{1, 1.5, 2, 3, 4, 5, 10, 20}

// fit returns the px per km along the surface, and the vertical exaggeration, for
// a plot of widthKm by depthKm that is at most mostW wide, at most mostH and, by
// exaggeration where needed, at least leastH high.
func fit(widthKm, depthKm, mostW, mostH, leastH float64) (k, exaggeration float64) {
	k = math.Min(mostW/widthKm, mostH/depthKm)
	for _, e := range exaggerations {
		if k*depthKm*e > mostH {
			break
		}
		exaggeration = e
		if k*depthKm*e >= leastH {
			break
		}
	}
	return k, math.Max(exaggeration, 1)
}
