package builtin_test

import (
	"cmp"
	"math"
	"slices"
	"strings"
	"testing"

	"nearmargin/setting"
	"nearmargin/setting/boundary"
	"nearmargin/setting/motion"
	"nearmargin/setting/sphere"
)

// knows reports whether a motion model has both plates of a boundary.
func knows(mm *motion.Model, b *boundary.Boundary) bool { return mm.Has(b.Left()) && mm.Has(b.Right()) }

// Signs as the trade states them: any text on the tectonics of these places.
func TestSignsAsTheTradeStatesThem(t *testing.T) {
	rightLateral := func(r motion.Relative) bool { return r.ShearMmYr > math.Abs(r.OpeningMmYr) }
	leftLateral := func(r motion.Relative) bool { return -r.ShearMmYr > math.Abs(r.OpeningMmYr) }
	opening := func(r motion.Relative) bool { return r.OpeningMmYr > math.Abs(r.ShearMmYr) }
	converging := func(r motion.Relative) bool { return -r.OpeningMmYr > math.Abs(r.ShearMmYr) }
	for _, c := range []struct {
		says   string
		name   string
		kind   boundary.Type
		models string
		share  float64 // of the legs: lines bend
		is     func(motion.Relative) bool
	}{
		{"the San Andreas is right-lateral", "San Andreas", boundary.ContinentalTransform, "nnr-morvel56 itrf2014 pb2002", 1, rightLateral},
		{"the North Anatolian fault is right-lateral", "North Anatolian", boundary.ContinentalTransform, "nnr-morvel56 pb2002", 0.9, rightLateral},
		{"the Queen Charlotte fault is right-lateral", "Queen Charlotte", boundary.ContinentalTransform, "nnr-morvel56 itrf2014 pb2002", 0.9, rightLateral},
		{"the Alpine Fault is right-lateral", "Alpine Fault", boundary.ContinentalTransform, "nnr-morvel56 itrf2014 pb2002", 0.9, rightLateral},
		{"the Dead Sea fault is left-lateral", "Dead Sea", boundary.ContinentalTransform, "nnr-morvel56 itrf2014 pb2002", 0.8, leftLateral},
		{"the East Anatolian fault is left-lateral", "East Anatolian", boundary.ContinentalTransform, "nnr-morvel56 pb2002", 0.8, leftLateral},
		{"the Mid-Atlantic Ridge opens", "Mid-Atlantic Ridge", boundary.SpreadingRidge, "nnr-morvel56 itrf2014 pb2002", 0.95, opening},
		{"the East Pacific Rise opens", "East Pacific Rise", boundary.SpreadingRidge, "nnr-morvel56 pb2002", 1, opening},
		{"India and Asia converge in the Himalaya", "Himalayan front", boundary.ContinentalConvergent, "nnr-morvel56 itrf2014 pb2002", 0.75, converging},
		{"Nazca goes under Chile", "Chile Trench", boundary.Subduction, "nnr-morvel56 itrf2014 pb2002", 0.95, converging},
		{"the Pacific goes under Japan", "Japan Trench", boundary.Subduction, "nnr-morvel56 pb2002", 0.95, converging},
	} {
		for _, name := range strings.Fields(c.models) {
			mm, n, good := motionModel(t, name), 0, 0
			for _, b := range named(t, c.name) {
				if b.Type() != c.kind || !knows(mm, b) {
					continue
				}
				for _, r := range across(t, mm, b) {
					n++
					if c.is(r) {
						good++
					}
				}
			}
			if n == 0 || float64(good) < c.share*float64(n) {
				t.Errorf("%s, %s: true of %d legs of %d, want %.0f %%", c.says, name, good, n, 100*c.share)
			}
		}
	}
	// at Kathmandu's longitude the convergence is square to the front
	r, _ := relativeAt(motionModel(t, "nnr-morvel56"), "IN", "EU", 85.3, 26.8)
	if !(r.RateMmYr > 30 && r.RateMmYr < 60) || !(r.AzimuthDeg < 45 || r.AzimuthDeg > 315) {
		t.Errorf("India moves by %.1f mm/yr towards %.0f seen from Nepal's side, want 30 to 60 and northward", r.RateMmYr, r.AzimuthDeg)
	}
}

