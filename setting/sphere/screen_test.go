package sphere

import (
	"math"
	"testing"
)

// TestScreenKm checks the bound on places ScreenMinRad to ScreenMaxRad apart, against
// the geodesic.
func TestScreenKm(t *testing.T) {
	r := seeded(t)
	worst := 0.0
	for range 200000 {
		a := anyVec(r).LonLat()
		v := FromLonLat(a)
		rad := ScreenMaxRad * math.Pow(ScreenMinRad/ScreenMaxRad, r.Float64())
		east, north := v.EastNorth()
		sin, cos := math.Sincos(r.Float64() * 2 * math.Pi)
		b := v.Scale(math.Cos(rad)).Add(east.Scale(sin * math.Sin(rad))).Add(north.Scale(cos * math.Sin(rad))).Unit()
		want, _ := Inverse(a, b.LonLat())
		got := ScreenKm(v, b, Angle(v, b))
		// the positions and the geodesic themselves are good to tens of nanometres only
		if e := math.Abs(got-want) - 3e-11; e > ScreenRelative*want {
			t.Fatalf("%v to %v: %.9f km, by the geodesic %.9f", a, b.LonLat(), got, want)
		} else {
			worst = max(worst, e/want)
		}
	}
	t.Logf("worst relative error %.2g", worst)
	if worst < ScreenRelative/10 {
		t.Errorf("the bound %g is far above the worst error met, %g", ScreenRelative, worst)
	}
}
