package sphere

import (
	"math"
	"testing"

	"pgregory.net/rapid"
)

func mustArc(tb testing.TB, a, b LonLat) Arc {
	tb.Helper()
	s, ok := NewArc(FromLonLat(a), FromLonLat(b))
	if !ok {
		tb.Fatalf("no arc from %v to %v", a, b)
	}
	return s
}

func TestNewArcDegenerate(t *testing.T) {
	const mm = 0.001 / 111195 // degrees
	tests := []struct {
		name string
		a, b LonLat
		want bool
	}{
		{"one place", LonLat{10, 20}, LonLat{10, 20}, false},
		{"one place, two longitudes", LonLat{180, -5}, LonLat{-180, -5}, false},
		{"one pole, two longitudes", LonLat{0, 90}, LonLat{90, 90}, false},
		{"5 mm apart", LonLat{0, 0}, LonLat{0, 5 * mm}, false},
		{"8 mm apart", LonLat{0, 0}, LonLat{0, 8 * mm}, true},
		{"antipodes", LonLat{30, 40}, LonLat{-150, -40}, false},
		{"pole to pole", LonLat{0, 90}, LonLat{0, -90}, false},
		{"short of antipodes by 5 mm", LonLat{0, 0}, LonLat{180, 5 * mm}, false},
		{"short of antipodes by 8 mm", LonLat{0, 0}, LonLat{180, 8 * mm}, true},
		{"over a pole", LonLat{0, 80}, LonLat{180, 80}, true},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			s, ok := NewArc(FromLonLat(tt.a), FromLonLat(tt.b))
			if ok != tt.want {
				t.Fatalf("NewArc(%v, %v): ok = %v, want %v", tt.a, tt.b, ok, tt.want)
			}
			if ok && math.Abs(s.N.Norm()-1) > 4e-16 {
				t.Errorf("|N| = %.17g, want 1", s.N.Norm())
			}
		})
	}
}

// Read aloud: who walks along the arc has the place on this hand.
func TestArcSides(t *testing.T) {
	tests := []struct {
		name    string
		a, b, p LonLat
		left    bool
	}{
		{"walking north in the Atlantic, Africa is on the right", LonLat{-20, 0}, LonLat{-20, 20}, LonLat{0, 10}, false},
		{"walking north in the Atlantic, America is on the left", LonLat{-20, 0}, LonLat{-20, 20}, LonLat{-50, 10}, true},
		{"walking east on the equator, the north is on the left", LonLat{10, 0}, LonLat{20, 0}, LonLat{15, 1}, true},
		{"walking west on the equator, the north is on the right", LonLat{20, 0}, LonLat{10, 0}, LonLat{15, 1}, false},
		{"walking east over the antimeridian, the south is on the right", LonLat{179, 0}, LonLat{-179, 0}, LonLat{180, -1}, false},
		{"walking from Greenwich over the Pole, 90 west is on the left", LonLat{0, 80}, LonLat{180, 80}, LonLat{-90, 85}, true},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			s := mustArc(t, tt.a, tt.b)
			if got := s.Side(FromLonLat(tt.p)) > 0; got != tt.left {
				t.Errorf("left = %v, want %v", got, tt.left)
			}
		})
	}
	s := mustArc(t, LonLat{10, 0}, LonLat{20, 0})
	if got := s.Side(FromLonLat(LonLat{55, 0})); got != 0 {
		t.Errorf("a place on the equator is %g off an arc of the equator, want 0", got)
	}
	if got := s.A.Azimuth(s.Tangent(s.A)); math.Abs(got-90) > 1e-12 {
		t.Errorf("the tangent of an arc that goes east has azimuth %g", got)
	}
}