// spread is a leg of a ridge: full opening rate and length.
type spread struct{ mmYr, km float64 }

// ridges returns all legs of ridges between the pairs of plates, such as "NU SA",
// the slowest first.
func ridges(t *testing.T, mm *motion.Model, pairs ...string) []spread {
	t.Helper()
	var out []spread
	for _, b := range model(t).Network().Boundaries() {
		pair := []string{b.Left(), b.Right()}
		slices.Sort(pair)
		if b.Type() != boundary.SpreadingRidge || !slices.Contains(pairs, strings.Join(pair, " ")) || !knows(mm, b) {
			continue
		}
		path := b.Path()
		if math.Abs(path[0].Lat) > 66 {
			continue // the Arctic is an ocean of its own
		}
		for i, r := range across(t, mm, b) {
			km, _ := sphere.Inverse(path[i], path[i+1])
			out = append(out, spread{r.OpeningMmYr, km})
		}
	}
	if len(out) == 0 {
		t.Fatalf("no ridge between %v", pairs)
	}
	slices.SortFunc(out, func(a, b spread) int { return cmp.Compare(a.mmYr, b.mmYr) })
	return out
}

func meanRate(s []spread) float64 {
	sum, km := 0.0, 0.0
	for _, x := range s {
		sum, km = sum+x.mmYr*x.km, km+x.km
	}
	return sum / km
}

// Common practice, no source: "the Atlantic opens by 10 to 20 mm a year and is
// the slowest of the large oceans; the south-east Pacific opens by some 180".
// The first figure is near the half rate of the models and the second above
// their full rate, so the order of the oceans and their ratio are asserted, and
// the figures are told side by side.
func TestSpreadingRatesOfTheOceans(t *testing.T) {
	for _, name := range []string{"nnr-morvel56", "pb2002"} {
		mm := motionModel(t, name)
		atlantic := ridges(t, mm, "NU SA", "NA NU", "EU NA")
		indian := ridges(t, mm, "AN AU", "AN CP", "CP SM", "IN SM", "AU CP", "AN SM", "AN LW", "AN NU")
		pacific := ridges(t, mm, "NZ PA", "CO PA", "AN PA")
		southEast := ridges(t, mm, "NZ PA") // without the Easter and Juan Fernandez microplates
		a, i, p, fastest := meanRate(atlantic), meanRate(indian), meanRate(pacific), southEast[len(southEast)-1].mmYr
		t.Logf("%s: Atlantic, full rate: %.0f to %.0f, mean %.0f mm/yr (quoted: 10 to 20; half the mean is %.0f)", name, atlantic[0].mmYr, atlantic[len(atlantic)-1].mmYr, a, a/2)
		t.Logf("%s: south-east Pacific, full rate: at most %.0f mm/yr (quoted: 180)", name, fastest)
		t.Logf("%s: mean of the Indian Ocean %.0f, of the Pacific %.0f mm/yr", name, i, p)
		if !(a < i && i < p) {
			t.Errorf("%s: means %.1f, %.1f and %.1f mm/yr; want Atlantic below Indian below Pacific", name, a, i, p)
		}
		if ratio := fastest / a; !(ratio > 4.5 && ratio < 8) {
			t.Errorf("%s: the south-east Pacific opens %.1f times as fast as the Atlantic, want 4.5 to 8", name, ratio)
		}
	}
	// the two ends of the table of relative motions above, as published poles give them
	nnr := motionModel(t, "nnr-morvel56")
	slow, _ := relativeAt(nnr, "EU", "NA", -18, 65)
	fast, _ := relativeAt(nnr, "NZ", "PA", -113, -30)
	if ratio := fast.RateMmYr / slow.RateMmYr; math.Abs(ratio-145.8/18.5) > 0.15 {
		t.Errorf("ratio of the two rates %.2f, want %.2f", ratio, 145.8/18.5)
	}
}

