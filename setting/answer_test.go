package setting_test

import (
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"sync"
	"testing"

	"nearmargin/setting"
	"nearmargin/setting/sphere"
)

func codes(a *setting.Answer) []setting.NoteCode {
	var out []setting.NoteCode
	for _, n := range a.Notes.All() {
		out = append(out, n.Code)
	}
	return out
}

func TestNotes(t *testing.T) {
	aged := func(s setting.Site, ma float64) setting.Site { s.AgeMa = ma; return s }
	for _, c := range []struct {
		name string
		o    setting.Options
		site setting.Site
		want []setting.NoteCode // in order
	}{
		{"an interior without σ of motion", setting.Options{}, setting.SiteAt(80, 50), []setting.NoteCode{setting.NoteScreening}},
		{"a young rock", setting.Options{}, aged(setting.SiteAt(80, 50), 5), []setting.NoteCode{setting.NoteScreening}},
		{"an old rock", setting.Options{}, aged(setting.SiteAt(80, 50), 5.01), []setting.NoteCode{setting.NotePresentDay, setting.NoteScreening}},
		{"an old rock where much else is to be said", setting.Options{Motion: "half", Fallback: "composed"}, aged(setting.SiteAt(0, 0), 100),
			[]setting.NoteCode{setting.NotePresentDay, setting.NoteZeroZero, setting.NoteSideUncertain, setting.NoteOtherMotion, setting.NoteComposed, setting.NoteScreening}},
		{"zero by way of 360", setting.Options{}, setting.SiteAt(360, 0), []setting.NoteCode{setting.NoteZeroZero, setting.NoteSideUncertain, setting.NoteScreening}},
		{"an unknown plate's motion", setting.Options{Motion: "half"}, setting.SiteAt(80, 50), []setting.NoteCode{setting.NoteNoMotion, setting.NoteScreening}},
		{"an unknown plate's motion and a fallback that has none", setting.Options{Motion: "half", Fallback: "half"}, setting.SiteAt(80, 50), []setting.NoteCode{setting.NoteNoMotion, setting.NoteScreening}},
		{"σ of a difference", setting.Options{Motion: "fast"}, setting.SiteAt(80, 50), []setting.NoteCode{setting.NoteSigmaBound, setting.NoteScreening}},
		{"the fallback", setting.Options{Motion: "half", Fallback: "slow"}, setting.SiteAt(80, 50), []setting.NoteCode{setting.NoteOtherMotion, setting.NoteScreening}},
		{"the fallback is not needed", setting.Options{Motion: "slow", Fallback: "fast"}, setting.SiteAt(80, 50), []setting.NoteCode{setting.NoteScreening}},
		{"a composed pole", setting.Options{Motion: "composed"}, setting.SiteAt(80, 50), []setting.NoteCode{setting.NoteComposed, setting.NoteScreening}},
		{"a zone", setting.Options{}, setting.SiteAt(0, 40), []setting.NoteCode{setting.NoteZoneTotal, setting.NoteScreening}},
		{"a zone without motion", setting.Options{Motion: "half"}, setting.SiteAt(0, 40), []setting.NoteCode{setting.NoteNoMotion, setting.NoteScreening}},
		{"a trench without slabs", setting.Options{}, off(t, "trench", 200), []setting.NoteCode{setting.NoteNoSlabs, setting.NoteScreening}},
	} {
		a := answer(t, look(t, c.o), c.site)
		if got := codes(a); !slices.Equal(got, c.want) {
			t.Errorf("%s: %v, want %v", c.name, got, c.want)
		}
		for _, n := range a.Notes.All() {
			if text := n.Text(); len(text) < 20 || text == string(n.Code) {
				t.Errorf("%s: the note %s reads %q", c.name, n.Code, text)
			}
		}
	}
	// what the notes name
	for _, c := range []struct {
		o    setting.Options
		want setting.Note
	}{
		{setting.Options{Motion: "half"}, setting.Note{Code: setting.NoteNoMotion, A: "half", B: "BB"}},
		{setting.Options{Motion: "half", Fallback: "slow"}, setting.Note{Code: setting.NoteOtherMotion, A: "half", B: "slow"}},
		{setting.Options{Motion: "composed"}, setting.Note{Code: setting.NoteComposed, A: "BB", B: "composed:AA"}},
	} {
		for _, lat := range []float64{50, -50} { // from either side
			if a := answer(t, look(t, c.o), setting.SiteAt(80, lat)); !slices.Contains(a.Notes.All(), c.want) {
				t.Errorf("%+v at %g: %v, want %v among them", c.o, lat, a.Notes.All(), c.want)
			}
		}
	}
}

