package slab

import (
	"math"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"nearmargin/setting/sphere"
)

var nan = math.NaN()

func TestNodesComeBackExactly(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		step := rapid.SampledFrom([]float64{0.02, 0.05, 0.1, 0.2, 1. / 3, 1}).Draw(t, "step")
		west := rapid.SampledFrom([]float64{-180, -75.35, 0, 130.05, 179, 359}).Draw(t, "west")
		south := rapid.SampledFrom([]float64{-66.6, -0.4, 0, 44.05}).Draw(t, "south")
		cols, rows := rapid.IntRange(2, 9).Draw(t, "cols"), rapid.IntRange(2, 9).Draw(t, "rows")
		depth := layer(west, south, step, cols, rows, func(float64, float64) float64 {
			if rapid.IntRange(0, 4).Draw(t, "hole") == 0 {
				return nan
			}
			return rapid.Float64Range(0, 700).Draw(t, "depth")
		})
		depth.Values[0] = 55.5 // at least one node
		s, err := NewGrid(Layers{Depth: depth})
		if err != nil {
			t.Fatal(err)
		}
		for row := range rows {
			for col := range cols {
				want := float64(depth.Values[row*cols+col])
				r, in := s.At(at(west+float64(col)*step, south+float64(row)*step))
				if in == math.IsNaN(want) || in && r.DepthKm != want {
					t.Fatalf("node %d, %d: inside %v, depth %v, want %v", col, row, in, r.DepthKm, want)
				}
			}
		}
	})
}

// A plane in longitude and latitude is what bilinear interpolation gives exactly,
// with slopes known in closed form.
func TestPlaneBetweenNodes(t *testing.T) {
	const south, step, a, b = 40.0, 0.25, 24.0, 8.0 // km a degree to the east, to the north
	for _, west := range []float64{-75, 178.5, 358.5, -180} {
		depth := layer(west, south, step, 13, 9, func(lon, lat float64) float64 { return 100 + a*(lon-west) + b*(lat-south) })
		sigma := layer(west, south, step, 13, 9, func(lon, lat float64) float64 { return 4 + (lon - west) })
		thick := layer(west, south, step, 13, 9, func(lon, lat float64) float64 { return 60 + (lat - south) })
		s := must[Surface](t)(NewGrid(Layers{Depth: depth, Sigma: sigma, Thickness: thick}))
		for _, x := range []float64{0, 0.1, 1.13, 2.99, 3} {
			for _, y := range []float64{0, 0.37, 1.0, 1.99, 2} {
				r, in := s.At(at(west+x, south+y))
				if !in {
					t.Errorf("%g, %g is outside", west+x, south+y)
					continue
				}
				// slopes are those at the nearest node
				lat := south + math.Round(y/step)*step
				east, north := a/(kmPerDeg*math.Cos(lat*math.Pi/180)), b/kmPerDeg
				for _, q := range []struct {
					what           string
					got, want, tol float64
				}{
					{"depth", r.DepthKm, 100 + a*x + b*y, 1e-4}, {"σ", r.SigmaKm, 4 + x, 1e-5}, {"thickness", r.ThicknessKm, 60 + y, 1e-4},
					{"dip", r.DipDeg, math.Atan(math.Hypot(east, north)) * 180 / math.Pi, 1e-3},
					{"dip azimuth", r.DipAzimuthDeg, math.Atan2(east, north) * 180 / math.Pi, 1e-2},
				} {
					if !(math.Abs(q.got-q.want) <= q.tol) {
						t.Errorf("%g, %g: %s %.6f, want %.6f", west+x, south+y, q.what, q.got, q.want)
					}
				}
			}
		}
		for _, p := range [][2]float64{{-0.01, 1}, {3.01, 1}, {1, -0.01}, {1, 2.01}, {180, -81}} {
			if r, in := s.At(at(west+p[0], south+p[1])); in {
				t.Errorf("%g, %g is inside at %g km", west+p[0], south+p[1], r.DepthKm)
			}
		}
	}
}

func TestLongitudesOfEitherRange(t *testing.T) {
	f := func(lon, lat float64) float64 { return 100 + 10*(lon-236) + lat }
	s := must[Surface](t)(NewGrid(Layers{Depth: layer(236, 42, 0.5, 9, 9, f)})) // as 0…360
	for _, lon := range []float64{-123.2, 236.8, 236.8 + 360} {
		if r, in := s.At(at(lon, 43.1)); !in || math.Abs(r.DepthKm-(100+8+43.1)) > 1e-4 {
			t.Errorf("at %g: inside %v, depth %g, want 151.1", lon, in, r.DepthKm)
		}
	}
}

