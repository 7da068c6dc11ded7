package revision_test

import (
	"math"
	"strings"
	"testing"

	"nearmargin/setting"
	"nearmargin/setting/boundary"
	"nearmargin/setting/builtin"
	"nearmargin/setting/bundle"
	"nearmargin/setting/revision"
	"nearmargin/setting/slab"
	"nearmargin/setting/sphere"
)

// changed returns the built-in model after a change of its parts.
func changed(t *testing.T, change func(*bundle.Parts)) *setting.Model {
	t.Helper()
	p := parts(t)
	change(&p)
	b, err := bundle.FromParts(p)
	if err != nil {
		t.Fatal(err)
	}
	return b.Model
}

func parts(t *testing.T) bundle.Parts {
	t.Helper()
	b, err := builtin.Load()
	if err != nil {
		t.Fatal(err)
	}
	p, err := b.Parts()
	if err != nil {
		t.Fatal(err)
	}
	return p
}

// respec builds a boundary of the parts anew.
func respec(t *testing.T, p *bundle.Parts, id string, change func(*boundary.Spec)) {
	t.Helper()
	for i, b := range p.Boundaries {
		if b.ID() != id {
			continue
		}
		s := boundary.Spec{ID: b.ID(), Name: b.Name(), Type: b.Type(), Left: b.Left(), Right: b.Right(), Subducting: b.Subducting(),
			SigmaKm: b.SigmaKm(), Source: b.Source(), SourceStatus: b.SourceStatus(), Path: b.Path()}
		change(&s)
		n, err := boundary.New(s)
		if err != nil {
			t.Fatal(err)
		}
		p.Boundaries[i] = n
		return
	}
	t.Fatalf("there is no boundary %s", id)
}

const trench = "kermadec-trench"

func TestCompare(t *testing.T) {
	same := changed(t, func(*bundle.Parts) {})
	for name, c := range map[string]struct {
		change func(*bundle.Parts)
		part   string
		id     string
		kind   revision.Kind
		says   string
	}{
		"description": {func(p *bundle.Parts) { p.Title = "Another" }, "description", "model.json", revision.Changed, `to "Another"`},
		"plate added": {func(p *bundle.Parts) { p.Plates = append(p.Plates, setting.Plate{Code: "ZZ", Name: "New"}) }, "plate", "ZZ", revision.Added, ""},
		"plate named": {func(p *bundle.Parts) { p.Plates[0].Name = "Other" }, "plate", "AM", revision.Changed, `to "Other"`},
		"type": {func(p *bundle.Parts) {
			respec(t, p, trench, func(s *boundary.Spec) { s.Type = boundary.OceanicConvergent })
		}, "boundary", trench, revision.Changed, "type subduction to oceanic_convergence"},
		"plates exchanged": {func(p *bundle.Parts) {
			respec(t, p, trench, func(s *boundary.Spec) { s.Left, s.Right = s.Right, s.Left })
		}, "boundary", trench, revision.Changed, "left_plate PA to KE"},
		"sigma":           {func(p *bundle.Parts) { respec(t, p, trench, func(s *boundary.Spec) { s.SigmaKm = 77 }) }, "boundary", trench, revision.Changed, "to 77 km"},
		"hotspot removed": {func(p *bundle.Parts) { p.Hotspots = p.Hotspots[1:] }, "hotspot", parts(t).Hotspots[0].Name, revision.Removed, ""},
		"zone's kind":     {func(p *bundle.Parts) { z := *p.Zones[0]; z.Kind = setting.MixedKind; p.Zones[0] = &z }, "diffuse zone", parts(t).Zones[0].Name, revision.Changed, "to mixed"},
		"land removed":    {func(p *bundle.Parts) { p.Land = p.Land[1:] }, "land", parts(t).Land[0].Name, revision.Removed, ""},
		"slab's arc":      {func(p *bundle.Parts) { p.Slabs[0].ArcMinDepthKm = 61 }, "slab", parts(t).Slabs[0].ID, revision.Changed, "to 61 km"},
	} {
		t.Run(name, func(t *testing.T) {
			there := changed(t, c.change)
			r := revision.Compare(same, there)
			if len(r.Changes) != 1 {
				t.Fatalf("%d changes: %s", len(r.Changes), r.Text())
			}
			got := r.Changes[0]
			if got.Part != c.part || got.ID != c.id || got.Kind != c.kind || !strings.Contains(strings.Join(got.Details, "; "), c.says) {
				t.Errorf("%+v", got)
			}
			back := revision.Compare(there, same)
			if len(back.Changes) != 1 || c.kind == revision.Added && back.Changes[0].Kind != revision.Removed || c.kind == revision.Changed && back.Changes[0].Kind != revision.Changed {
				t.Errorf("the other way round: %+v", back.Changes)
			}
		})
	}
	if r := revision.Compare(same, same); len(r.Changes) != 0 || !strings.Contains(r.Text(), "nothing changed") {
		t.Errorf("a model and itself: %s", r.Text())
	}
}