// trenchKm returns the distance to the nearest subduction boundary.
func trenchKm(t *testing.T, lon, lat float64) (float64, *boundary.Boundary) {
	t.Helper()
	h, ok := model(t).Network().NearestOf(boundary.PlaceAt(sphere.LonLat{Lon: lon, Lat: lat}), boundary.Subduction, "", boundary.AnyRole, 20000)
	if !ok {
		t.Fatalf("no trench within 20,000 km of %g, %g", lon, lat)
	}
	return h.DistanceKm, h.Boundary
}

// Where the trenches are, as every map of them shows.
func TestTrenchesAreWhereTheyShouldBe(t *testing.T) {
	for _, c := range []struct {
		place      string
		lon, lat   float64
		minKm      float64
		maxKm      float64
		subducting string // where there is one
	}{
		{"Esmeraldas, west coast of South America", -79.65, 0.97, 0, 250, "NZ"},
		{"Lima, west coast of South America", -77.04, -12.05, 0, 250, "NZ"},
		{"Antofagasta, west coast of South America", -70.4, -23.65, 0, 250, "NZ"},
		{"Valparaiso, west coast of South America", -71.62, -33.05, 0, 250, "NZ"},
		{"Padang, Indonesia", 100.35, -0.95, 0, 350, ""},
		{"Cilacap, Indonesia", 109, -7.7, 0, 350, "AU"},
		{"Bali, Indonesia", 115.2, -8.7, 0, 350, "AU"},
		{"Sendai, Japan", 141, 38.25, 0, 350, "PA"},
		{"Kochi, Japan", 133.5, 33.55, 0, 250, "PS"},
		{"Laoag, Philippines", 120.6, 18.2, 0, 250, "SU"},
		{"Davao, Philippines", 125.6, 7.1, 0, 250, "PS"},
		{"Napier, North Island of New Zealand", 176.9, -39.5, 0, 250, "PA"},
		{"Barbados, Caribbean", -59.55, 13.2, 0, 250, ""},
		{"South Sandwich Islands", -26.5, -57.8, 0, 250, ""},

		{"St John's, east coast of North America", -52.7, 47.6, 800, 20000, ""},
		{"New York, east coast of North America", -74, 40.7, 800, 20000, ""},
		{"Charleston, east coast of North America", -79.9, 32.8, 800, 20000, ""},
		{"Recife, east coast of South America", -34.9, -8.05, 800, 20000, ""},
		{"Rio de Janeiro, east coast of South America", -43.2, -22.9, 800, 20000, ""},
		{"Mar del Plata, east coast of South America", -57.5, -38, 800, 20000, ""},
		{"Mombasa, east Africa", 39.7, -4.05, 800, 20000, ""},
		{"Maputo, east Africa", 32.6, -25.95, 800, 20000, ""},
		{"Mogadishu, east Africa", 45.3, 2.05, 800, 20000, ""},
		{"Kanyakumari, south India", 77.55, 8.08, 800, 20000, ""},
		{"Perth, west Australia", 115.85, -31.95, 800, 20000, ""},
		{"Carnarvon, west Australia", 113.65, -24.9, 800, 20000, ""},
	} {
		km, b := trenchKm(t, c.lon, c.lat)
		if km < c.minKm || km > c.maxKm {
			t.Errorf("%s: %s is %.0f km away, want a trench %g to %g km away", c.place, b.Name(), km, c.minKm, c.maxKm)
		}
		if c.subducting != "" && b.Subducting() != c.subducting {
			t.Errorf("%s: %s goes down at %s, want %s", c.place, b.Subducting(), b.Name(), c.subducting)
		}
	}
}

// arms returns the types of boundary that leave a place within reachKm, by pair
// of plates.
func arms(t *testing.T, lon, lat, reachKm float64, types ...boundary.Type) map[string]boundary.Type {
	t.Helper()
	out := map[string]boundary.Type{}
	at := sphere.LonLat{Lon: lon, Lat: lat}
	for _, b := range model(t).Network().Boundaries() {
		if !slices.Contains(types, b.Type()) {
			continue
		}
		for _, p := range b.Path() {
			if km, _ := sphere.Inverse(at, p); km <= reachKm {
				pair := []string{b.Left(), b.Right()}
				slices.Sort(pair)
				out[strings.Join(pair, " ")] = b.Type()
			}
		}
	}
	return out
}

