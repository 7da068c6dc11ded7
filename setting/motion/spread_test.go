package motion_test

import (
	"math"
	"math/rand/v2"
	"testing"

	"nearmargin/setting/motion"
	"nearmargin/setting/sphere"
)

// seed of every Monte Carlo here; the tolerances are four standard errors of
// what samples estimate, so that another seed passes as well.
const (
	seed    = 20030314
	samples = 40000
)

func must[T any](v T, err error) T {
	if err != nil {
		panic(err)
	}
	return v
}

func spreadEntry(plate string, w sphere.Vec, s motion.Spread) motion.Entry {
	return motion.Entry{Plate: plate, Vector: w, Spread: s, Basis: motion.Published}
}

func relativeOf(tb testing.TB, a, b motion.Entry, at sphere.Vec) motion.Relative {
	tb.Helper()
	return mustRelative(tb, mustModel(tb, a, b), "AA", "BB", at, heading(at, 20), true)
}

// A rate σ of 5 % is 5 % of the velocity, and says nothing about its direction.
func TestRateSpread(t *testing.T) {
	at := place(20, 30)
	s := must(motion.RateSpread(0.05, 1))
	still := must(motion.RateSpread(0, 1))
	a := spreadEntry("AA", motion.Pole{Lat: 60, Lon: -80, RateDegMyr: 1}.Vector(), s)
	got := relativeOf(t, a, spreadEntry("BB", sphere.Vec{}, still), at)
	inDelta(t, "rate σ", got.RateSigmaMmYr, 0.05*got.RateMmYr, 1e-9)
	isNaN(t, "azimuth σ", got.AzimuthSigmaDeg)

	// the reference plate's own motion, not the small difference, is what is uncertain
	b := spreadEntry("BB", motion.Pole{Lat: 60, Lon: -80, RateDegMyr: 0.9}.Vector(), s)
	got = relativeOf(t, a, b, at)
	inDelta(t, "rate σ of a small difference", got.RateSigmaMmYr, 0.05*(10+9)*got.RateMmYr, 1e-9)
}

func TestNoSpread(t *testing.T) {
	at := place(20, 30)
	full := must(motion.ComponentSpread(sphere.Vec{X: 1e-4, Y: 1e-4, Z: 1e-4}))
	for _, c := range []struct {
		name string
		a, b motion.Spread
	}{
		{"neither plate", motion.NoSpread(), motion.NoSpread()},
		{"not the plate", motion.NoSpread(), full},
		{"not the reference", full, motion.NoSpread()},
	} {
		got := relativeOf(t, spreadEntry("AA", sphere.Vec{Z: 0.01}, c.a), spreadEntry("BB", sphere.Vec{X: 0.01}, c.b), at)
		isNaN(t, c.name+": rate σ", got.RateSigmaMmYr)
		if !(got.RateMmYr > 1) {
			t.Errorf("%s: rate %g, want one all the same", c.name, got.RateMmYr)
		}
	}
}

func TestAzimuthSigmaNeedsBothPlatesDirections(t *testing.T) {
	at := place(20, 30)
	rate := must(motion.RateSpread(0.01, 1))
	component := must(motion.ComponentSpread(sphere.Vec{X: 1e-4, Y: 2e-4, Z: 1e-4}))
	covariance := must(motion.CovarianceSpread([3][3]float64{{1e-8, 0, 0}, {0, 1e-8, 0}, {0, 0, 1e-8}}))
	for _, c := range []struct {
		name  string
		a, b  motion.Spread
		known bool
	}{
		{"rate and rate", rate, rate, false},
		{"rate and components", rate, component, false},
		{"covariance and rate", covariance, rate, false},
		{"components and components", component, component, true},
		{"components and covariance", component, covariance, true},
	} {
		got := relativeOf(t, spreadEntry("AA", sphere.Vec{Z: 0.01}, c.a), spreadEntry("BB", sphere.Vec{X: 0.01}, c.b), at)
		if known := !math.IsNaN(got.AzimuthSigmaDeg); known != c.known {
			t.Errorf("%s: azimuth σ %g, want known %v", c.name, got.AzimuthSigmaDeg, c.known)
		}
		if !(got.RateSigmaMmYr > 0) {
			t.Errorf("%s: rate σ %g, want more than 0", c.name, got.RateSigmaMmYr)
		}
	}
}

