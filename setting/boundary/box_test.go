package boundary

import (
	"math"
	"slices"
	"strings"
	"testing"

	"nearmargin/setting/sphere"
)

func TestBoxValidate(t *testing.T) {
	nan := math.NaN()
	tests := []struct {
		name string
		b    Box
		want string // "" for a good one
	}{
		{"the Earth", Box{-180, -90, 180, 90}, ""},
		{"over the antimeridian", Box{170, -10, -170, 10}, ""},
		{"over the antimeridian, east of 180", Box{170, -10, 190, 10}, ""},
		{"a point", Box{5, 5, 5, 5}, ""},
		{"longitudes to 360", Box{0, 0, 360, 10}, ""},
		{"south and north exchanged", Box{0, 10, 5, -10}, "south 10 is greater than north -10; the order is west,south,east,north"},
		{"latitude first", Box{-30, -100, -20, 100}, "must be within -90 and 90"},
		{"south of the pole", Box{0, -91, 1, 0}, "south -91"},
		{"north of the pole", Box{0, 0, 1, 91}, "north 91"},
		{"west out of range", Box{-181, 0, 0, 1}, "west -181"},
		{"east out of range", Box{0, 0, 361, 1}, "east 361"},
		{"west not a number", Box{nan, 0, 1, 1}, "west NaN"},
		{"south not a number", Box{0, nan, 1, 1}, "south NaN"},
		{"east not a number", Box{0, 0, nan, 1}, "east NaN"},
		{"north not a number", Box{0, 0, 1, nan}, "north NaN"},
		{"infinite", Box{0, math.Inf(-1), 1, 1}, "south -Inf"},
	}
	n := mustNetwork(t, []Spec{spec("a", SpreadingRidge, "P", "Q", at(0, 0), at(1, 1))})
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			err := tt.b.Validate()
			_, err2 := n.Within(tt.b)
			if tt.want == "" {
				if err != nil || err2 != nil {
					t.Errorf("errors %v, %v; want none", err, err2)
				}
				return
			}
			if err == nil || !strings.Contains(err.Error(), tt.want) {
				t.Errorf("error %v, want one with %q", err, tt.want)
			}
			if err2 == nil {
				t.Error("Within takes it")
			}
		})
	}
}

func within(t *testing.T, n *Network, b Box) []string {
	t.Helper()
	list, err := n.Within(b)
	if err != nil {
		t.Fatal(err)
	}
	ids := []string{}
	for _, x := range list {
		ids = append(ids, x.ID())
	}
	return ids
}

func TestWithinCases(t *testing.T) {
	n := mustNetwork(t, []Spec{
		spec("equator", SpreadingRidge, "P", "Q", at(-20, 0), at(20, 0)),
		spec("greenwich", SpreadingRidge, "P", "Q", at(0, 30), at(0, 50)),
		spec("arched", SpreadingRidge, "P", "Q", at(60, 40), at(120, 40)), // reaches 44.1° north at 90° east
		spec("dateline", SpreadingRidge, "P", "Q", at(180, -40), at(180, -20)),
		spec("over180", SpreadingRidge, "P", "Q", at(170, 10), at(-170, 20)),
		spec("polar", SpreadingRidge, "P", "Q", at(30, 80), at(-150, 80)),
		spec("south", SpreadingRidge, "P", "Q", at(100, -85), at(0, -90)),
	})
	every := []string{"arched", "dateline", "equator", "greenwich", "over180", "polar", "south"}
	tests := []struct {
		name string
		b    Box
		want []string
	}{
		{"the Earth", Box{-180, -90, 180, 90}, every},
		{"the Earth from Greenwich", Box{0, -90, 360, 90}, every},
		{"a square around the crossing of equator and Greenwich: both ends of the line lie outside", Box{-10, -10, 10, 10}, []string{"equator"}},
		{"a square above the equator", Box{-10, 1, 10, 10}, nil},
		{"a square that stands on the equator", Box{-10, 0, 10, 10}, []string{"equator"}},
		{"a strip across Greenwich, both ends outside", Box{-1, 35, 1, 45}, []string{"greenwich"}},
		{"a strip whose edge is Greenwich", Box{0, 35, 5, 45}, []string{"greenwich"}},
		{"a point on the line", Box{0, 40, 0, 40}, []string{"greenwich"}},
		{"a point off it", Box{0.001, 40, 0.001, 40}, nil},
		{"below the arch at its ends' latitude", Box{85, 39, 95, 41}, nil},
		{"in the top of the arch", Box{85, 44, 95, 45}, []string{"arched"}},
		{"above the top of the arch", Box{85, 44.2, 95, 45}, nil},
		{"from 170 east to 170 west", Box{170, -30, -170, 30}, []string{"dateline", "over180"}},
		{"the same, east of 180", Box{170, -30, 190, 30}, []string{"dateline", "over180"}},
		{"up to 180", Box{175, -30, 180, 30}, []string{"dateline", "over180"}},
		{"from -180: the line on 180 is on its edge", Box{-180, -30, -175, 30}, []string{"dateline", "over180"}},
		{"the antimeridian alone, as 180", Box{180, -30, 180, 30}, []string{"dateline", "over180"}},
		{"the antimeridian alone, as -180", Box{-180, -30, -180, 30}, []string{"dateline", "over180"}},
		{"the antimeridian alone, as both", Box{180, -30, -180, 30}, []string{"dateline", "over180"}},
		{"just east of the antimeridian", Box{-179.99, -30, -175, 0}, nil},
		{"the long way round from 170 west to 170 east", Box{-169, -30, 169, 29}, []string{"equator"}},
		{"the Arctic", Box{-180, 85, 180, 90}, []string{"polar"}},
		{"a sector of the Arctic that the line leaves out but for the Pole", Box{60, 85, 90, 90}, []string{"polar"}},
		{"the same sector short of the Pole", Box{60, 85, 90, 89.9}, nil},
		{"a sector on the line", Box{20, 85, 40, 89}, []string{"polar"}},
		{"the sector across", Box{-160, 85, -140, 89}, []string{"polar"}},
		{"the North Pole", Box{0, 90, 0, 90}, []string{"polar"}},
		{"the Antarctic", Box{-180, -90, 180, -80}, []string{"south"}},
		{"a sector of it, as far as the Pole", Box{-10, -90, 10, -88}, []string{"south"}},
		{"a sector of it, short of the Pole", Box{-10, -89.5, 10, -88}, nil},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			if got := within(t, n, tt.b); !slices.Equal(got, tt.want) {
				t.Errorf("Within(%v) = %v, want %v", tt.b, got, tt.want)
			}
		})
	}
}

