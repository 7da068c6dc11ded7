package motion_test

import (
	"math"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"nearmargin/setting/motion"
	"nearmargin/setting/sphere"
)

// inDelta reports a number that is not within tol of the one wanted.
func inDelta(tb testing.TB, what string, got, want, tol float64) {
	tb.Helper()
	if !(math.Abs(got-want) <= tol) {
		tb.Errorf("%s: got %.9g, want %.9g within %.3g", what, got, want, tol)
	}
}

func isNaN(tb testing.TB, what string, got float64) {
	tb.Helper()
	if !math.IsNaN(got) {
		tb.Errorf("%s: got %g, want NaN", what, got)
	}
}

func place(lon, lat float64) sphere.Vec { return sphere.FromLonLat(sphere.LonLat{Lon: lon, Lat: lat}) }

// heading returns the unit vector at r that points to an azimuth in degrees.
func heading(r sphere.Vec, azimuthDeg float64) sphere.Vec {
	east, north := r.EastNorth()
	sin, cos := math.Sincos(azimuthDeg * math.Pi / 180)
	return east.Scale(sin).Add(north.Scale(cos))
}

// carrying returns the angular velocity in rad/Myr, square to r, that moves the
// place r by rateMmYr towards an azimuth.
func carrying(r sphere.Vec, rateMmYr, azimuthDeg float64) sphere.Vec {
	return r.Cross(heading(r, azimuthDeg)).Scale(rateMmYr / sphere.MeanRadiusKm)
}

func TestPoleVectorInRadiansPerMillionYears(t *testing.T) {
	const radPerDeg = math.Pi / 180
	for _, c := range []struct {
		name string
		pole motion.Pole
		want sphere.Vec // rad/Myr
	}{
		{"north pole, 1 degree per Myr", motion.Pole{Lat: 90, Lon: 0, RateDegMyr: 1}, sphere.Vec{Z: radPerDeg}},
		{"south pole, 2 degrees per Myr", motion.Pole{Lat: -90, Lon: 77, RateDegMyr: 2}, sphere.Vec{Z: -2 * radPerDeg}},
		{"Greenwich at the equator", motion.Pole{RateDegMyr: 0.5}, sphere.Vec{X: 0.5 * radPerDeg}},
		{"90 east at the equator", motion.Pole{Lon: 90, RateDegMyr: 0.5}, sphere.Vec{Y: 0.5 * radPerDeg}},
		{"clockwise about the north pole", motion.Pole{Lat: 90, RateDegMyr: -1}, sphere.Vec{Z: -radPerDeg}},
		{"45 north, 180 east", motion.Pole{Lat: 45, Lon: 180, RateDegMyr: 1}, sphere.Vec{X: -radPerDeg / math.Sqrt2, Z: radPerDeg / math.Sqrt2}},
		{"no rotation", motion.Pole{Lat: 12, Lon: 34}, sphere.Vec{}},
	} {
		if d := c.pole.Vector().Sub(c.want).Norm(); d > 1e-15 {
			t.Errorf("%s: %+v is off %+v by %g rad/Myr", c.name, c.pole.Vector(), c.want, d)
		}
	}
}

func TestPoleOf(t *testing.T) {
	for _, c := range []struct {
		name string
		w    sphere.Vec
		want motion.Pole
	}{
		{"the zero vector is the zero pole", sphere.Vec{}, motion.Pole{}},
		{"along +Z", sphere.Vec{Z: math.Pi / 180}, motion.Pole{Lat: 90, Lon: 0, RateDegMyr: 1}},
		{"along -Y", sphere.Vec{Y: -math.Pi / 90}, motion.Pole{Lat: 0, Lon: -90, RateDegMyr: 2}},
	} {
		got := motion.PoleOf(c.w)
		inDelta(t, c.name+": latitude", got.Lat, c.want.Lat, 1e-12)
		inDelta(t, c.name+": longitude", got.Lon, c.want.Lon, 1e-12)
		inDelta(t, c.name+": rate", got.RateDegMyr, c.want.RateDegMyr, 1e-12)
	}
	// a clockwise rotation is an anticlockwise one about the antipode
	got := motion.PoleOf(motion.Pole{Lat: 30, Lon: 40, RateDegMyr: -0.7}.Vector())
	inDelta(t, "antipode: latitude", got.Lat, -30, 1e-9)
	inDelta(t, "antipode: longitude", got.Lon, -140, 1e-9)
	inDelta(t, "antipode: rate", got.RateDegMyr, 0.7, 1e-12)
}

