package bundle

import (
	"encoding/json"
	"math"
	"slices"
	"testing"

	"pgregory.net/rapid"

	"nearmargin/setting/boundary"
	"nearmargin/setting/sphere"
)

// lineAlong returns a boundary along a path, false where the path is none.
func lineAlong(path []sphere.LonLat) (*boundary.Boundary, bool) {
	b, err := boundary.New(boundary.Spec{
		ID: "a", Name: "A", Type: boundary.SpreadingRidge, Left: "AA", Right: "BB",
		SigmaKm: 1, Source: "made up", SourceStatus: boundary.FromMemory, Path: path,
	})
	return b, err == nil
}

// cutAndJoin writes a boundary's geometry and reads it again.
func cutAndJoin(tb rapid.TB, b *boundary.Boundary) (parts [][][]float64, path []sphere.LonLat) {
	tb.Helper()
	g := lineGeometry(b.Path())
	if g.Type == "LineString" {
		parts = make([][][]float64, 1)
		if err := json.Unmarshal(g.Coordinates, &parts[0]); err != nil {
			tb.Fatal(err)
		}
	} else if err := json.Unmarshal(g.Coordinates, &parts); err != nil {
		tb.Fatal(err)
	}
	path, err := joinParts(parts)
	if err != nil {
		tb.Fatalf("%v was cut into %v: %v", b.Path(), parts, err)
	}
	return parts, path
}

func ll(xy ...float64) (out []sphere.LonLat) {
	for i := 0; i < len(xy); i += 2 {
		out = append(out, sphere.LonLat{Lon: xy[i], Lat: xy[i+1]})
	}
	return out
}

func TestCutAtTheAntimeridian(t *testing.T) {
	for _, c := range []struct {
		name string
		path []sphere.LonLat
		want string
	}{
		{"far from it", ll(10, 0, 20, 0), `[[10,0],[20,0]]`},
		{"across, eastward", ll(170, 0, -170, 0), `[[[170,0],[180,0]],[[-180,0],[-170,0]]]`},
		{"across, westward", ll(-170, 2, 170, 2), `[[[-170,2],[-180,2.030828]],[[180,2.030828],[170,2]]]`},
		{"across and back", ll(170, 0, -170, 0, -170, 10, 170, 10), `[[[170,0],[180,0]],[[-180,0],[-170,0],[-170,10],[-180,10.151082]],[[180,10.151082],[170,10]]]`},
		{"ends on it from the west", ll(170, 0, 180, 5), `[[170,0],[180,5]]`},
		{"ends on it from the east", ll(-170, 0, 180, 5), `[[-170,0],[-180,5]]`},
		{"starts on it eastward", ll(180, 5, -170, 0), `[[-180,5],[-170,0]]`},
		{"starts on it westward", ll(180, 5, 170, 0), `[[180,5],[170,0]]`},
		{"a vertex on it, eastward", ll(170, 0, 180, 5, -170, 0), `[[[170,0],[180,5]],[[-180,5],[-170,0]]]`},
		{"a vertex on it, westward", ll(-170, 0, 180, 5, 170, 0), `[[[-170,0],[-180,5]],[[180,5],[170,0]]]`},
		{"touches it from the east", ll(-170, 0, 180, 5, -170, 10), `[[-170,0],[-180,5],[-170,10]]`},
		{"runs along it, then east", ll(170, 0, 180, 5, 180, 10, -170, 12), `[[[170,0],[180,5],[180,10]],[[-180,10],[-170,12]]]`},
		{"runs along it, then west", ll(-170, 0, 180, 5, 180, 10, 170, 12), `[[[-170,0],[-180,5],[-180,10]],[[180,10],[170,12]]]`},
	} {
		b, ok := lineAlong(c.path)
		if !ok {
			t.Fatalf("%s: no path", c.name)
		}
		if got := string(lineGeometry(b.Path()).Coordinates); got != c.want {
			t.Errorf("%s: %s, want %s", c.name, got, c.want)
			continue
		}
		if _, path := cutAndJoin(t, b); !slices.Equal(path, b.Path()) {
			t.Errorf("%s: joined %v, want %v", c.name, path, b.Path())
		}
	}
}

