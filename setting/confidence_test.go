package setting_test

import (
	"fmt"
	"maps"
	"math"
	"slices"
	"testing"

	"pgregory.net/rapid"

	"nearmargin/setting"
)

// The rules once more, for a site square off one boundary of the synthetic model
// and nothing else: the label by its distance in km, 1σ of the line, the side and
// the limits by name.
func labelAgain(segment string, north bool, km, sigmaKm float64, limit map[string]float64) setting.Label {
	within := func(name string) bool { return km <= limit[name] }
	switch segment {
	case "trench", "vague-trench":
		switch {
		case km <= math.Max(limit["trench"], sigmaKm):
			return setting.Trench
		case !north && within("outer_rise"):
			return setting.OuterRise
		case !north:
			return setting.PlateInterior
		case km < limit["forearc"]:
			return setting.Forearc
		case km < limit["volcanic_arc"]:
			return setting.VolcanicArc
		case km < limit["back_arc"]:
			return setting.BackArc
		}
	case "ridge":
		switch {
		case within("ridge_axis"):
			return setting.RidgeAxis
		case within("flank") && km/(slowMmYr/2) < limit["flank_age"]:
			return setting.RidgeFlank
		}
	case "ocean-fault":
		if within("transform_oceanic") {
			return setting.TransformZone
		}
	case "land-fault":
		if within("transform_continental") {
			return setting.TransformZone
		}
	case "rift":
		if within("rift") {
			return setting.ContinentalRift
		}
	case "convergence":
		if within("convergent") {
			return setting.ConvergentMargin
		}
	case "collision":
		if north && within("collision_upper") || !north && within("collision_lower") {
			return setting.CollisionZone
		}
	case "collision-of-either":
		if within("collision_either") {
			return setting.CollisionZone
		}
	}
	return setting.PlateInterior
}

// The contract's definition of confidence: the label is worked out again with
// each distance, each limit and the site's position moved by one σ either way,
// one at a time, and on the other plate where the side is uncertain; the
// alternatives are exactly the labels met.
func TestAlternativesAreExactlyTheLabelsMet(t *testing.T) {
	l := look(t, setting.Options{})
	rapid.Check(t, func(t *rapid.T) {
		s := segments[rapid.IntRange(0, len(segments)-1).Draw(t, "segment")]
		north := rapid.Bool().Draw(t, "north")
		km := rapid.OneOf(rapid.Float64Range(0.5, 60), rapid.Float64Range(0.5, 690), rapid.SampledFrom([]float64{98, 136, 144, 202, 262, 291, 311, 344, 356, 521, 561, 588})).Draw(t, "km")
		if !north && km > 240 && s.subducting != "" {
			km -= 240 // seaward nothing is looked for farther out
		}
		uncertainty := rapid.OneOf(rapid.Just(math.NaN()), rapid.Just(0.0), rapid.Float64Range(0.1, 60)).Draw(t, "uncertainty_km")
		signed := km
		if !north {
			signed = -km
		}
		site := off(t, s.id, signed)
		site.UncertaintyKm = uncertainty
		var a setting.Answer
		if err := l.At(site, &a); err != nil {
			t.Fatal(err)
		}

		limits := map[string]float64{}
		for _, x := range setting.Limits {
			limits[x.Name] = x.Value
		}
		label := labelAgain(s.id, north, km, s.sigmaKm, limits)
		want := map[string]bool{}
		try := func(got setting.Label) {
			if got != label {
				want[fmt.Sprint(got)] = true
			}
		}
		siteSigma := 0.0
		if uncertainty > 0 {
			siteSigma = uncertainty
		}
		for _, sign := range []float64{1, -1} {
			try(labelAgain(s.id, north, math.Max(0, km+sign*s.sigmaKm), s.sigmaKm, limits))
			try(labelAgain(s.id, north, math.Max(0, km+sign*siteSigma), s.sigmaKm, limits))
			for _, x := range setting.Limits {
				limits[x.Name] = x.Value + sign*x.Sigma
				try(labelAgain(s.id, north, km, s.sigmaKm, limits))
				limits[x.Name] = x.Value
			}
		}
		uncertain := km <= 2*math.Hypot(s.sigmaKm, siteSigma)
		if uncertain {
			try(labelAgain(s.id, !north, km, s.sigmaKm, limits))
		}

		if a.Label != label || a.SideUncertain != uncertain {
			t.Fatalf("%s, %.3f km north: %v, side uncertain %v; want %v, %v", s.id, signed, a.Label, a.SideUncertain, label, uncertain)
		}
		got := names(&a)
		if !maps.Equal(got, want) || len(got) != a.Alternatives.Len() {
			t.Fatalf("%s, %.3f km north, %v: alternatives %v, want %v", s.id, signed, label, slices.Sorted(maps.Keys(got)), slices.Sorted(maps.Keys(want)))
		}
		confidence := setting.High
		for _, alt := range a.Alternatives.All() {
			if alt.Family != a.Family {
				confidence = setting.Low
				break
			}
			confidence = setting.Medium
		}
		if a.Confidence != confidence {
			t.Fatalf("%s, %.3f km north: confidence %v with %v, want %v", s.id, signed, a.Confidence, got, confidence)
		}
	})
}