func TestPoleRoundTrip(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		p := motion.Pole{
			Lat:        rapid.Float64Range(-89.9, 89.9).Draw(t, "lat"),
			Lon:        rapid.Float64Range(-179.9, 180).Draw(t, "lon"),
			RateDegMyr: rapid.Float64Range(1e-3, 60).Draw(t, "rate"),
		}
		got := motion.PoleOf(p.Vector())
		if math.Abs(got.Lat-p.Lat) > 1e-9 || math.Abs(got.Lon-p.Lon) > 1e-9 || math.Abs(got.RateDegMyr-p.RateDegMyr) > 1e-12*p.RateDegMyr {
			t.Fatalf("%+v came back as %+v", p, got)
		}
		if w := p.Vector(); got.Vector().Sub(w).Norm() > 1e-14 {
			t.Fatalf("vector %+v came back as %+v", w, got.Vector())
		}
	})
}

func TestFromMasYr(t *testing.T) {
	// one degree per million years is 3.6 milliarcseconds a year
	got := motion.FromMasYr(3.6, -7.2, 0)
	want := sphere.Vec{X: math.Pi / 180, Y: -math.Pi / 90}
	if d := got.Sub(want).Norm(); d > 1e-16 {
		t.Errorf("3.6, -7.2, 0 mas/yr is %+v rad/Myr, want %+v", got, want)
	}
	// ITRF2014's Eurasia turns at 0.261 ± 0.001 degrees per Myr: Altamimi et al.
	// (2017), Table 1, which gives both the components and the rate
	inDelta(t, "Eurasia's rate", motion.PoleOf(motion.FromMasYr(-0.085, -0.531, 0.770)).RateDegMyr, 0.261, 0.0006)
}

func TestComposeKeepsTheVelocityRelativeToTheAnchor(t *testing.T) {
	vec := func(x, y, z float64) sphere.Vec { return sphere.Vec{X: x, Y: y, Z: z} }
	got := motion.Compose(vec(1, 2, 3), vec(10, 20, 30), vec(4, 5, 6))
	if want := vec(7, 17, 27); got != want {
		t.Errorf("composed %v, want %v", got, want)
	}
	rapid.Check(t, func(t *rapid.T) {
		anchorHere, there, anchorThere := drawOmega(t, "here"), drawOmega(t, "there"), drawOmega(t, "anchor there")
		rel := motion.Compose(anchorHere, there, anchorThere).Sub(anchorHere)
		if d := rel.Sub(there.Sub(anchorThere)).Norm(); d > 1e-14 {
			t.Fatalf("relative to the anchor the plate moves by %g rad/Myr otherwise", d)
		}
	})
}

func TestSpreadErrors(t *testing.T) {
	nan := math.NaN()
	for _, c := range []struct {
		name  string
		build func() error
		want  string
	}{
		{"rate σ below 0", func() error { _, err := motion.RateSpread(-0.1, 1); return err }, "rate σ -0.1 must be 0 or more"},
		{"rate σ not a number", func() error { _, err := motion.RateSpread(nan, 1); return err }, "must be 0 or more"},
		{"rate 0", func() error { _, err := motion.RateSpread(0.1, 0); return err }, "more than 0"},
		{"rate not a number", func() error { _, err := motion.RateSpread(0.1, nan); return err }, "more than 0"},
		{"component σ below 0", func() error { _, err := motion.ComponentSpread(sphere.Vec{X: 1, Y: -1}); return err }, "must be 0 or more"},
		{"component σ not a number", func() error { _, err := motion.ComponentSpread(sphere.Vec{Z: nan}); return err }, "must be 0 or more"},
		{"covariance's diagonal below 0", func() error {
			_, err := motion.CovarianceSpread([3][3]float64{{1, 0, 0}, {0, -2, 0}, {0, 0, 1}})
			return err
		}, "diagonal element 2 is -2"},
		{"covariance not symmetric", func() error {
			_, err := motion.CovarianceSpread([3][3]float64{{1, 0, 0.5}, {0, 1, 0}, {0.25, 0, 1}})
			return err
		}, "not symmetric: elements (3,1) 0.25 and (1,3) 0.5"},
		{"covariance holds no number", func() error {
			_, err := motion.CovarianceSpread([3][3]float64{{1, nan, 0}, {nan, 1, 0}, {0, 0, 1}})
			return err
		}, "not symmetric"},
	} {
		err := c.build()
		if err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: error %v, want one that says %q", c.name, err, c.want)
		}
	}
}