func TestNearestCases(t *testing.T) {
	east := mustArc(t, LonLat{-10, 0}, LonLat{10, 0})
	line180 := mustArc(t, LonLat{170, 0}, LonLat{-170, 0})
	tests := []struct {
		name  string
		s     Arc
		p     LonLat
		want  LonLat
		where Where
	}{
		{"above the middle", east, LonLat{3, 5}, LonLat{3, 0}, Inside},
		{"below the middle", east, LonLat{-3, -5}, LonLat{-3, 0}, Inside},
		{"before the first end", east, LonLat{-20, 1}, LonLat{-10, 0}, AtA},
		{"beyond the last end", east, LonLat{20, 1}, LonLat{10, 0}, AtB},
		{"at the first end", east, LonLat{-10, 0}, LonLat{-10, 0}, AtA},
		{"the pole sees the whole arc equally far", east, LonLat{0, 90}, LonLat{-10, 0}, AtA},
		{"over the antimeridian", line180, LonLat{-178, 5}, LonLat{-178, 0}, Inside},
		{"on the antimeridian", line180, LonLat{180, -5}, LonLat{180, 0}, Inside},
		{"from the far side of the Earth", east, LonLat{179, 1}, LonLat{10, 0}, AtB},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			q, where := tt.s.Nearest(FromLonLat(tt.p))
			if where != tt.where || apartRad(q, FromLonLat(tt.want)) > 1e-15 {
				t.Errorf("Nearest = %v, %v; want %v, %v", q.LonLat(), where, tt.want, tt.where)
			}
		})
	}
}

// nearestTolRad is the accuracy that the doc comment of Nearest promises.
func nearestTolRad(s *Arc, p Vec) float64 {
	if s.N.Cross(p).Norm() < 2e-10 {
		return 2e-10
	}
	fromAntipode := math.Pi - max(apartRad(p, s.A), apartRad(p, s.B))
	return 3e-15 + min(3e-8, 1e-15/max(fromAntipode, 1e-15))
}

func TestNearestProperties(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s := genArc().Draw(t, "s")
		p := genVec().Draw(t, "p")
		q, where := s.Nearest(p)
		d := apartRad(p, q)
		if math.Abs(q.Norm()-1) > 1e-15 {
			t.Fatalf("|nearest| - 1 = %g", q.Norm()-1)
		}
		if over := apartRad(s.A, q) + apartRad(q, s.B) - s.Length(); math.Abs(over) > 1e-7 {
			t.Fatalf("the nearest point is not on the arc: A to q to B is %g longer", over)
		}
		if h := s.Side(q); math.Abs(h) > 2e-15 {
			t.Fatalf("the nearest point is %g off the great circle", h)
		}
		for i := range 65 {
			x := s.At(float64(i) / 64)
			if apartRad(p, x) < d-nearestTolRad(&s, p) {
				t.Fatalf("%v at %d/64 is nearer (%.17g) than %v (%.17g, %v)", x, i, apartRad(p, x), q, d, where)
			}
		}
		switch where {
		case AtA:
			if q != s.A {
				t.Fatalf("AtA, but %v is not the first end", q)
			}
		case AtB:
			if q != s.B {
				t.Fatalf("AtB, but %v is not the last end", q)
			}
		case Inside:
			if x := s.Tangent(q).Dot(p); math.Abs(x) > 1e-15 {
				t.Fatalf("inside, but the line of sight is not square: %g", x)
			}
		}
		// the arc back has the same nearest point, unless all are equally far
		back, _ := NewArc(s.B, s.A)
		if q2, _ := back.Nearest(p); math.Abs(apartRad(p, q2)-d) > nearestTolRad(&s, p) {
			t.Fatalf("the arc back is %g away, the arc %g", apartRad(p, q2), d)
		}
	})
}

// TestNearestBruteForce narrows the nearest of many samples down with a ternary
// search, which needs neither foot nor normal.
func TestNearestBruteForce(t *testing.T) {
	r := seeded(t)
	for i := range 3000 {
		a := anyVec(r)
		b := anyVec(r)
		if i%2 == 0 {
			b = near(r, a, 0.05)
		}
		s, ok := NewArc(a, b)
		if !ok {
			continue
		}
		p := anyVec(r)
		if i%3 == 0 {
			p = near(r, a, 0.1)
		}
		at := func(t float64) float64 { return apartRad(p, s.At(t)) }
		best := 0
		const steps = 50
		for k := range steps + 1 {
			if at(float64(k)/steps) < at(float64(best)/steps) {
				best = k
			}
		}
		lo, hi := max(0, float64(best-1)/steps), min(1, float64(best+1)/steps)
		for range 100 {
			x, y := lo+(hi-lo)/3, hi-(hi-lo)/3
			if at(x) < at(y) {
				hi = y
			} else {
				lo = x
			}
		}
		want := at((lo + hi) / 2)
		q, _ := s.Nearest(p)
		if got := apartRad(p, q); math.Abs(got-want) > 1e-14 {
			t.Fatalf("arc %v to %v from %v: %.17g, by search %.17g", a.LonLat(), b.LonLat(), p.LonLat(), got, want)
		}
	}
}

