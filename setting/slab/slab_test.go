package slab

import (
	"math"
	"strings"
	"testing"

	"nearmargin/setting/sphere"
)

func goodSpec(tb testing.TB) Spec {
	return Spec{
		ID: "front", Name: "Front", Kind: Subduction, BoundaryIDs: []string{"b-1"}, Subducting: "BB", Overriding: "AA",
		ArcMinDepthKm: 80, Source: "made up", SourceStatus: "memory", Surface: southward(tb, 0),
	}
}

func TestNew(t *testing.T) {
	spec := goodSpec(t)
	s, err := New(spec)
	if err != nil {
		t.Fatal(err)
	}
	spec.BoundaryIDs[0] = "changed"
	if s.BoundaryIDs[0] != "b-1" || s.ID != "front" || s.ArcMinDepthKm != 80 {
		t.Errorf("%+v", s.Spec)
	}
	for name, change := range map[string]func(*Spec){
		"least depth of an arc": func(s *Spec) { s.ArcMinDepthKm = 60 }, "greatest depth of an arc": func(s *Spec) { s.ArcMinDepthKm = 100 },
		"no boundaries": func(s *Spec) { s.BoundaryIDs = nil }, "one plate": func(s *Spec) { s.Overriding = "BB" }, "consulted": func(s *Spec) { s.SourceStatus = "consulted" },
		"collision": func(s *Spec) { s.Kind = Collision },
	} {
		spec := goodSpec(t)
		change(&spec)
		if _, err := New(spec); err != nil {
			t.Errorf("%s: %v", name, err)
		}
	}
}

func TestNewErrors(t *testing.T) {
	for _, c := range []struct {
		name   string
		change func(*Spec)
		want   string
	}{
		{"no id", func(s *Spec) { s.ID = "" }, `slab "": id is empty`},
		{"no name", func(s *Spec) { s.Name = "" }, `slab "front": name is empty`},
		{"no kind", func(s *Spec) { s.Kind = NoKind }, `slab "front": kind is missing; the kinds are [subduction collision]`},
		{"unknown kind", func(s *Spec) { s.Kind = 9 }, `kind is missing; the kinds are`},
		{"no lower plate", func(s *Spec) { s.Subducting = "" }, `subducting_plate "" and overriding_plate "AA" must both be given`},
		{"no upper plate", func(s *Spec) { s.Overriding = "" }, `subducting_plate "BB" and overriding_plate "" must both be given`},
		{"arc too shallow", func(s *Spec) { s.ArcMinDepthKm = 59.9 }, "arc_min_depth_km is 59.9; it must be within 60 and 100"},
		{"arc too deep", func(s *Spec) { s.ArcMinDepthKm = 100.1 }, "arc_min_depth_km is 100.1"},
		{"arc not a number", func(s *Spec) { s.ArcMinDepthKm = math.NaN() }, "arc_min_depth_km is NaN"},
		{"no source", func(s *Spec) { s.Source = "" }, "source is empty"},
		{"status unknown", func(s *Spec) { s.SourceStatus = "hearsay" }, `source_status is "hearsay"; it must be "memory" or "consulted"`},
		{"no surface", func(s *Spec) { s.Surface = nil }, "has neither contours nor a grid"},
	} {
		spec := goodSpec(t)
		c.change(&spec)
		if s, err := New(spec); err == nil || !strings.Contains(err.Error(), c.want) || s != nil {
			t.Errorf("%s: %v, error %v; want %q", c.name, s, err, c.want)
		}
	}
}

func TestKinds(t *testing.T) {
	for _, k := range AllKinds {
		if got, err := ParseKind(k.String()); err != nil || got != k {
			t.Errorf("%v parses as %v, %v", k, got, err)
		}
	}
	for _, s := range []string{"", "none", "Subduction", "sinking"} {
		if k, err := ParseKind(s); err == nil || !strings.Contains(err.Error(), "the kinds are [subduction collision]") {
			t.Errorf("%q parses as %v, %v", s, k, err)
		}
	}
	if got := Kind(7).String(); got != "Kind(7)" {
		t.Errorf("kind 7 is %q", got)
	}
}

// Of a million rows each asks every slab.
func TestAtDoesNotAllocate(t *testing.T) {
	grid := must[Surface](t)(NewGrid(Layers{Depth: layer(0, -2, 0.5, 9, 5, func(lon, lat float64) float64 { return 10 - 80*lat })}))
	for name, s := range map[string]Surface{"contours": southward(t, 0), "grid": grid} {
		for where, p := range map[string]sphere.Vec{"inside": at(2.3, -1.2), "past the rim": at(2.3, -2.3), "far away": at(200, 40)} {
			var in bool
			if n := testing.AllocsPerRun(100, func() {
				if _, in = s.At(p); !in {
					_, in = s.Outside(p, 100)
				}
			}); n != 0 {
				t.Errorf("%s, %s: %g allocations", name, where, n)
			}
			if in != (where != "far away") {
				t.Errorf("%s: %s: near %v", name, where, in)
			}
		}
	}
}

func BenchmarkAt(b *testing.B) {
	s := southward(b, 0)
	p := at(2.3, -1.2)
	for b.Loop() {
		if r, in := s.At(p); !in || math.Abs(r.DepthKm-74) > 0.1 {
			b.Fatalf("inside %v, depth %g", in, r.DepthKm)
		}
	}
}

func BenchmarkDistance3D(b *testing.B) {
	s := &Slab{Spec: Spec{Surface: southward(b, 0)}}
	p := at(2.3, -1.2)
	for b.Loop() {
		if d := s.Distance3D(p, 20); !(d > 30 && d < 54) {
			b.Fatalf("distance %g", d)
		}
	}
}
