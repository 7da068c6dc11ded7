package setting_test

import (
	"math"
	"slices"
	"strings"
	"testing"

	"nearmargin/setting"
	"nearmargin/setting/slab"
	"nearmargin/setting/sphere"
)

// arcMinKm is the depth from which the synthetic slab feeds an arc.
const arcMinKm = 80

// withSlab returns the synthetic model with a slab that goes down northward from
// the trench: contours from 10 to 600 km depth, run westward, so that it deepens
// to their right.
func withSlab(tb testing.TB) *setting.Lookup {
	tb.Helper()
	var contours []slab.Contour
	for _, c := range []struct{ depthKm, lat float64 }{{10, 0.3}, {50, 1}, {100, 1.8}, {200, 2.8}, {400, 4.3}, {600, 5.8}} {
		contours = append(contours, slab.Contour{DepthKm: c.depthKm, SigmaKm: 6, Path: []sphere.LonLat{
			{Lon: -148, Lat: c.lat}, {Lon: -156, Lat: c.lat}, {Lon: -164, Lat: c.lat}, {Lon: -172, Lat: c.lat},
		}})
	}
	surface, err := slab.NewContours(contours)
	if err != nil {
		tb.Fatal(err)
	}
	s, err := slab.New(slab.Spec{
		ID: "northward", Name: "Northward", Kind: slab.Subduction, BoundaryIDs: []string{"trench"},
		Subducting: "BB", Overriding: "AA", ArcMinDepthKm: arcMinKm, Source: "made up", SourceStatus: "memory", Surface: surface,
	})
	if err != nil {
		tb.Fatal(err)
	}
	c := contents()
	c.Slabs = []*slab.Slab{s}
	m, err := setting.NewModel(c)
	if err != nil {
		tb.Fatal(err)
	}
	l, err := m.Lookup(setting.Options{})
	if err != nil {
		tb.Fatal(err)
	}
	return l
}

// Over a slab the depth of its top decides, not the distance from the trench.
func TestSlabDepthDecides(t *testing.T) {
	l := withSlab(t)
	seen := map[setting.Label]int{}
	last := 0.0
	for lat := 0.35; lat < 5.8; lat += 0.05 {
		a := answer(t, l, setting.SiteAt(-160, lat))
		if a.Slabs.Len() != 1 {
			t.Fatalf("latitude %.2f: %d slabs below, want 1", lat, a.Slabs.Len())
		}
		z := a.Slabs.All()[0].DepthKm
		if z <= last {
			t.Fatalf("latitude %.2f: the slab's top is at %g km, no deeper than before", lat, z)
		}
		last = z
		var want, also setting.Label
		switch {
		case z < limit(t, "slab_forearc").Value:
			want = setting.Forearc
		case z < arcMinKm:
			want, also = setting.Forearc, setting.VolcanicArc
		case z <= limit(t, "slab_arc").Value:
			want = setting.VolcanicArc
		case z <= limit(t, "slab_arc_maybe").Value:
			want, also = setting.BackArc, setting.VolcanicArc
		case z <= limit(t, "slab_back_arc").Value:
			want = setting.BackArc
		default:
			want, also = setting.PlateInterior, setting.BackArc
		}
		seen[want]++
		if a.Label != want {
			t.Errorf("%.1f km above the slab: %v, want %v", z, a.Label, want)
		}
		if also != setting.NoLabel && !names(a)[also.String()] {
			t.Errorf("%.1f km above the slab: %v with %v, want %v among them", z, a.Label, names(a), also)
		}
		if want == setting.PlateInterior {
			continue
		}
		if r := a.Reasons.All()[0]; r.Slab == nil || r.DepthKm != z || !strings.Contains(r.Text(), "slab Northward") || !strings.Contains(r.Text(), "km depth") {
			t.Errorf("%.1f km above the slab: the reason is %q", z, r.Text())
		}
		if !a.IsControlled || a.Controlling.Boundary.ID() != "trench" {
			t.Errorf("%.1f km above the slab: controlled %v, want by the trench", z, a.IsControlled)
		}
		if slices.Contains(codes(a), setting.NoteNoSlabs) {
			t.Errorf("%.1f km above the slab: a note says that the model has none", z)
		}
	}
	for _, want := range []setting.Label{setting.Forearc, setting.VolcanicArc, setting.BackArc, setting.PlateInterior} {
		if seen[want] == 0 {
			t.Errorf("no site above the slab must be %v; the test needs one", want)
		}
	}
}