// A line that passes close by the Pole on one side has a bounding box around the
// whole Pole; it does not reach into a sector on the other side.
func TestWithinNextToPole(t *testing.T) {
	n := mustNetwork(t, []Spec{spec("grazing", SpreadingRidge, "P", "Q", at(30, 80), at(-149.99, 80))})
	tests := []struct {
		name string
		b    Box
		want []string
	}{
		{"the side where it passes", Box{-90, 89, -40, 90}, []string{"grazing"}},
		{"the other side", Box{100, 89, 140, 90}, nil},
		{"the Pole", Box{0, 90, 0, 90}, nil},
		{"all around", Box{-180, 89, 180, 90}, []string{"grazing"}},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			if got := within(t, n, tt.b); !slices.Equal(got, tt.want) {
				t.Errorf("Within(%v) = %v, want %v", tt.b, got, tt.want)
			}
		})
	}
}

// TestWithinAgainstSamples compares with points sampled along every leg: a
// boundary with a point inside must be found, and one that is found must have a
// point inside or close by.
func TestWithinAgainstSamples(t *testing.T) {
	r := seeded(t)
	n := mustNetwork(t, synthetic(r, 24))
	const perLeg = 100
	samples := map[string][]sphere.LonLat{}
	spacing := 0.0
	for i := range n.legs {
		l := &n.legs[i]
		id := n.idOf(int32(i))
		for k := range perLeg + 1 {
			samples[id] = append(samples[id], l.arc.At(float64(k)/perLeg).LonLat())
		}
		spacing = max(spacing, l.arc.Length()/perLeg)
	}
	boxes := 500
	if testing.Short() {
		boxes = 100
	}
	found, missed := 0, 0
	for range boxes {
		b := randomBox(r)
		got := within(t, n, b)
		if !slices.IsSorted(got) {
			t.Fatalf("%v: %v is not sorted", b, got)
		}
		for id, list := range samples {
			least := math.Inf(1)
			for _, q := range list {
				least = min(least, offBox(q, b))
			}
			in := slices.Contains(got, id)
			if least == 0 && !in {
				t.Fatalf("%v: %s has a point inside, but is not found", b, id)
			}
			if in && least > spacing {
				t.Fatalf("%v: %s is found, but is %g rad off", b, id, least)
			}
			if in {
				found++
			} else {
				missed++
			}
		}
	}
	t.Logf("%d boxes, %d boundaries inside, %d outside", boxes, found, missed)
	if found < boxes || missed < boxes {
		t.Error("too few of one kind")
	}
}

// randomBox draws boxes of all sizes, many over ±180° and up to a pole, some
// written with longitudes beyond 180.
func randomBox(r interface {
	Float64() float64
	IntN(int) int
}) Box {
	size := math.Pow(10, 3*r.Float64()) / 1000 // 0.001 to 1
	w := 360*r.Float64() - 180
	if r.IntN(3) == 0 {
		w = 180 - 40*size*r.Float64()
	}
	e := w + 200*size*r.Float64()
	if e > 180 && r.IntN(2) == 0 {
		e = sphere.WrapLon(e)
	}
	e = min(e, 360)
	s := 180*r.Float64() - 90
	n := min(90, s+90*size*r.Float64())
	switch r.IntN(6) {
	case 0:
		n, s = 90, 90-20*size
	case 1:
		s, n = -90, -90+20*size
	}
	return Box{w, s, e, n}
}

// offBox is 0 for a place inside the box, else the angle to the point of the box
// that is reached along a parallel and a meridian.
func offBox(p sphere.LonLat, b Box) float64 {
	span := b.East - b.West
	if span < 0 {
		span += 360
	}
	east := math.Mod(p.Lon-b.West+720, 360) // how far east of the western edge
	q := p
	if east > span {
		if east-span < 360-east {
			q.Lon = b.West + span
		} else {
			q.Lon = b.West
		}
	}
	q.Lat = min(max(p.Lat, b.South), b.North)
	if q == p {
		return 0
	}
	return sphere.Angle(sphere.FromLonLat(p), sphere.FromLonLat(q))
}