// A site whose nearest boundary is not the one that controls gets each note once.
func TestNotesStandOnce(t *testing.T) {
	l := look(t, setting.Options{Motion: "composed"})
	twice := 0
	for km := 5.0; km < 560; km += 5 {
		for _, dlon := range []float64{0, 19.9, -19.9} {
			s := off(t, "trench", km)
			s.Lon = sphere.WrapLon(s.Lon + dlon)
			a := answer(t, l, s)
			if a.IsControlled && a.Controlling.Boundary != a.Nearest.Boundary {
				twice++
			}
			seen := map[setting.Note]bool{}
			for _, n := range a.Notes.All() {
				if seen[n] {
					t.Errorf("%.0f km off: note %v stands twice", km, n)
				}
				seen[n] = true
			}
		}
	}
	if twice == 0 {
		t.Error("at no site does another boundary than the nearest control; the test needs one")
	}
}

func TestMotionUnknownIsNotAGuess(t *testing.T) {
	a := answer(t, look(t, setting.Options{Motion: "half"}), off(t, "ridge", 15))
	if m := a.Nearest.Motion; m.Known || m.Model != "" || m.Plate != "BB" || m.RelativeTo != "AA" {
		t.Errorf("%+v, want no motion of BB relative to AA", m)
	}
	a = answer(t, look(t, setting.Options{Motion: "half", Fallback: "fast"}), off(t, "ridge", 15))
	if m := a.Nearest.Motion; !m.Known || m.Model != "fast" || math.Abs(m.RateMmYr-fastMmYr) > 1e-6 || a.MotionModel != "half" {
		t.Errorf("%+v of %s, want the fallback's %d mm/yr", m, a.MotionModel, fastMmYr)
	}
}

func TestDistanceSigmaIsThatOfLineAndSite(t *testing.T) {
	s := off(t, "trench", 200)
	if a := answer(t, look(t, setting.Options{}), s); a.Nearest.SigmaKm != 5 {
		t.Errorf("σ %g km, want the line's 5", a.Nearest.SigmaKm)
	}
	s.UncertaintyKm = 12
	if a := answer(t, look(t, setting.Options{}), s); math.Abs(a.Nearest.SigmaKm-13) > 1e-12 || math.Abs(a.Controlling.SigmaKm-13) > 1e-12 {
		t.Errorf("σ %g km, want 13 of 5 and 12", a.Nearest.SigmaKm)
	}
}

func TestNearbyListsOtherTypes(t *testing.T) {
	s := off(t, "trench", 300)
	s.Lon = -141 // a degree from where the ridge begins
	a := answer(t, look(t, setting.Options{}), s)
	if a.Nearest.Boundary.ID() != "trench" || a.Nearby.Len() != 1 || a.Nearby.All()[0].Boundary.ID() != "ridge" {
		t.Fatalf("nearest %s and %d others, want the trench and the ridge", a.Nearest.Boundary.ID(), a.Nearby.Len())
	}
	if n := a.Nearby.All()[0]; !(n.DistanceKm > 300 && n.DistanceKm < 330) || !(n.AzimuthDeg > 90 && n.AzimuthDeg < 180) {
		t.Errorf("the ridge is %.1f km away at %.1f, want it south-east", n.DistanceKm, n.AzimuthDeg)
	}
	if a := answer(t, look(t, setting.Options{Brief: true}), s); a.Nearby.Len() != 0 || a.NearJunction {
		t.Error("a brief answer lists neither nearby boundaries nor a junction")
	}
}