func TestHoles(t *testing.T) {
	// 5 by 5 nodes a degree apart with one missing in the middle
	depth := layer(0, 0, 1, 5, 5, func(lon, lat float64) float64 {
		if lon == 2 && lat == 2 {
			return nan
		}
		return 50 + 10*lon
	})
	s := must[Surface](t)(NewGrid(Layers{Depth: depth}))
	for _, c := range []struct {
		lon, lat float64
		in       bool
	}{
		{2, 2, false}, {1.5, 1.5, false}, {2.99, 2.99, false}, {1.01, 2, false}, // in the four cells around the hole
		{1, 1, true}, {1, 2, true}, {1, 1.5, true}, {3, 2.5, true}, // on the edges of those cells that do not end at it
		{0.99, 2, true}, {3.01, 2, true}, {0.5, 0.5, true},
	} {
		r, in := s.At(at(c.lon, c.lat))
		if in != c.in || in && math.Abs(r.DepthKm-(50+10*c.lon)) > 1e-4 {
			t.Errorf("%g, %g: inside %v, depth %g; want %v", c.lon, c.lat, in, r.DepthKm, c.in)
		}
	}
	// beside the hole and at the rim slopes are one-sided: the plane's all the same
	for _, p := range [][2]float64{{0, 2}, {1, 2}, {3, 2}, {4, 2}, {2, 1}, {2, 0}} {
		r, _ := s.At(at(p[0], p[1]))
		want := math.Atan(10/(kmPerDeg*math.Cos(p[1]*math.Pi/180))) * 180 / math.Pi
		if math.Abs(r.DipDeg-want) > 1e-3 || math.Abs(r.DipAzimuthDeg-90) > 1e-3 {
			t.Errorf("node %v: dip %g towards %g, want %g towards 90", p, r.DipDeg, r.DipAzimuthDeg, want)
		}
	}
	// one-sided where the surface bends: the slope of the side that is there
	bent := layer(0, 0, 1, 3, 3, func(lon, lat float64) float64 { return 50 + 10*lon*lon })
	s = must[Surface](t)(NewGrid(Layers{Depth: bent}))
	for lon, rise := range []float64{10, 20, 30} { // forward, central, backward difference
		r, _ := s.At(at(float64(lon), 0))
		if want := math.Atan(rise/kmPerDeg) * 180 / math.Pi; math.Abs(r.DipDeg-want) > 1e-3 {
			t.Errorf("node %d: dip %g, want %g", lon, r.DipDeg, want)
		}
	}
}

func TestFlatGridHasNoDipAzimuth(t *testing.T) {
	s := must[Surface](t)(NewGrid(Layers{Depth: layer(0, 0, 1, 3, 3, func(float64, float64) float64 { return 100 })}))
	r, in := s.At(at(1.2, 0.7))
	if !in || r.DipDeg != 0 || !math.IsNaN(r.DipAzimuthDeg) || !math.IsNaN(r.SigmaKm) || !math.IsNaN(r.ThicknessKm) {
		t.Errorf("inside %v, %+v; want dip 0, and neither azimuth, σ nor thickness", in, r)
	}
}

func TestDipAndStrikeLayers(t *testing.T) {
	flat := func(v float64) *Layer { return layer(10, 20, 1, 4, 4, func(float64, float64) float64 { return v }) }
	depth := layer(10, 20, 1, 4, 4, func(lon, lat float64) float64 { return 100 + 20*(lon-10) }) // to the east
	for _, c := range []struct {
		name        string
		dip, strike *Layer
		wantDip     float64
		wantAzimuth float64
	}{
		{"neither", nil, nil, math.Atan(20/(kmPerDeg*math.Cos(21*math.Pi/180))) * 180 / math.Pi, 90},
		{"dip alone", flat(33), nil, 33, 90},
		{"strike alone", nil, flat(10), math.Atan(20/(kmPerDeg*math.Cos(21*math.Pi/180))) * 180 / math.Pi, 100},
		{"both", flat(33), flat(200), 33, 290},
		{"the strike just west of north", flat(33), flat(359), 33, 89}, // right-hand rule
		{"a strike below 0", flat(33), flat(-100), 33, 350},
		{"layers without values", flat(nan), flat(nan), math.Atan(20/(kmPerDeg*math.Cos(21*math.Pi/180))) * 180 / math.Pi, 90},
	} {
		s := must[Surface](t)(NewGrid(Layers{Depth: depth, Dip: c.dip, Strike: c.strike}))
		r, in := s.At(at(11.3, 21.2))
		if !in || math.Abs(r.DipDeg-c.wantDip) > 1e-3 || math.Abs(r.DipAzimuthDeg-c.wantAzimuth) > 1e-3 {
			t.Errorf("%s: inside %v, dip %g towards %g; want %g towards %g", c.name, in, r.DipDeg, r.DipAzimuthDeg, c.wantDip, c.wantAzimuth)
		}
	}
	// the strike of the nearest node, so that 359 and 1 do not make 180
	strike := layer(10, 20, 1, 4, 4, func(lon, lat float64) float64 { return map[bool]float64{true: 359, false: 1}[lon < 11.5] })
	s := must[Surface](t)(NewGrid(Layers{Depth: depth, Strike: strike}))
	for lon, want := range map[float64]float64{11.4: 89, 11.6: 91} {
		if r, _ := s.At(at(lon, 21.2)); math.Abs(r.DipAzimuthDeg-want) > 1e-3 {
			t.Errorf("at %g: dip azimuth %g, want %g", lon, r.DipAzimuthDeg, want)
		}
	}
}

