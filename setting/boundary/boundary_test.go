package boundary

import (
	"math"
	"slices"
	"strings"
	"testing"

	"nearmargin/setting/sphere"
)

func TestNewErrors(t *testing.T) {
	tests := []struct {
		name   string
		change func(s *Spec)
		want   string
	}{
		{"no id", func(s *Spec) { s.ID = "" }, "id is empty"},
		{"no name", func(s *Spec) { s.Name = "" }, "name is empty"},
		{"no type", func(s *Spec) { s.Type = Unknown }, "type is missing"},
		{"type out of range", func(s *Spec) { s.Type = NumTypes }, "type is missing"},
		{"no left plate", func(s *Spec) { s.Left = "" }, `left_plate "" and right_plate "NZ" must both be given`},
		{"no right plate", func(s *Spec) { s.Right = "" }, `left_plate "SA" and right_plate "" must both be given`},
		{"one plate on both sides", func(s *Spec) { s.Right = "SA" }, `both "SA"`},
		{"a stranger goes down", func(s *Spec) { s.Subducting = "PA" }, `subducting_plate "PA" is neither left_plate "SA" nor right_plate "NZ"`},
		{"nobody goes down", func(s *Spec) { s.Subducting = "" }, "needs a subducting_plate"},
		{"sigma 0", func(s *Spec) { s.SigmaKm = 0 }, "sigma_km is 0"},
		{"sigma negative", func(s *Spec) { s.SigmaKm = -3 }, "sigma_km is -3"},
		{"sigma not a number", func(s *Spec) { s.SigmaKm = math.NaN() }, "sigma_km is NaN"},
		{"sigma infinite", func(s *Spec) { s.SigmaKm = math.Inf(1) }, "sigma_km is +Inf"},
		{"no source", func(s *Spec) { s.Source = "" }, "source is empty"},
		{"no source status", func(s *Spec) { s.SourceStatus = "" }, `source_status is ""; it must be "memory" or "consulted"`},
		{"a wrong source status", func(s *Spec) { s.SourceStatus = "hearsay" }, `source_status is "hearsay"`},
		{"no path", func(s *Spec) { s.Path = nil }, "has 0 vertices"},
		{"one vertex", func(s *Spec) { s.Path = s.Path[:1] }, "has 1 vertices; at least 2"},
		{"latitude too high", func(s *Spec) { s.Path[1].Lat = 90.5 }, "vertex 2 (-71, 90.5)"},
		{"latitude too low", func(s *Spec) { s.Path[0].Lat = -91 }, "vertex 1 (-71, -91)"},
		{"latitude not a number", func(s *Spec) { s.Path[0].Lat = math.NaN() }, "vertex 1 (-71, NaN)"},
		{"longitude too high", func(s *Spec) { s.Path[2].Lon = 361 }, "vertex 3 (361, -30)"},
		{"longitude too low", func(s *Spec) { s.Path[2].Lon = -181 }, "vertex 3 (-181, -30)"},
		{"longitude infinite", func(s *Spec) { s.Path[2].Lon = math.Inf(-1) }, "vertex 3 (-Inf, -30)"},
		{"a vertex twice", func(s *Spec) { s.Path[1] = s.Path[0] }, "vertices 1 and 2 (-71, -20) coincide or are antipodes"},
		{"a vertex twice, 360° apart", func(s *Spec) { s.Path[1] = at(289, -20) }, "vertices 1 and 2 (-71, -20) coincide"},
		{"a pole twice", func(s *Spec) { s.Path[1], s.Path[2] = at(0, 90), at(50, 90) }, "vertices 2 and 3 (50, 90) coincide"},
		{"antipodes", func(s *Spec) { s.Path[2] = at(109, 25) }, "vertices 2 and 3 (109, 25) coincide or are antipodes"},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			s := spec("chile", Subduction, "SA", "NZ", at(-71, -20), at(-71, -25), at(-72, -30))
			tt.change(&s)
			b, err := New(s)
			if err == nil || !strings.Contains(err.Error(), tt.want) {
				t.Fatalf("error %v, want one with %q", err, tt.want)
			}
			if b != nil {
				t.Error("a boundary comes with the error")
			}
			who := `boundary "chile"`
			if s.ID == "" {
				who = `boundary "Line chile"`
			}
			if !strings.HasPrefix(err.Error(), who+": ") {
				t.Errorf("error %q does not name the boundary", err)
			}
		})
	}
}

func TestNewBoundary(t *testing.T) {
	s := Spec{
		ID: "tonga", Name: "Tonga trench", Type: Subduction, Left: "TO", Right: "PA", Subducting: "PA",
		SigmaKm: 4, Source: "a chart", SourceStatus: Consulted,
		Path: []sphere.LonLat{at(187, -15), at(180, -16), at(-180, -17), at(360, 0)},
	}
	b, err := New(s)
	if err != nil {
		t.Fatal(err)
	}
	got := Spec{b.ID(), b.Name(), b.Type(), b.Left(), b.Right(), b.Subducting(), b.SigmaKm(), b.Source(), b.SourceStatus(), nil}
	want := s
	want.Path = nil
	if got.ID != want.ID || got.Name != want.Name || got.Type != want.Type || got.Left != want.Left || got.Right != want.Right ||
		got.Subducting != want.Subducting || got.SigmaKm != want.SigmaKm || got.Source != want.Source || got.SourceStatus != want.SourceStatus {
		t.Errorf("built from %+v, reads %+v", want, got)
	}
	path := []sphere.LonLat{at(-173, -15), at(180, -16), at(180, -17), at(0, 0)}
	if !slices.Equal(b.Path(), path) {
		t.Errorf("path %v, want it in (-180, 180]: %v", b.Path(), path)
	}
	s.Path[0] = at(1, 1)
	b.Path()[1] = at(2, 2)
	if !slices.Equal(b.Path(), path) {
		t.Error("the boundary shares its path with the caller")
	}
	for _, tt := range []struct {
		plate, want string
		ok          bool
	}{{"TO", "PA", true}, {"PA", "TO", true}, {"AU", "", false}, {"", "", false}} {
		if got, ok := b.Opposite(tt.plate); got != tt.want || ok != tt.ok {
			t.Errorf("Opposite(%q) = %q, %v; want %q, %v", tt.plate, got, ok, tt.want, tt.ok)
		}
	}
}

func TestLengthKm(t *testing.T) {
	b, err := New(spec("equator", SpreadingRidge, "N", "S", at(170, 0), at(180, 0), at(-175, 0)))
	if err != nil {
		t.Fatal(err)
	}
	want := 6378.137 * 15 * math.Pi / 180 // WGS84's equator is a circle
	if math.Abs(b.LengthKm()-want) > 1e-9 {
		t.Errorf("15° of the equator are %v km, want %v", b.LengthKm(), want)
	}
}