// At the poles longitude means nothing, and ±180 are one meridian.
func TestPolesAndTheAntimeridian(t *testing.T) {
	l := look(t, setting.Options{})
	for _, c := range []struct {
		lat   float64
		plate string
	}{{90, "AA"}, {-90, "BB"}} {
		first := answer(t, l, setting.SiteAt(0, c.lat))
		for _, lon := range []float64{-180, -90, 45, 180, 270, 360} {
			a := answer(t, l, setting.SiteAt(lon, c.lat))
			if a.Plate.Code != c.plate || a.Label != setting.PlateInterior || math.Abs(a.Nearest.DistanceKm-first.Nearest.DistanceKm) > 1e-6 {
				t.Errorf("at the pole, longitude %g: %s, %v, %g km; want %s, an interior, %g km", lon, a.Plate.Code, a.Label, a.Nearest.DistanceKm, c.plate, first.Nearest.DistanceKm)
			}
		}
		if want := 10001.966; math.Abs(first.Nearest.DistanceKm-want) > 0.001 { // the WGS84 quarter meridian
			t.Errorf("%.3f km from pole to equator, want %.3f", first.Nearest.DistanceKm, want)
		}
	}
	for _, lat := range []float64{-3, -0.01, 0.01, 1, 60} {
		var same [2]setting.Answer
		for i, lon := range []float64{-180, 180} {
			if err := l.At(setting.SiteAt(lon, lat), &same[i]); err != nil {
				t.Fatal(err)
			}
		}
		if printed(&same[0]) != printed(&same[1]) || same[0].Site.Lon != 180 {
			t.Errorf("latitude %g: the answers at -180 and 180 differ, or the longitude is %g", lat, same[0].Site.Lon)
		}
	}
	for lon := -180.0; lon < 0; lon += 17 {
		var west, east setting.Answer
		if l.At(setting.SiteAt(lon, 12), &west) != nil || l.At(setting.SiteAt(lon+360, 12), &east) != nil || printed(&west) != printed(&east) {
			t.Errorf("the answers at longitudes %g and %g differ", lon, lon+360)
		}
	}
	// the trench and the vague trench meet there: half a degree either side
	for _, c := range []struct {
		lon  float64
		want string
	}{{179.5, "vague-trench"}, {-179.5, "trench"}, {180.5, "trench"}} {
		if a := answer(t, l, setting.SiteAt(c.lon, 0.2)); a.Nearest.Boundary.ID() != c.want {
			t.Errorf("longitude %g: nearest is %s, want %s", c.lon, a.Nearest.Boundary.ID(), c.want)
		}
	}
}

// printed puts all of an answer that a caller sees into text; NaN equals NaN then.
func printed(a *setting.Answer) string {
	show := func(b *setting.BoundaryAnswer) string {
		return fmt.Sprintf("%s %v %v %v %+v", b.Boundary.ID(), b.DistanceKm, b.SigmaKm, b.Nearest, b.Motion)
	}
	out := fmt.Sprintf("%+v %v %v %v %v %v\n%s\n", a.Site, *a.Plate, a.SideUncertain, a.Label, a.Family, a.Confidence, show(&a.Nearest))
	if a.IsControlled {
		out += show(&a.Controlling)
	}
	for _, r := range a.Reasons.All() {
		out += "\n" + r.Text()
	}
	for _, alt := range a.Alternatives.All() {
		out += fmt.Sprintf("\n%v %v %s", alt.Label, alt.Family, alt.Text())
	}
	for _, n := range a.Nearby.All() {
		out += fmt.Sprintf("\n%s %v %v", n.Boundary.ID(), n.DistanceKm, n.AzimuthDeg)
	}
	for _, s := range a.Slabs.All() {
		out += fmt.Sprintf("\n%s %v %v %v", s.Slab.ID, s.DepthKm, s.ClearanceKm, s.Distance3DKm)
	}
	if a.NearJunction {
		out += fmt.Sprintf("\n%s %v", a.Junction.Junction.Name, a.Junction.DistanceKm)
	}
	if a.Zone != nil {
		out += "\n" + a.Zone.Name
	}
	if a.Hotspot != nil {
		out += fmt.Sprintf("\n%s %v", a.Hotspot.Name, a.HotspotKm)
	}
	return out + fmt.Sprintf("\n%v", a.Notes.All())
}