func TestOutsideOfGrid(t *testing.T) {
	// a slab that goes down to the west, 30 km a degree, across ±180°
	s := must[Surface](t)(NewGrid(Layers{Depth: layer(178, -1, 0.5, 9, 5, func(lon, lat float64) float64 { return 20 + 30*(182-lon) })}))
	for _, c := range []struct {
		name     string
		lon, lat float64
		beyond   Beyond
		km       float64
		depthKm  float64
	}{
		{"past the rim", 177.4, 0, PastRim, 0.6 * kmPerDeg, 140},
		{"past the northern end", 180, 1.6, PastEnd, 0.6 * kmPerDeg, 80},
		{"past the southern end", -179, -1.6, PastEnd, 0.6 * kmPerDeg, 50},
		{"before the start", -177.4, 0, BeforeStart, 0.6 * kmPerDeg, 20},
	} {
		p := at(c.lon, c.lat)
		o, near := s.Outside(p, 100)
		if _, in := s.At(p); in || !near || o.Beyond != c.beyond || math.Abs(o.Km-c.km) > 0.05 || math.Abs(o.Reading.DepthKm-c.depthKm) > 1e-3 {
			t.Errorf("%s: inside %v, near %v, %+v; want beyond %d at %.2f km, depth %g", c.name, in, near, o, c.beyond, c.km, c.depthKm)
		}
		if o, near := s.Outside(p, c.km-1); near {
			t.Errorf("%s: %g km is within %g km", c.name, o.Km, c.km-1)
		}
	}
}

// Every place in a cell whose four nodes have a depth lies inside, up to the rim.
func TestNoPlaceWithinCellsIsLost(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		south := rapid.Float64Range(-80, 70).Draw(t, "south")
		step := rapid.SampledFrom([]float64{0.05, 0.5, 2}).Draw(t, "step")
		cols, rows := rapid.IntRange(2, 8).Draw(t, "cols"), rapid.IntRange(2, 5).Draw(t, "rows")
		s, err := NewGrid(Layers{Depth: layer(100, south, step, cols, rows, func(lon, lat float64) float64 { return 100 + lon - 100 })})
		if err != nil {
			t.Fatal(err)
		}
		x := rapid.Float64Range(0, float64(cols-1)).Draw(t, "x")
		y := rapid.OneOf(rapid.Float64Range(0, float64(rows-1)), rapid.SampledFrom([]float64{0, float64(rows - 1)})).Draw(t, "y")
		if r, in := s.At(at(100+x*step, south+y*step)); !in || math.Abs(r.DepthKm-(100+x*step)) > 1e-4 {
			t.Fatalf("%g, %g: inside %v, depth %g; want %g", 100+x*step, south+y*step, in, r.DepthKm, 100+x*step)
		}
	})
}

func TestGridLayersComeBack(t *testing.T) {
	want := Layers{Depth: layer(0, 0, 1, 2, 2, func(lon, lat float64) float64 { return 10 })}
	s := must[Surface](t)(NewGrid(want))
	if got, ok := GridLayers(s); !ok || got != want {
		t.Errorf("layers %+v, %v; want %+v", got, ok, want)
	}
	if c := Contours(s); c != nil {
		t.Errorf("a grid has contours %+v", c)
	}
}

