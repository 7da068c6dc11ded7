package motion_test

import (
	"math"
	"testing"

	"pgregory.net/rapid"

	"nearmargin/setting/motion"
	"nearmargin/setting/sphere"
)

// entry is a published plate without σ.
func entry(plate string, w sphere.Vec) motion.Entry {
	return motion.Entry{Plate: plate, Vector: w, Basis: motion.Published}
}

func mustModel(tb rapid.TB, entries ...motion.Entry) *motion.Model {
	tb.Helper()
	m, err := motion.NewModel(motion.Info{Name: "test"}, entries)
	if err != nil {
		tb.Fatal(err)
	}
	return m
}

func mustRelative(tb rapid.TB, m *motion.Model, plate, reference string, at, along sphere.Vec, referenceLeft bool) motion.Relative {
	tb.Helper()
	r, ok := m.Relative(plate, reference, at, along, referenceLeft)
	if !ok {
		tb.Fatalf("the model lacks %s or %s", plate, reference)
	}
	return r
}

// The cases are read aloud: stand on the reference plate, look across the
// boundary, and say what the other plate does.
func TestRelativeSigns(t *testing.T) {
	const left, right = true, false
	for _, c := range []struct {
		name                           string
		pathAzimuth                    float64
		reference                      bool // the hand on which it lies of someone who walks along the path
		rateMmYr, towards              float64
		openingMmYr, shearMmYr, obliqu float64
	}{
		{"ridge running north, stand on the west: the east moves east, opening", 0, left, 40, 90, 40, 0, 0},
		{"the same from the east: the west moves west, opening", 0, right, 40, 270, 40, 0, 0},
		{"ridge drawn southward, stand on the west (right hand): the east moves east", 180, right, 40, 90, 40, 0, 0},
		{"trench running north, stand on the east: the west moves east, converging", 0, right, 70, 90, -70, 0, 0},
		{"fault running north, stand on the west, look east: the east goes south, to the right", 0, left, 30, 180, 0, 30, 90},
		{"the same fault, stand on the east, look west: the west goes north, to the right", 0, right, 30, 0, 0, 30, 90},
		{"fault running north, stand on the west: the east goes north, left-lateral", 0, left, 30, 0, 0, -30, 90},
		{"fault running north-west, stand on the east (right hand): the west goes north-west, right-lateral like the San Andreas", 315, right, 35, 315, 0, 35, 90},
		{"fault running east, stand on the north (left hand), look south: the south goes west, right-lateral", 90, left, 25, 270, 0, 25, 90},
		{"trench running north, stand on the east (right hand): the west comes from the south-west, converging and right-lateral", 0, right, 50, 45, -50 / math.Sqrt2, 50 / math.Sqrt2, 45},
		{"rift running east, stand on the south (right hand): the north goes north-north-east, mostly opening, right-lateral", 90, right, 20, 30, 20 * math.Sqrt(3) / 2, 10, 30},
	} {
		t.Run(c.name, func(t *testing.T) {
			for _, at := range []sphere.Vec{place(0, 0), place(-120, 36), place(179.5, -60), place(15, 89)} {
				m := mustModel(t, entry("AA", carrying(at, c.rateMmYr, c.towards)), entry("BB", sphere.Vec{}))
				got := mustRelative(t, m, "AA", "BB", at, heading(at, c.pathAzimuth), c.reference)
				inDelta(t, "rate", got.RateMmYr, c.rateMmYr, 1e-9)
				inDelta(t, "azimuth", got.AzimuthDeg, c.towards, 1e-9)
				inDelta(t, "opening", got.OpeningMmYr, c.openingMmYr, 1e-9)
				inDelta(t, "shear", got.ShearMmYr, c.shearMmYr, 1e-9)
				inDelta(t, "obliquity", got.ObliquityDeg, c.obliqu, 1e-9)
			}
		})
	}
}