func TestSlabDepthIsMovedByItsSigma(t *testing.T) {
	l := withSlab(t)
	met := 0
	for lat := 1.0; lat < 3; lat += 0.01 {
		a := answer(t, l, setting.SiteAt(-160, lat))
		for _, alt := range a.Alternatives.All() {
			if alt.Cause.Kind == setting.CauseDepth {
				met++
				if math.Abs(alt.Cause.By) != 6 || alt.Cause.Name != "Northward" || !strings.Contains(alt.Text(), "6 km") {
					t.Errorf("latitude %.2f: %q of %+v", lat, alt.Text(), alt.Cause)
				}
			}
		}
	}
	if met == 0 {
		t.Error("no alternative is met by the slab's own σ")
	}
}

func TestSiteDepthAgainstTheSlab(t *testing.T) {
	l := withSlab(t)
	at := setting.SiteAt(-160, 2)
	top := answer(t, l, at).Slabs.All()[0].DepthKm
	if none := answer(t, l, at).Slabs.All()[0]; none.Relation != slab.NoRelation || !math.IsNaN(none.ClearanceKm) || !math.IsNaN(none.Distance3DKm) {
		t.Errorf("without a depth: %v, %g km", none.Relation, none.ClearanceKm)
	}
	for _, c := range []struct {
		above float64 // km above the slab's top
		want  slab.Relation
	}{{top, slab.Above}, {10.5, slab.Above}, {9.5, slab.NearInterface}, {-9.5, slab.NearInterface}, {-10.5, slab.Below}} {
		s := at
		s.DepthKm = top - c.above
		x := answer(t, l, s).Slabs.All()[0]
		if x.Relation != c.want || math.Abs(x.ClearanceKm-c.above) > 1e-9 {
			t.Errorf("%g km above: %v with %g km, want %v", c.above, x.Relation, x.ClearanceKm, c.want)
		}
		if !(x.Distance3DKm >= 0) || x.Distance3DKm > math.Abs(c.above)+0.5 {
			t.Errorf("%g km above: the surface is %g km away, want no more than along the vertical", c.above, x.Distance3DKm)
		}
	}
	for depth, want := range map[float64]bool{10: true, 33: true, 11: false, math.NaN(): false} {
		s := at
		s.DepthKm = depth
		if got := slices.Contains(codes(answer(t, l, s)), setting.NoteFixedDepth); got != want {
			t.Errorf("depth %g: note that it may be fixed %v, want %v", depth, got, want)
		}
	}
}

func TestSlabsThatDoNotFitTheModel(t *testing.T) {
	good := withSlab(t).Model().Slabs()[0]
	for _, c := range []struct {
		name   string
		change func(*slab.Slab)
		twice  bool
		want   string
	}{
		{"a plate that is not there", func(s *slab.Slab) { s.Overriding = "CC" }, false, `slab "northward": plate "CC" is not in the table of plates`},
		{"a boundary that is not there", func(s *slab.Slab) { s.BoundaryIDs = []string{"no-trench"} }, false, `slab "northward": boundary_ids: `},
		{"a slab twice", func(*slab.Slab) {}, true, `slab "northward" stands twice`},
	} {
		s := *good
		c.change(&s)
		in := contents()
		in.Slabs = []*slab.Slab{&s}
		if c.twice {
			in.Slabs = append(in.Slabs, &s)
		}
		if _, err := setting.NewModel(in); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: error %v, want one that says %q", c.name, err, c.want)
		}
	}
}