// TestMoveIsInKm moves the inner vertices of a line by a known distance.
func TestMoveIsInKm(t *testing.T) {
	same := changed(t, func(*bundle.Parts) {})
	there := changed(t, func(p *bundle.Parts) {
		respec(t, p, trench, func(s *boundary.Spec) {
			i := len(s.Path) / 2
			s.Path[i] = sphere.Direct(s.Path[i], 100, 40) // roughly square to the trench, which runs north-north-east
		})
	})
	r := revision.Compare(same, there)
	km, id := r.LargestMoveKm()
	if id != trench || km < 30 || km > 40.2 {
		t.Errorf("%s moved %g km; want a little under 40", id, km)
	}
	if !strings.Contains(r.Text(), "largest move of a boundary: ") {
		t.Error(r.Text())
	}
}

func TestVerticesAloneMoveNothing(t *testing.T) {
	same := changed(t, func(*bundle.Parts) {})
	there := changed(t, func(p *bundle.Parts) {
		respec(t, p, trench, func(s *boundary.Spec) {
			a, ok := sphere.NewArc(sphere.FromLonLat(s.Path[0]), sphere.FromLonLat(s.Path[1]))
			if !ok {
				t.Fatal("no arc")
			}
			m := a.Midpoint()
			s.Path = append([]sphere.LonLat{s.Path[0], m.LonLat()}, s.Path[1:]...)
		})
	})
	r := revision.Compare(same, there)
	if len(r.Changes) != 1 || r.Changes[0].MovedKm != 0 || !strings.Contains(r.Changes[0].Details[0], "same line") {
		t.Errorf("%+v", r.Changes)
	}
}

// TestPoleChangeIsInDegreesAndMillimetres doubles a rate: the change at the surface,
// 90° from the pole, is the rate times the Earth's radius.
func TestPoleChangeIsInDegreesAndMillimetres(t *testing.T) {
	same := changed(t, func(*bundle.Parts) {})
	var rate string
	there := changed(t, func(p *bundle.Parts) {
		for i := range p.Motions {
			if p.Motions[i].Info.Name != "pb2002" {
				continue
			}
			for j, row := range p.Motions[i].Rows {
				if row[0] == "NB" {
					rate = row[3]
					row = append([]string(nil), row...)
					row[3] = "1"
					p.Motions[i].Rows[j] = row
				}
			}
		}
	})
	r := revision.Compare(same, there)
	if rate == "" || len(r.Changes) == 0 || r.Changes[0].ID != "pb2002 NB" || !strings.Contains(r.Changes[0].Details[0], "to") || !strings.Contains(r.Changes[0].Details[0], " 1.0000°/Myr") {
		t.Errorf("rate %q: %s", rate, r.Text())
	}
}

// TestSlabDepthChangeIsInKm sinks a slab by 5 km.
func TestSlabDepthChangeIsInKm(t *testing.T) {
	same := changed(t, func(*bundle.Parts) {})
	there := changed(t, func(p *bundle.Parts) {
		cs := slab.Contours(p.Slabs[0].Surface)
		for i := range cs {
			cs[i].DepthKm += 5
		}
		var err error
		if p.Slabs[0].Surface, err = slab.NewContours(cs); err != nil {
			t.Fatal(err)
		}
	})
	r := revision.Compare(same, there)
	if len(r.Changes) != 1 || math.Abs(r.Changes[0].MovedKm-5) > 1e-6 {
		t.Errorf("%s", r.Text())
	}
}