func TestNewGridErrors(t *testing.T) {
	good := func() *Layer { return layer(0, 0, 1, 3, 3, func(lon, lat float64) float64 { return 50 }) }
	with := func(f func(*Layer)) *Layer { l := good(); f(l); return l }
	for _, c := range []struct {
		name string
		in   Layers
		want string
	}{
		{"no depth", Layers{Sigma: good()}, "the depth layer is missing"},
		{"one column", Layers{Depth: layer(0, 0, 1, 1, 9, func(lon, lat float64) float64 { return 50 })}, "depth: 9 values on a grid of 1 by 9 nodes with step 1"},
		{"one row", Layers{Depth: layer(0, 0, 1, 9, 1, func(lon, lat float64) float64 { return 50 })}, "depth: 9 values on a grid of 9 by 1"},
		{"a value missing", Layers{Depth: with(func(l *Layer) { l.Values = l.Values[1:] })}, "depth: 8 values on a grid of 3 by 3"},
		{"step of 0", Layers{Depth: with(func(l *Layer) { l.Step = 0 })}, "with step 0"},
		{"step not a number", Layers{Depth: with(func(l *Layer) { l.Step = nan })}, "with step NaN"},
		{"another size", Layers{Depth: good(), Sigma: layer(0, 0, 1, 3, 4, func(lon, lat float64) float64 { return 5 })}, "sigma: its nodes are not those of the depth layer"},
		{"another corner", Layers{Depth: good(), Dip: with(func(l *Layer) { l.West = 1 })}, "dip: its nodes are not those"},
		{"another step", Layers{Depth: good(), Strike: with(func(l *Layer) { l.Step = 0.5 })}, "strike: its nodes are not those"},
		{"a layer that is short", Layers{Depth: good(), Thickness: with(func(l *Layer) { l.Values = nil })}, "thickness: 0 values on a grid"},
		{"nothing but holes", Layers{Depth: with(func(l *Layer) {
			for i := range l.Values {
				l.Values[i] = float32(nan)
			}
		})}, "depth: no node has a value"},
		{"depths below 0", Layers{Depth: with(func(l *Layer) { l.Values[5] = -50 })}, "depth: the node at 2, 1 has -50; it must be within 0 and 800, km positive down"},
		{"too deep", Layers{Depth: with(func(l *Layer) { l.Values[0] = 801 })}, "depth: the node at 0, 0 has 801; it must be within 0 and 800"},
		{"depth without bound", Layers{Depth: with(func(l *Layer) { l.Values[0] = float32(math.Inf(1)) })}, "depth: the node at 0, 0 has +Inf"},
		{"σ below 0", Layers{Depth: good(), Sigma: with(func(l *Layer) { l.Values[0] = -1 })}, "sigma: the node at 0, 0 has -1; it must be within 0 and 800"},
		{"dip over 90", Layers{Depth: good(), Dip: with(func(l *Layer) { l.Values[0] = 90.5 })}, "dip: the node at 0, 0 has 90.5; it must be within 0 and 90"},
		{"strike over 360", Layers{Depth: good(), Strike: with(func(l *Layer) { l.Values[0] = 999 })}, "strike: the node at 0, 0 has 999; it must be within -360 and 360"},
		{"thickness below 0", Layers{Depth: good(), Thickness: with(func(l *Layer) { l.Values[0] = -80 })}, "thickness: the node at 0, 0 has -80; it must be within 0 and 800"},
	} {
		t.Run(c.name, func(t *testing.T) {
			if s, err := NewGrid(c.in); err == nil || !strings.Contains(err.Error(), c.want) || s != nil {
				t.Errorf("%v, error %v; want %q", s, err, c.want)
			}
		})
	}
}

// Bilinear depth lies between those of the four nodes around.
func TestBilinearStaysBetweenItsNodes(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s := genGrid().Draw(t, "grid")
		l, _ := GridLayers(s)
		x, y := rapid.Float64Range(0, 29.99).Draw(t, "x"), rapid.Float64Range(0, 29.99).Draw(t, "y")
		col, row := int(x), int(y)
		lo, hi := math.Inf(1), math.Inf(-1)
		for _, n := range []float64{l.Depth.node(col, row), l.Depth.node(col+1, row), l.Depth.node(col, row+1), l.Depth.node(col+1, row+1)} {
			lo, hi = min(lo, n), max(hi, n)
		}
		p := sphere.FromLonLat(sphere.LonLat{Lon: l.Depth.West + x*l.Depth.Step, Lat: l.Depth.South + y*l.Depth.Step})
		if r, in := s.At(p); !in || r.DepthKm < lo-1e-3 || r.DepthKm > hi+1e-3 || r.DipDeg < 0 || r.DipDeg > 90 {
			t.Fatalf("%g, %g: inside %v, %+v; want %g to %g km", x, y, in, r, lo, hi)
		}
	})
}