// One degree of a great circle on a sphere of the mean radius is 111.195 km.
func TestRelativeInMillimetresAYear(t *testing.T) {
	m := mustModel(t, entry("AA", motion.Pole{Lat: 90, RateDegMyr: 1}.Vector()), entry("BB", sphere.Vec{}))
	for _, c := range []struct {
		name string
		lat  float64
		want float64
	}{
		{"at the equator of the rotation", 0, 111.19508},
		{"at 60 degrees, half as fast", 60, 55.59754},
		{"a degree from the pole", 89, 111.19508 * math.Cos(89*math.Pi/180)},
	} {
		got := mustRelative(t, m, "AA", "BB", place(33, c.lat), heading(place(33, c.lat), 0), true)
		inDelta(t, c.name+": mm/yr", got.RateMmYr, c.want, 1e-4)
		inDelta(t, c.name+": eastward", got.AzimuthDeg, 90, 1e-9)
	}
}

func TestRelativeAtZeroRate(t *testing.T) {
	w := motion.Pole{Lat: 40, Lon: 50, RateDegMyr: 0.7}.Vector()
	spread, err := motion.RateSpread(0.01, 0.7)
	if err != nil {
		t.Fatal(err)
	}
	for name, m := range map[string]*motion.Model{
		"plates that turn alike":    mustModel(t, motion.Entry{Plate: "AA", Vector: w, Spread: spread, Basis: motion.Published}, motion.Entry{Plate: "BB", Vector: w, Spread: spread, Basis: motion.Published}),
		"plates that do not turn":   mustModel(t, entry("AA", sphere.Vec{}), entry("BB", sphere.Vec{})),
		"at the pole of their spin": mustModel(t, entry("AA", place(10, 20).Scale(0.01)), entry("BB", sphere.Vec{})),
	} {
		at := place(10, 20)
		got := mustRelative(t, m, "AA", "BB", at, heading(at, 10), true)
		inDelta(t, name+": rate", got.RateMmYr, 0, 1e-9)
		inDelta(t, name+": opening", got.OpeningMmYr, 0, 1e-9)
		inDelta(t, name+": shear", got.ShearMmYr, 0, 1e-9)
		isNaN(t, name+": azimuth", got.AzimuthDeg)
		isNaN(t, name+": obliquity", got.ObliquityDeg)
		isNaN(t, name+": azimuth σ", got.AzimuthSigmaDeg)
	}
}

func TestRelativeLacksAPlate(t *testing.T) {
	m := mustModel(t, entry("AA", sphere.Vec{X: 0.01}), entry("BB", sphere.Vec{}))
	at := place(0, 10)
	for _, pair := range [][2]string{{"AA", "CC"}, {"CC", "AA"}, {"", "AA"}, {"aa", "BB"}} {
		if got, ok := m.Relative(pair[0], pair[1], at, heading(at, 0), true); ok {
			t.Errorf("%s relative to %s: got %+v, want none", pair[0], pair[1], got)
		}
	}
}

func drawOmega(t *rapid.T, label string) sphere.Vec {
	c := rapid.Float64Range(-0.5, 0.5)
	return sphere.Vec{X: c.Draw(t, label+" x"), Y: c.Draw(t, label+" y"), Z: c.Draw(t, label+" z")}
}

func drawSpread(t *rapid.T, label string) motion.Spread {
	s := rapid.Float64Range(0, 0.01)
	var out motion.Spread
	var err error
	switch rapid.IntRange(0, 2).Draw(t, label+" kind") {
	case 0:
		out, err = motion.RateSpread(s.Draw(t, label), 0.5)
	case 1:
		out, err = motion.ComponentSpread(sphere.Vec{X: s.Draw(t, label), Y: s.Draw(t, label), Z: s.Draw(t, label)})
	default:
		a, b, c := s.Draw(t, label), s.Draw(t, label), s.Draw(t, label)
		out, err = motion.CovarianceSpread([3][3]float64{{a * a, a * b / 2, 0}, {a * b / 2, b * b, 0}, {0, 0, c * c}})
	}
	if err != nil {
		t.Fatal(err)
	}
	return out
}