// randomSites returns sites over the globe, half of them within 700 km of the
// boundaries; the seed is fixed.
func randomSites(n int) []setting.Site {
	r := rand.New(rand.NewPCG(20030314, 5))
	out := make([]setting.Site, n)
	for i := range out {
		s := setting.SiteAt(360*r.Float64()-180, math.Asin(2*r.Float64()-1)*180/math.Pi)
		if i%2 == 0 {
			s.Lat = 12*r.Float64() - 6
		}
		if i%3 == 0 {
			s.UncertaintyKm = 40 * r.Float64()
		}
		if i%5 == 0 {
			s.AgeMa, s.DepthKm = 100*r.Float64(), 100*r.Float64()
		}
		out[i] = s
	}
	return out
}

// The same site gives the same answer: in a used Answer as in a new one, on a
// model built anew, and from many goroutines at once.
func TestAnswersAreRepeatable(t *testing.T) {
	sites := randomSites(400)
	l := look(t, setting.Options{Motion: "fast"})
	want := make([]string, len(sites))
	for i, s := range sites {
		want[i] = printed(answer(t, l, s))
	}
	again, err := must(setting.NewModel(contents())).Lookup(setting.Options{Motion: "fast"})
	if err != nil {
		t.Fatal(err)
	}
	var used setting.Answer
	for i, s := range sites {
		if err := again.At(s, &used); err != nil {
			t.Fatal(err)
		}
		if got := printed(&used); got != want[i] {
			t.Fatalf("%+v:\n%s\nin a used answer, want\n%s", s, got, want[i])
		}
	}
	var wg sync.WaitGroup
	for g := range 4 {
		wg.Go(func() {
			var a setting.Answer
			for k := range sites {
				i := (k + 97*g) % len(sites)
				if err := l.At(sites[i], &a); err != nil {
					t.Errorf("%+v: %v", sites[i], err)
				} else if got := printed(&a); got != want[i] {
					t.Errorf("%+v from goroutine %d:\n%s\nwant\n%s", sites[i], g, got, want[i])
				}
			}
		})
	}
	wg.Wait()
}

func TestLookupAllocatesNothing(t *testing.T) {
	sites := randomSites(64)
	for _, o := range []setting.Options{{}, {Brief: true}, {Motion: "half", Fallback: "composed"}} {
		l := look(t, o)
		var a setting.Answer
		i := 0
		n := testing.AllocsPerRun(200, func() {
			if err := l.At(sites[i%len(sites)], &a); err != nil {
				t.Error(err)
			}
			i++
		})
		if n != 0 {
			t.Errorf("%+v: %.0f allocations a look-up, want none", o, n)
		}
	}
}

func TestModelAt(t *testing.T) {
	a, err := synthetic.At(off(t, "rift", 10))
	if err != nil || a.Label != setting.ContinentalRift || a.Model != synthetic || a.MotionModel != synthetic.DefaultMotion() {
		t.Errorf("%+v, %v", a, err)
	}
	if _, err := synthetic.At(setting.SiteAt(0, 91)); err == nil {
		t.Error("a latitude of 91 must be an error")
	}
}

// An answer reused for a site of which less is known keeps nothing of the first.
func TestAReusedAnswerForgets(t *testing.T) {
	l := look(t, setting.Options{})
	a := answer(t, l, setting.SiteAt(-100, 50))
	if a.Hotspot == nil {
		t.Fatal("no hotspot at the plume")
	}
	if err := l.At(off(t, "trench", 200), a); err != nil || !a.IsControlled || a.Hotspot != nil {
		t.Errorf("at the trench: %v, controlled %v, hotspot %v", err, a.IsControlled, a.Hotspot)
	}
	if err := l.At(setting.SiteAt(80, 50), a); err != nil || a.IsControlled || a.Zone != nil || a.Reasons.Len() != 1 || a.Alternatives.Len() != 0 {
		t.Errorf("in an interior: %v, controlled %v, zone %v, %d reasons, %d alternatives", err, a.IsControlled, a.Zone, a.Reasons.Len(), a.Alternatives.Len())
	}
}