// cholesky returns the lower triangle whose product with its transpose is c.
func cholesky(c [3][3]float64) (l [3][3]float64) {
	for i := range 3 {
		for j := 0; j <= i; j++ {
			sum := c[i][j]
			for k := range j {
				sum -= l[i][k] * l[j][k]
			}
			if i == j {
				l[i][i] = math.Sqrt(sum)
			} else {
				l[i][j] = sum / l[j][j]
			}
		}
	}
	return l
}

func sample(r *rand.Rand, mean sphere.Vec, l [3][3]float64) sphere.Vec {
	z := [3]float64{r.NormFloat64(), r.NormFloat64(), r.NormFloat64()}
	var d [3]float64
	for i := range 3 {
		for j := 0; j <= i; j++ {
			d[i] += l[i][j] * z[j]
		}
	}
	return mean.Add(sphere.Vec{X: d[0], Y: d[1], Z: d[2]})
}

// scatter returns the standard deviations of the rate along the mean velocity
// and of the azimuth in degrees, over sampled angular velocities.
func scatter(at, mean sphere.Vec, draw func() sphere.Vec) (rateMmYr, azimuthDeg float64) {
	v := mean.Cross(at).Scale(sphere.MeanRadiusKm)
	u, az := v.Unit(), at.Azimuth(v)
	var r2, a2 float64
	for range samples {
		x := draw().Cross(at).Scale(sphere.MeanRadiusKm)
		dr, da := x.Dot(u)-v.Norm(), math.Remainder(at.Azimuth(x)-az, 360)
		r2, a2 = r2+dr*dr, a2+da*da
	}
	return math.Sqrt(r2 / samples), math.Sqrt(a2 / samples)
}

var skewCov = [3][3]float64{{4e-8, 1.5e-8, -1e-8}, {1.5e-8, 2e-8, 0.4e-8}, {-1e-8, 0.4e-8, 6e-8}}

func TestCovarianceSpreadAgainstMonteCarlo(t *testing.T) {
	r := rand.New(rand.NewPCG(seed, 1))
	exact := must(motion.CovarianceSpread([3][3]float64{}))
	cov := must(motion.CovarianceSpread(skewCov))
	l := cholesky(skewCov)
	w := motion.Pole{Lat: 50, Lon: -100, RateDegMyr: 0.7}.Vector()
	for _, at := range []sphere.Vec{place(-71.5, -20), place(30, 60), place(179, 5)} {
		got := relativeOf(t, spreadEntry("AA", w, cov), spreadEntry("BB", sphere.Vec{}, exact), at)
		rate, az := scatter(at, w, func() sphere.Vec { return sample(r, w, l) })
		tol := 4 / math.Sqrt(2*samples)
		inDelta(t, "rate σ", got.RateSigmaMmYr, rate, tol*rate)
		inDelta(t, "azimuth σ", got.AzimuthSigmaDeg, az, tol*az+0.002*az) // the angle is not quite linear
	}
}