func TestConfidence(t *testing.T) {
	for _, c := range []struct {
		segment string
		km      float64
		label   setting.Label
		want    setting.Confidence
	}{
		{"rift", 10, setting.ContinentalRift, setting.High}, // either side of it
		{"trench", 240, setting.VolcanicArc, setting.High},
		{"trench", 145, setting.VolcanicArc, setting.Medium}, // or forearc
		{"trench", -145, setting.OuterRise, setting.Low},     // or an interior
		{"rift", 70, setting.ContinentalRift, setting.Low},
		{"rift", 80, setting.PlateInterior, setting.Low},
	} {
		if a := answer(t, look(t, setting.Options{}), off(t, c.segment, c.km)); a.Label != c.label || a.Confidence != c.want {
			t.Errorf("%s, %g km: %v of confidence %v with %v, want %v, %v", c.segment, c.km, a.Label, a.Confidence, names(a), c.label, c.want)
		}
	}
}

func TestAlternativesSayWhatWasMoved(t *testing.T) {
	for _, c := range []struct {
		name      string
		segment   string
		km        float64
		uncertain float64
		label     setting.Label
		cause     setting.CauseKind
		text      string
	}{
		{"the line's σ", "trench", 8, math.NaN(), setting.Forearc, setting.CauseDistance, "met with The trench 5.0 km farther away (1σ of its position)"},
		{"the line's σ, nearer", "trench", 143, math.NaN(), setting.Forearc, setting.CauseDistance, "met with The trench 5.0 km nearer (1σ of its position)"},
		{"the site's σ", "rift", 60, 20, setting.PlateInterior, setting.CauseSite, "met with the site 20.0 km farther from The rift (1σ of the site)"},
		{"a limit's σ", "trench", 320, math.NaN(), setting.BackArc, setting.CauseLimit, `met with the limit "volcanic_arc" moved by -40 km (1σ of the limit)`},
		{"the limit of age", "ridge", 290, math.NaN(), setting.PlateInterior, setting.CauseLimit, `met with the limit "flank_age" moved by -1.5 Myr (1σ of the limit)`},
		{"the other plate", "trench", 5, 60, setting.OuterRise, setting.CauseOtherSide, "met on plate BB: the side is uncertain"},
	} {
		s := off(t, c.segment, c.km)
		s.UncertaintyKm = c.uncertain
		if c.cause == setting.CauseOtherSide {
			s = off(t, "vague-trench", 50) // 2σ of the line is 60 km
		}
		a := answer(t, look(t, setting.Options{}), s)
		found := false
		for _, alt := range a.Alternatives.All() {
			if alt.Label != c.label {
				continue
			}
			found = true
			if alt.Cause.Kind != c.cause || alt.Text() != c.text {
				t.Errorf("%s: cause %d, %q; want %d, %q", c.name, alt.Cause.Kind, alt.Text(), c.cause, c.text)
			}
		}
		if !found {
			t.Errorf("%s: %v with %v, want the alternative %v", c.name, a.Label, names(a), c.label)
		}
	}
}

func TestSideUncertainWithinTwoSigma(t *testing.T) {
	for _, c := range []struct {
		km, uncertainty float64
		want            bool
	}{
		{9.99, math.NaN(), true}, {10.01, math.NaN(), false}, {9.99, 0, true}, {10.01, 0, false},
		{25.99, 12, true}, {26.01, 12, false}, // 2·√(5²+12²)
	} {
		s := off(t, "trench", c.km)
		s.UncertaintyKm = c.uncertainty
		a := answer(t, look(t, setting.Options{}), s)
		if a.SideUncertain != c.want {
			t.Errorf("%g km away, uncertain by %g: %v, want %v", c.km, c.uncertainty, a.SideUncertain, c.want)
		}
		note := false
		for _, n := range a.Notes.All() {
			note = note || n == setting.Note{Code: setting.NoteSideUncertain, A: "AA", B: "BB"}
		}
		if note != c.want {
			t.Errorf("%g km away: note on the side %v, want %v", c.km, note, c.want)
		}
	}
}