// TestNearestCloseToThePoleOfTheCircle shows what the doc comment says: the foot
// is ill-determined there, the distance is not.
func TestNearestCloseToThePoleOfTheCircle(t *testing.T) {
	r := seeded(t)
	for range 1000 {
		s, ok := NewArc(anyVec(r), anyVec(r))
		if !ok {
			continue
		}
		p := near(r, s.N, 1e-6*r.Float64())
		q, _ := s.Nearest(p)
		want := min(math.Pi/2-apartRad(p, s.N), apartRad(p, s.A), apartRad(p, s.B))
		if d := apartRad(p, q); d < want-2e-15 || d > math.Pi/2+1e-6 {
			t.Fatalf("distance %.17g, less than the great circle's %.17g", d, want)
		}
		for i := range 33 {
			if x := apartRad(p, s.At(float64(i)/32)); x < apartRad(p, q)-nearestTolRad(&s, p) {
				t.Fatalf("an arc's sample is nearer by %g", apartRad(p, q)-x)
			}
		}
	}
}

func TestAtAndMidpoint(t *testing.T) {
	s := mustArc(t, LonLat{170, 0}, LonLat{-150, 0})
	for _, tt := range []struct{ t, lon float64 }{{0, 170}, {0.25, 180}, {0.5, -170}, {0.75, -160}, {1, -150}} {
		if got := s.At(tt.t).LonLat(); math.Abs(WrapLon(got.Lon-tt.lon)) > 1e-12 || math.Abs(got.Lat) > 1e-12 {
			t.Errorf("At(%g) = %v, want %g, 0", tt.t, got, tt.lon)
		}
	}
	over := mustArc(t, LonLat{40, 80}, LonLat{-140, 70})
	if got := over.Midpoint(); math.Abs(got.LonLat().Lat-85) > 1e-12 || math.Abs(got.LonLat().Lon+140) > 1e-10 {
		t.Errorf("midpoint of an arc over the Pole = %v, want -140, 85", got.LonLat())
	}
	rapid.Check(t, func(t *rapid.T) {
		s := genArc().Draw(t, "s")
		if s.Length() > 3.14 { // close to antipodes the sum of the ends loses digits
			return
		}
		f := rapid.Float64Range(0, 1).Draw(t, "f")
		q := s.At(f)
		if got, want := apartRad(s.A, q), f*s.Length(); math.Abs(got-want) > 1e-12 {
			t.Fatalf("At(%g) is %.17g rad along, want %.17g", f, got, want)
		}
		if d := apartRad(s.Midpoint(), s.At(0.5)); d > 1e-12 {
			t.Fatalf("Midpoint is %g rad from At(0.5)", d)
		}
		if s.At(0).Sub(s.A).Norm() > 1e-15 || s.At(1).Sub(s.B).Norm() > 1e-15 {
			t.Fatal("At(0), At(1) are not the ends")
		}
	})
}

func TestCrossCases(t *testing.T) {
	type line struct{ a, b LonLat }
	tests := []struct {
		name string
		s, t line
		want *LonLat
	}{
		{"a plus sign", line{LonLat{-10, 0}, LonLat{10, 0}}, line{LonLat{3, -10}, LonLat{3, 10}}, &LonLat{3, 0}},
		{"side by side", line{LonLat{-10, 0}, LonLat{10, 0}}, line{LonLat{-10, 5}, LonLat{10, 5}}, nil},
		{"one stops short", line{LonLat{-10, 0}, LonLat{10, 0}}, line{LonLat{3, 1}, LonLat{3, 10}}, nil},
		{"the other stops short", line{LonLat{-10, 0}, LonLat{2, 0}}, line{LonLat{3, -10}, LonLat{3, 10}}, nil},
		{"one great circle, overlapping", line{LonLat{-10, 0}, LonLat{10, 0}}, line{LonLat{5, 0}, LonLat{20, 0}}, nil},
		{"a shared end", line{LonLat{-10, 7}, LonLat{10, 3}}, line{LonLat{10, 3}, LonLat{11, 30}}, nil},
		{"an end on the other line", line{LonLat{-10, 0}, LonLat{10, 0}}, line{LonLat{3, 0}, LonLat{3, 10}}, nil},
		{"on opposite sides of the Earth", line{LonLat{-10, 0}, LonLat{10, 0}}, line{LonLat{180, -10}, LonLat{180, 10}}, nil},
		{"on the antimeridian", line{LonLat{170, 1}, LonLat{-170, -1}}, line{LonLat{170, -1}, LonLat{-170, 1}}, &LonLat{180, 0}},
		{"at the Pole", line{LonLat{0, 80}, LonLat{180, 80}}, line{LonLat{90, 80}, LonLat{-90, 80}}, &LonLat{0, 90}},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			s, u := mustArc(t, tt.s.a, tt.s.b), mustArc(t, tt.t.a, tt.t.b)
			sBack, uBack := mustArc(t, tt.s.b, tt.s.a), mustArc(t, tt.t.b, tt.t.a)
			for i, pair := range [][2]*Arc{{&s, &u}, {&u, &s}, {&sBack, &u}, {&s, &uBack}, {&uBack, &sBack}} {
				q, ok := pair[0].Cross(pair[1])
				if ok != (tt.want != nil) {
					t.Fatalf("order %d: crosses = %v (at %v), want %v", i, ok, q.LonLat(), tt.want != nil)
				}
				if ok && apartRad(q, FromLonLat(*tt.want)) > 1e-14 {
					t.Errorf("order %d: cross at %v, want %v", i, q.LonLat(), *tt.want)
				}
			}
		})
	}
}