// alike compares numbers of which both may be NaN.
func alike(a, b, tol float64) bool {
	return math.IsNaN(a) && math.IsNaN(b) || math.Abs(a-b) <= tol
}

func TestRelativeIsTheSameFromBothSides(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		m := mustModel(t,
			motion.Entry{Plate: "AA", Vector: drawOmega(t, "A"), Spread: drawSpread(t, "spread A"), Basis: motion.Published},
			motion.Entry{Plate: "BB", Vector: drawOmega(t, "B"), Spread: drawSpread(t, "spread B"), Basis: motion.Published})
		at := place(rapid.Float64Range(-180, 180).Draw(t, "lon"), rapid.Float64Range(-89.9, 89.9).Draw(t, "lat"))
		along := heading(at, rapid.Float64Range(0, 360).Draw(t, "path azimuth"))
		left := rapid.Bool().Draw(t, "reference on the left")
		here := mustRelative(t, m, "AA", "BB", at, along, left)

		const tol = 1e-8
		for name, other := range map[string]motion.Relative{
			"seen from the other plate":             mustRelative(t, m, "BB", "AA", at, along, !left),
			"with the boundary drawn the other way": mustRelative(t, m, "AA", "BB", at, along.Scale(-1), !left),
		} {
			if !alike(here.RateMmYr, other.RateMmYr, tol) || !alike(here.OpeningMmYr, other.OpeningMmYr, tol) ||
				!alike(here.ShearMmYr, other.ShearMmYr, tol) || !alike(here.RateSigmaMmYr, other.RateSigmaMmYr, tol) {
				t.Fatalf("%s: %+v, want the rate, components and σ of %+v", name, other, here)
			}
		}
		if here.RateMmYr < 1e-3 {
			return // no direction to compare
		}
		there := mustRelative(t, m, "BB", "AA", at, along, !left)
		if d := math.Remainder(here.AzimuthDeg-there.AzimuthDeg-180, 360); math.Abs(d) > 1e-6 {
			t.Fatalf("azimuths %g and %g are not opposite", here.AzimuthDeg, there.AzimuthDeg)
		}
		if !alike(here.AzimuthSigmaDeg, there.AzimuthSigmaDeg, 1e-6) {
			t.Fatalf("azimuth σ %g and %g", here.AzimuthSigmaDeg, there.AzimuthSigmaDeg)
		}
	})
}

func TestRelativeComponentsMakeTheRate(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		m := mustModel(t, entry("AA", drawOmega(t, "A")), entry("BB", drawOmega(t, "B")))
		at := place(rapid.Float64Range(-180, 180).Draw(t, "lon"), rapid.Float64Range(-90, 90).Draw(t, "lat"))
		r := mustRelative(t, m, "AA", "BB", at, heading(at, rapid.Float64Range(0, 360).Draw(t, "path azimuth")), rapid.Bool().Draw(t, "left"))
		if got := math.Hypot(r.OpeningMmYr, r.ShearMmYr); math.Abs(got-r.RateMmYr) > 1e-9*(1+r.RateMmYr) {
			t.Fatalf("opening %g and shear %g make %g, not the rate %g", r.OpeningMmYr, r.ShearMmYr, got, r.RateMmYr)
		}
		if r.RateMmYr < 1e-3 {
			return
		}
		if !(r.ObliquityDeg >= 0 && r.ObliquityDeg <= 90) || !(r.AzimuthDeg >= 0 && r.AzimuthDeg < 360) {
			t.Fatalf("obliquity %g must be in 0…90 and azimuth %g in [0, 360)", r.ObliquityDeg, r.AzimuthDeg)
		}
		if want := r.RateMmYr * math.Sin(r.ObliquityDeg*math.Pi/180); math.Abs(want-math.Abs(r.ShearMmYr)) > 1e-6*(1+r.RateMmYr) {
			t.Fatalf("obliquity %g makes a shear of %g, not %g", r.ObliquityDeg, want, r.ShearMmYr)
		}
	})
}
