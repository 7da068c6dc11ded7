package setting

import (
	"math"
	"testing"

	"nearmargin/setting/sphere"
)

// TestTurnAcrossNorth: azimuths are taken in the short way round, in whatever
// order they come.
func TestTurnAcrossNorth(t *testing.T) {
	for _, c := range []struct {
		name     string
		azimuths []float64
		want     Range
	}{
		{"one", []float64{30}, Range{30, 30}},
		{"forward", []float64{30, 40, 35}, Range{30, 40}},
		{"backward", []float64{40, 30, 35}, Range{30, 40}},
		{"across north, clockwise", []float64{350, 355, 5}, Range{350, 5}},
		{"across north, anticlockwise", []float64{5, 0, 350}, Range{350, 5}},
		{"across north both ways", []float64{0, 10, 345}, Range{345, 10}},
		{"around south", []float64{170, 190, 185}, Range{170, 190}},
		{"none at rate 0", []float64{math.NaN(), 12, math.NaN()}, Range{12, 12}},
	} {
		m := newMotionRange()
		for _, az := range c.azimuths {
			m.turn(az)
		}
		if got := m.r.AzimuthDeg; math.Abs(got.Min-c.want.Min) > 1e-9 || math.Abs(got.Max-c.want.Max) > 1e-9 {
			t.Errorf("%s: %v, want %v", c.name, got, c.want)
		}
	}
	m := newMotionRange()
	if m.turn(math.NaN()); !math.IsNaN(m.r.AzimuthDeg.Min) || !math.IsNaN(m.r.AzimuthDeg.Max) {
		t.Errorf("of no direction: %v", m.r.AzimuthDeg)
	}
}

func TestRangeInclude(t *testing.T) {
	r := Range{math.NaN(), math.NaN()}
	r.include(math.NaN())
	if !math.IsNaN(r.Min) || !math.IsNaN(r.Max) {
		t.Errorf("of nothing: %v", r)
	}
	for _, x := range []float64{3, math.NaN(), -2, 1} {
		r.include(x)
	}
	if r != (Range{-2, 3}) {
		t.Errorf("%v, want -2 to 3", r)
	}
}

// TestStandardError: a lattice cut in two by a line in whatever direction.
func TestStandardError(t *testing.T) {
	const n = 1000
	g := lattice{parts: []latticePart{{0, n, 1}}}
	for k := range n {
		g.at = append(g.at, sampleOf(k))
	}
	for _, deg := range []float64{0, 20, 45, 70, 90, 130} {
		sin, cos := math.Sincos(deg * math.Pi / 180)
		class := make([]uint16, n)
		for i, s := range g.at {
			if (s.At.X-0.5)*cos+(s.At.Y-0.5)*sin > 0 {
				class[i] = 1
			}
		}
		// about √n·1.3 pairs of neighbours on two sides of the line
		want := math.Sqrt(1.3*math.Sqrt(n)/6) / n
		if got := g.standardError(class, 2); got < 0.6*want || got > 1.7*want {
			t.Errorf("%g°: %.5f, want about %.5f", deg, got, want)
		}
	}
	if got := g.standardError(make([]uint16, n), 1); got != 0.5/n {
		t.Errorf("of one class: %g, want %g", got, 0.5/n)
	}
}

// sampleOf is place k of the golden lattice on a unit square.
func sampleOf(k int) (s sphere.Sample) {
	x := (float64(k) + 0.5) * 0.6180339887498949
	s.At = sphere.Vec{X: x - math.Floor(x), Y: (float64(k) + 0.5) / 1000}
	return s
}