func TestCrossSharedEndsNeverCross(t *testing.T) {
	r := seeded(t)
	for range 20000 {
		v := anyVec(r)
		s, ok1 := NewArc(near(r, v, 0.01), v)
		u, ok2 := NewArc(v, near(r, v, 0.01))
		if !ok1 || !ok2 {
			continue
		}
		if q, ok := s.Cross(&u); ok {
			t.Fatalf("arcs that share the end %v cross at %v", v, q)
		}
	}
}

// An end laid on the other arc touches it to within rounding; whatever the sign
// of that rounding, it is no crossing.
func TestCrossTouchingEndsDoNotCross(t *testing.T) {
	r := seeded(t)
	for range 20000 {
		s, ok := NewArc(anyVec(r), anyVec(r))
		if !ok || s.Length() > 3 {
			continue
		}
		on := s.At(0.1 + 0.8*r.Float64())
		u, ok := NewArc(on, near(r, on, 0.3))
		if !ok || u.Length() < 1e-3 || math.Abs(u.N.Dot(s.N)) > 0.9 {
			continue
		}
		if q, ok := s.Cross(&u); ok {
			t.Fatalf("an end that touches at %v crosses at %v", on, q)
		}
	}
}

func TestCrossProperties(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s, u := genArc().Draw(t, "s"), genArc().Draw(t, "u")
		q, ok := s.Cross(&u)
		q2, ok2 := u.Cross(&s)
		if ok != ok2 {
			t.Fatalf("crosses one way (%v), not the other (%v)", ok, ok2)
		}
		if !ok {
			return
		}
		if apartRad(q, q2) > 1e-12 {
			t.Fatalf("cross at %v one way, %v the other", q, q2)
		}
		for _, a := range []*Arc{&s, &u} {
			n, _ := a.Nearest(q)
			if d := apartRad(n, q); d > 1e-12 {
				t.Fatalf("the crossing %v is %g rad off an arc", q, d)
			}
		}
	})
	// two arcs laid through one place cross there
	rapid.Check(t, func(t *rapid.T) {
		v := genVec().Draw(t, "v")
		east, north := v.EastNorth()
		dir := func(az float64) Vec {
			sin, cos := math.Sincos(az)
			return east.Scale(sin).Add(north.Scale(cos))
		}
		az := rapid.Float64Range(0, 6).Draw(t, "azimuth")
		turn := rapid.Float64Range(0.1, 3).Draw(t, "turn")
		at := func(az, rad float64) Vec {
			sin, cos := math.Sincos(rad)
			return v.Scale(cos).Add(dir(az).Scale(sin)).Unit()
		}
		len4 := func(name string) float64 { return rapid.Float64Range(1e-4, 1.4).Draw(t, name) }
		s, ok1 := NewArc(at(az, len4("a")), at(az+math.Pi, len4("b")))
		u, ok2 := NewArc(at(az+turn, len4("c")), at(az+turn+math.Pi, len4("d")))
		if !ok1 || !ok2 {
			t.Fatal("no arc")
		}
		q, ok := s.Cross(&u)
		if !ok || apartRad(q, v) > 1e-10 {
			t.Fatalf("arcs through %v: cross %v at %v", v, ok, q)
		}
	})
}