func TestThreeArmsMeet(t *testing.T) {
	nnr := motionModel(t, "nnr-morvel56")
	for _, c := range []struct {
		name     string
		lon, lat float64
		types    []boundary.Type
		pairs    string
	}{
		{"three ridges in the middle of the Indian Ocean", 70, -25.5, []boundary.Type{boundary.SpreadingRidge}, "AN CP, AN SM, CP SM"},
		{"three arms at Afar", 42, 11.7, []boundary.Type{boundary.SpreadingRidge, boundary.ContinentalRift}, "AR NU, AR SM, NU SM"},
	} {
		got := arms(t, c.lon, c.lat, 250, c.types...)
		for pair := range strings.SplitSeq(c.pairs, ", ") {
			if _, ok := got[pair]; !ok {
				t.Errorf("%s: none between %s, only %v", c.name, pair, got)
				continue
			}
			if r, ok := relativeAt(nnr, pair[:2], pair[3:], c.lon, c.lat); !ok || r.RateMmYr < 3 {
				t.Errorf("%s: %s part by %.1f mm/yr", c.name, pair, r.RateMmYr)
			}
		}
		near := slices.ContainsFunc(model(t).Junctions(), func(j setting.Junction) bool {
			km, _ := sphere.Inverse(j.At, sphere.LonLat{Lon: c.lon, Lat: c.lat})
			return km < 150
		})
		if !near {
			t.Errorf("%s: no triple junction within 150 km", c.name)
		}
	}
}

// Along California one long transform joins the spreading in the Gulf of
// California with that off Oregon (Atwater 1970, GSA Bull. 81, 3513), and
// subduction begins again where it ends.
func TestCaliforniaJoinsTwoRidges(t *testing.T) {
	san := slices.DeleteFunc(named(t, "San Andreas"), func(b *boundary.Boundary) bool { return b.Type() != boundary.ContinentalTransform })
	var ends []sphere.LonLat
	for _, b := range san {
		p := b.Path()
		ends = append(ends, p[0], p[len(p)-1])
	}
	slices.SortFunc(ends, func(a, b sphere.LonLat) int { return cmp.Compare(a.Lat, b.Lat) })
	south, north := ends[0], ends[len(ends)-1]
	if km, _ := sphere.Inverse(south, north); km < 1000 {
		t.Errorf("the San Andreas is %.0f km from end to end, want more than 1,000", km)
	}
	// follow shared ends along lines that carry no subduction
	reach := func(from sphere.LonLat, pairs ...string) map[string]bool {
		found, todo, done := map[string]bool{}, []sphere.LonLat{from}, map[string]bool{}
		for len(todo) > 0 {
			at := todo[0]
			todo = todo[1:]
			for _, b := range model(t).Network().Boundaries() {
				pair := []string{b.Left(), b.Right()}
				slices.Sort(pair)
				p := b.Path()
				first, last := p[0], p[len(p)-1]
				if done[b.ID()] || !slices.Contains(pairs, strings.Join(pair, " ")) || b.Type() == boundary.Subduction || first != at && last != at || slices.Contains(san, b) {
					continue
				}
				done[b.ID()] = true
				if b.Type() == boundary.SpreadingRidge {
					found[b.Name()] = true
					continue
				}
				todo = append(todo, first, last)
			}
		}
		return found
	}
	if got := reach(south, "NA PA"); len(got) == 0 {
		t.Errorf("southward from %v no ridge is reached", south)
	}
	if got := reach(north, "JF PA"); !got["Gorda Ridge"] {
		t.Errorf("northward from %v the Gorda Ridge is not reached, only %v", north, got)
	}
	km, trench := trenchKm(t, north.Lon, north.Lat)
	if km > 1 || trench.Subducting() != "JF" {
		t.Errorf("at the north end of the San Andreas %s is %.0f km away and %s goes down, want Cascadia to begin there", trench.Name(), km, trench.Subducting())
	}
	if km, trench := trenchKm(t, -119, 34.8); km < 300 {
		t.Errorf("southern California is %.0f km from %s, want no trench there", km, trench.Name())
	}
}