// The sum of two plates' σ bounds the σ of their difference whatever the
// correlation between them, and is met where they are wholly anticorrelated.
func TestSigmaOfADifferenceIsAnUpperBound(t *testing.T) {
	cov := must(motion.CovarianceSpread(skewCov))
	l := cholesky(skewCov)
	a, b := motion.Pole{Lat: 50, Lon: -100, RateDegMyr: 0.7}.Vector(), motion.Pole{Lat: -20, Lon: 10, RateDegMyr: 0.4}.Vector()
	at := place(-71.5, -20)
	got := relativeOf(t, spreadEntry("AA", a, cov), spreadEntry("BB", b, cov), at)
	for _, c := range []struct {
		name        string
		correlation float64
		met         bool
	}{{"correlated", 0.9, false}, {"independent", 0, false}, {"anticorrelated", -1, true}} {
		r := rand.New(rand.NewPCG(seed, 2))
		rate, az := scatter(at, a.Sub(b), func() sphere.Vec {
			da, own := sample(r, sphere.Vec{}, l), sample(r, sphere.Vec{}, l)
			db := da.Scale(c.correlation).Add(own.Scale(math.Sqrt(1 - c.correlation*c.correlation)))
			return a.Add(da).Sub(b.Add(db))
		})
		tol := 4 / math.Sqrt(2*samples)
		if c.met {
			inDelta(t, c.name+": rate σ", rate, got.RateSigmaMmYr, tol*rate)
			inDelta(t, c.name+": azimuth σ", az, got.AzimuthSigmaDeg, tol*az+0.002*az)
		} else if !(rate < 0.9*got.RateSigmaMmYr && az < 0.9*got.AzimuthSigmaDeg) {
			t.Errorf("%s: sampled σ %g mm/yr and %g degrees, want clearly less than the bounds %g and %g", c.name, rate, az, got.RateSigmaMmYr, got.AzimuthSigmaDeg)
		}
	}
}

// Component σ without correlations bound every correlation: the bound is met
// with the worst signs and is never below the independent case.
func TestComponentSpreadBoundsEveryCorrelation(t *testing.T) {
	at := place(40, 25)
	s := sphere.Vec{X: 1e-4, Y: 3e-4, Z: 2e-4}
	w := motion.Pole{Lat: 50, Lon: -100, RateDegMyr: 0.7}.Vector()
	exact := must(motion.ComponentSpread(sphere.Vec{}))
	got := relativeOf(t, spreadEntry("AA", w, must(motion.ComponentSpread(s))), spreadEntry("BB", sphere.Vec{}, exact), at).RateSigmaMmYr
	worst := 0.0
	for sx := -1.0; sx <= 1; sx += 2 {
		for sy := -1.0; sy <= 1; sy += 2 {
			c := [3][3]float64{
				{s.X * s.X, sx * s.X * s.Y, sy * s.X * s.Z},
				{sx * s.X * s.Y, s.Y * s.Y, sx * sy * s.Y * s.Z},
				{sy * s.X * s.Z, sx * sy * s.Y * s.Z, s.Z * s.Z},
			}
			one := relativeOf(t, spreadEntry("AA", w, must(motion.CovarianceSpread(c))), spreadEntry("BB", sphere.Vec{}, exact), at).RateSigmaMmYr
			worst = max(worst, one)
		}
	}
	inDelta(t, "bound against the worst correlation", got, worst, 1e-9)
	free := [3][3]float64{{s.X * s.X}, {0, s.Y * s.Y}, {0, 0, s.Z * s.Z}}
	if one := relativeOf(t, spreadEntry("AA", w, must(motion.CovarianceSpread(free))), spreadEntry("BB", sphere.Vec{}, exact), at).RateSigmaMmYr; !(one < got) {
		t.Errorf("σ %g without correlation must be less than the bound %g", one, got)
	}
}

func TestComposedVelocityHasNoSigma(t *testing.T) {
	at := place(20, 30)
	s := must(motion.ComponentSpread(sphere.Vec{X: 1e-4, Y: 1e-4, Z: 1e-4}))
	small := spreadEntry("CC", sphere.Vec{Z: 0.03}, s)
	small.Basis = motion.Composed("AA")
	m := mustModel(t, spreadEntry("AA", sphere.Vec{Z: 0.01}, s), spreadEntry("BB", sphere.Vec{X: 0.01}, s), small)
	for _, pair := range [][2]string{{"CC", "AA"}, {"AA", "CC"}, {"CC", "BB"}} {
		got := mustRelative(t, m, pair[0], pair[1], at, heading(at, 0), true)
		isNaN(t, pair[0]+" to "+pair[1]+": rate σ", got.RateSigmaMmYr)
		isNaN(t, pair[0]+" to "+pair[1]+": azimuth σ", got.AzimuthSigmaDeg)
		if !(got.RateMmYr > 1) {
			t.Errorf("%s to %s: rate %g, want one all the same", pair[0], pair[1], got.RateMmYr)
		}
	}
}