// Another program may cut elsewhere than where the great circle crosses: what it
// wrote at the edge is a vertex then.
func TestJoinKeepsAVertexOnTheEdge(t *testing.T) {
	for _, c := range []struct {
		name  string
		parts [][][]float64
		want  []sphere.LonLat
	}{
		{"cut on the great circle, six decimals", [][][]float64{{{170, 10}, {180, 10.151082}}, {{-180, 10.151082}, {-170, 10}}}, ll(170, 10, -170, 10)},
		{"cut half-way on the map", [][][]float64{{{170, 10}, {180, 10}}, {{-180, 10}, {-170, 10}}}, ll(170, 10, 180, 10, -170, 10)},
		{"cut with more decimals", [][][]float64{{{170, 10}, {180, 10.1510821}}, {{-180, 10.1510821}, {-170, 10}}}, ll(170, 10, 180, 10.1510821, -170, 10)},
		{"heights are dropped", [][][]float64{{{170, 10, 5}, {180, 10, 6}}, {{-180, 10, 7}, {-170, 10, 8}}}, ll(170, 10, 180, 10, -170, 10)},
	} {
		path, err := joinParts(c.parts)
		if err != nil || !slices.Equal(path, c.want) {
			t.Errorf("%s: %v, %v; want %v", c.name, path, err, c.want)
		}
	}
}

// genPath draws paths that cross the antimeridian, touch it and run along it.
func genPath() *rapid.Generator[[]sphere.LonLat] {
	return rapid.Custom(func(t *rapid.T) []sphere.LonLat {
		lon := rapid.OneOf(
			rapid.SampledFrom([]float64{180, 180, -180, 179, -179, 170, -170, 179.999999, -179.999999, 100, -100, 0}),
			rapid.Float64Range(150, 180), rapid.Float64Range(-180, -150), rapid.Float64Range(-180, 180),
		)
		lat := rapid.OneOf(rapid.IntRange(-89, 89).AsAny(), rapid.Float64Range(-89, 89).AsAny(), rapid.SampledFrom([]int{0, 90, -90}).AsAny())
		n := rapid.IntRange(2, 8).Draw(t, "vertices")
		var path []sphere.LonLat
		for range n {
			p := sphere.LonLat{Lon: lon.Draw(t, "lon")}
			switch y := lat.Draw(t, "lat").(type) {
			case int:
				p.Lat = float64(y)
			case float64:
				p.Lat = y
			}
			path = append(path, p)
		}
		return path
	})
}

func TestCutAndJoinGivesTheSamePath(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		b, ok := lineAlong(genPath().Draw(t, "path"))
		if !ok {
			return
		}
		parts, path := cutAndJoin(t, b)
		for i, part := range parts {
			if len(part) < 2 {
				t.Fatalf("part %d of %v has %d positions", i+1, parts, len(part))
			}
			for j := 1; j < len(part); j++ {
				if math.Abs(part[j][0]-part[j-1][0]) > 180 {
					t.Fatalf("part %d of %v jumps from %v to %v", i+1, parts, part[j-1], part[j])
				}
			}
		}
		// a vertex that stands exactly where a cut would may be taken for one
		again, ok := lineAlong(path)
		if !ok {
			t.Fatalf("%v came back as %v, which is no path", b.Path(), path)
		}
		if a, b := string(lineGeometry(again.Path()).Coordinates), string(lineGeometry(b.Path()).Coordinates); a != b {
			t.Fatalf("written again: %s, want %s", a, b)
		}
		kept := path
		for _, p := range b.Path() {
			if len(kept) > 0 && kept[0] == p {
				kept = kept[1:]
			} else if p.Lon != 180 {
				t.Fatalf("%v came back as %v, without %v", b.Path(), path, p)
			}
		}
		if len(kept) > 0 {
			t.Fatalf("%v came back as %v", b.Path(), path)
		}
	})
}