func TestIndiaAgainstAsiaIsContinentAgainstContinent(t *testing.T) {
	for _, p := range []sphere.LonLat{{Lon: 78, Lat: 30.4}, {Lon: 84, Lat: 27.6}, {Lon: 91, Lat: 27}} {
		a, err := model(t).At(setting.SiteAt(p.Lon, p.Lat))
		if err != nil {
			t.Fatal(err)
		}
		b := a.Nearest.Boundary
		if b.Type() != boundary.ContinentalConvergent || b.Subducting() == "EU" || a.Family != setting.CollisionFamily {
			t.Errorf("%v: nearest is %s, %v, %q below, family %v; want continent against continent, Asia not below, collision", p, b.Name(), b.Type(), b.Subducting(), a.Family)
		}
	}
}

func TestSubductionFamilies(t *testing.T) {
	for _, c := range []struct {
		place    string
		lon, lat float64
	}{
		{"Sendai, Japan", 141, 38.25}, {"Kochi, Japan", 133.5, 33.55},
		{"Laoag, Philippines", 120.6, 18.2}, {"Davao, Philippines", 125.6, 7.1},
		{"Napier, North Island of New Zealand", 176.9, -39.5}, {"Gisborne, North Island of New Zealand", 178, -38.65},
	} {
		a, err := model(t).At(setting.SiteAt(c.lon, c.lat))
		if err != nil {
			t.Fatal(err)
		}
		if a.Family != setting.SubductionFamily {
			t.Errorf("%s: %v of family %v, want subduction", c.place, a.Label, a.Family)
		}
	}
}

// An interior is no promise: New Madrid, Bhuj, Charleston, Newcastle and Tennant
// Creek have had damaging earthquakes within plates.
func TestAnInteriorNeverReadsAsNoEarthquakes(t *testing.T) {
	interiors := 0
	for _, p := range []sphere.LonLat{
		{Lon: -89.5, Lat: 36.5}, {Lon: 70.3, Lat: 23.4}, {Lon: -80, Lat: 32.9}, {Lon: 151.7, Lat: -32.9}, {Lon: 134, Lat: -19.8},
		{Lon: 24.8, Lat: -28.7}, {Lon: -55, Lat: -10}, {Lon: 60, Lat: 60}, {Lon: 25, Lat: 62}, {Lon: -155.5, Lat: 19.5},
	} {
		a, err := model(t).At(setting.SiteAt(p.Lon, p.Lat))
		if err != nil {
			t.Fatal(err)
		}
		if a.Label != setting.PlateInterior {
			continue
		}
		interiors++
		r := a.Reasons.All()[0]
		text := r.Text()
		if !strings.Contains(text, "earthquakes") || !strings.Contains(text, "possible") {
			t.Errorf("%v: the reason %q must say that earthquakes are possible", p, text)
		}
		for _, n := range a.Notes.All() {
			text += " " + n.Text()
		}
		for _, bad := range []string{"no earthquake", "without earthquake", "aseismic", "safe", "no hazard", "stable"} {
			if strings.Contains(strings.ToLower(text), bad) {
				t.Errorf("%v: %q says %q", p, text, bad)
			}
		}
		if !slices.ContainsFunc(a.Notes.All(), func(n setting.Note) bool { return n.Code == setting.NoteScreening }) {
			t.Errorf("%v: no note says what the answer is not for", p)
		}
	}
	if interiors < 5 {
		t.Errorf("only %d of the sites are interiors; the test needs more", interiors)
	}
	table := strings.ToLower(strings.Join(strings.Fields(setting.RuleTable()), " "))
	if !strings.Contains(table, setting.PlateInterior.String()) || !strings.Contains(table, "earthquakes and volcanism within plates are possible") {
		t.Error("the rule table does not say that earthquakes within plates are possible")
	}
}
