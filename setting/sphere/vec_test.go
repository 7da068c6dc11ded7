package sphere

import (
	"math"
	"math/big"
	"testing"

	"pgregory.net/rapid"
)

func TestFromLonLat(t *testing.T) {
	tests := []struct {
		name string
		in   LonLat
		want Vec
	}{
		{"Gulf of Guinea is X", LonLat{0, 0}, Vec{1, 0, 0}},
		{"90 east is Y", LonLat{90, 0}, Vec{0, 1, 0}},
		{"90 west is -Y", LonLat{-90, 0}, Vec{0, -1, 0}},
		{"270 east is 90 west", LonLat{270, 0}, Vec{0, -1, 0}},
		{"antimeridian", LonLat{180, 0}, Vec{-1, 0, 0}},
		{"antimeridian from the east", LonLat{-180, 0}, Vec{-1, 0, 0}},
		{"45 north", LonLat{0, 45}, Vec{math.Sqrt2 / 2, 0, math.Sqrt2 / 2}},
		{"30 south, 120 east", LonLat{120, -30}, Vec{-math.Sqrt(3) / 4, 0.75, -0.5}},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			if got := FromLonLat(tt.in); got.Sub(tt.want).Norm() > 3e-16 {
				t.Errorf("FromLonLat(%v) = %v, want %v", tt.in, got, tt.want)
			}
		})
	}
	for _, lon := range []float64{-180, -12.5, 0, 77, 180, 360} {
		if got := FromLonLat(LonLat{lon, 90}); got != (Vec{0, 0, 1}) {
			t.Errorf("North Pole with longitude %g is %v, want exactly (0, 0, 1)", lon, got)
		}
		if got := FromLonLat(LonLat{lon, -90}); got != (Vec{0, 0, -1}) {
			t.Errorf("South Pole with longitude %g is %v, want exactly (0, 0, -1)", lon, got)
		}
	}
}

func TestLonLatRoundTrip(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		p := genLonLat().Draw(t, "p")
		v := FromLonLat(p)
		if d := math.Abs(v.Norm() - 1); d > 4e-16 {
			t.Fatalf("|FromLonLat(%v)| differs from 1 by %g", p, d)
		}
		q := v.LonLat()
		if !(q.Lon > -180 && q.Lon <= 180) || !(q.Lat >= -90 && q.Lat <= 90) {
			t.Fatalf("LonLat of %v is %v, out of range", p, q)
		}
		// as places: 1e-15 rad is 6 nm
		if d := apartRad(v, FromLonLat(q)); d > 1e-15 {
			t.Fatalf("%v came back as %v, %g rad away", p, q, d)
		}
		if math.Abs(p.Lat) == 90 && (q.Lon != 0 || q.Lat != p.Lat) {
			t.Fatalf("pole %v came back as %v, want longitude 0", p, q)
		}
		// as numbers, away from the poles where longitude loses meaning
		if math.Abs(p.Lat) < 89 {
			turn := math.Abs(WrapLon(q.Lon - p.Lon))
			if turn > 1e-12 || math.Abs(q.Lat-p.Lat) > 1e-13 {
				t.Fatalf("%v came back as %v", p, q)
			}
		}
	})
}

func TestWrapLon(t *testing.T) {
	tests := []struct{ in, want float64 }{
		{0, 0}, {180, 180}, {-180, 180}, {181, -179}, {-181, 179}, {359, -1}, {360, 0},
		{540, 180}, {-540, 180}, {720, 0}, {-179.5, -179.5}, {190.25, -169.75},
		{math.Nextafter(180, 200), math.Nextafter(180, 200) - 360},
	}
	for _, tt := range tests {
		if got := WrapLon(tt.in); got != tt.want {
			t.Errorf("WrapLon(%v) = %v, want %v", tt.in, got, tt.want)
		}
	}
	rapid.Check(t, func(t *rapid.T) {
		lon := rapid.Float64Range(-1e6, 1e6).Draw(t, "lon")
		got := WrapLon(lon)
		if !(got > -180 && got <= 180) {
			t.Fatalf("WrapLon(%v) = %v, want one in (-180, 180]", lon, got)
		}
		if turns := (lon - got) / 360; math.Abs(turns-math.Round(turns)) > 1e-9 {
			t.Fatalf("WrapLon(%v) = %v, which is another meridian", lon, got)
		}
	})
}

func TestWrap360(t *testing.T) {
	tests := []struct{ in, want float64 }{
		{0, 0}, {360, 0}, {-360, 0}, {-90, 270}, {450, 90}, {359.5, 359.5}, {-0.5, 359.5}, {-1e-300, 0}, {-1e-15, 0}, {725, 5},
	}
	for _, tt := range tests {
		if got := Wrap360(tt.in); got != tt.want {
			t.Errorf("Wrap360(%v) = %v, want %v", tt.in, got, tt.want)
		}
	}
	rapid.Check(t, func(t *rapid.T) {
		deg := rapid.Float64Range(-1e6, 1e6).Draw(t, "deg")
		got := Wrap360(deg)
		if !(got >= 0 && got < 360) {
			t.Fatalf("Wrap360(%v) = %v, want one in [0, 360)", deg, got)
		}
		if turns := (deg - got) / 360; math.Abs(turns-math.Round(turns)) > 1e-9 {
			t.Fatalf("Wrap360(%v) = %v, which is another direction", deg, got)
		}
	})
}

// The sine of an angle between two places on the equator is known without
// trigonometry of the unit under test: the places differ in longitude alone.
func TestAngleAccuracy(t *testing.T) {
	for _, exp := range []int{-13, -12, -10, -9, -6, -4, -2, -1} {
		want := math.Pow(10, float64(exp))
		sin, cos := math.Sincos(want)
		b := Vec{cos, sin, 0}
		if got := Angle(Vec{1, 0, 0}, b); math.Abs(got/want-1) > 1e-15 {
			t.Errorf("Angle over %g rad = %.17g, relative error %g", want, got, got/want-1)
		}
		// the antipode of b is as far short of a half turn; π-want rounds to 4e-16
		if got := Angle(Vec{1, 0, 0}, b.Scale(-1)); math.Abs(math.Pi-got-want) > 9e-16 {
			t.Errorf("Angle over π-%g rad: falls short of π by %.17g", want, math.Pi-got)
		}
	}
	if got := Angle(Vec{1, 0, 0}, Vec{-1, 0, 0}); got != math.Pi {
		t.Errorf("Angle to the antipode = %.17g, want π", got)
	}
	if got := Angle(Vec{0, 1, 0}, Vec{0, 1, 0}); got != 0 {
		t.Errorf("Angle of a place with itself = %g, want 0", got)
	}
	if got := Angle(Vec{0, 1, 0}, Vec{0, 0, -1}); math.Abs(got-math.Pi/2) > 3e-16 {
		t.Errorf("Angle from the equator to a pole = %.17g, want π/2", got)
	}
}

func TestAngleProperties(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		a, b, c := genVec().Draw(t, "a"), genVec().Draw(t, "b"), genVec().Draw(t, "c")
		ab := Angle(a, b)
		if ab < 0 || ab > math.Pi {
			t.Fatalf("Angle = %g, want one in [0, π]", ab)
		}
		if ba := Angle(b, a); ba != ab {
			t.Fatalf("Angle is %g one way and %g the other", ab, ba)
		}
		if want := apartRad(a, b); math.Abs(ab-want) > 2e-15 {
			t.Fatalf("Angle = %.17g, by atan2 %.17g", ab, want)
		}
		if ab > Angle(a, c)+Angle(c, b)+2e-15 {
			t.Fatalf("the way over %v is shorter than the direct one", c)
		}
	})
}

// TestAngleAgainstBigFloat compares near places with the chord in 200 bits.
func TestAngleAgainstBigFloat(t *testing.T) {
	r := seeded(t)
	for range 2000 {
		a := anyVec(r)
		b := near(r, a, math.Pow(10, -12*r.Float64()))
		var sum big.Float
		sum.SetPrec(200)
		for _, d := range [3][2]float64{{a.X, b.X}, {a.Y, b.Y}, {a.Z, b.Z}} {
			x := new(big.Float).SetPrec(200).Sub(new(big.Float).SetPrec(200).SetFloat64(d[0]), new(big.Float).SetPrec(200).SetFloat64(d[1]))
			sum.Add(&sum, x.Mul(x, x))
		}
		chord, _ := sum.Sqrt(&sum).Float64()
		want := 2 * math.Asin(chord/2)
		if got := Angle(a, b); math.Abs(got-want) > 1e-15*want {
			t.Fatalf("Angle(%v, %v) = %.17g, want %.17g", a, b, got, want)
		}
	}
}

// Directions read aloud: what lies where on the globe.
func TestAzimuthReadAloud(t *testing.T) {
	tests := []struct {
		name     string
		from, to LonLat
		want     float64
	}{
		{"from Null Island to the North Pole is north", LonLat{0, 0}, LonLat{0, 90}, 0},
		{"from Null Island to the South Pole is south", LonLat{0, 0}, LonLat{0, -90}, 180},
		{"from Null Island to Sumatra is east", LonLat{0, 0}, LonLat{100, 0}, 90},
		{"from Null Island to the Galapagos is west", LonLat{0, 0}, LonLat{-91, 0}, 270},
		{"from Fiji over the antimeridian is east", LonLat{179, 0}, LonLat{-179, 0}, 90},
		{"from Samoa over the antimeridian is west", LonLat{-179, 0}, LonLat{179, 0}, 270},
		{"a degree up and to the right is north-east", LonLat{20, 0}, LonLat{20.001, 0.001}, 45},
		{"a degree down and to the left is south-west", LonLat{20, 0}, LonLat{19.999, -0.001}, 225},
		{"from 60 north, straight across the Pole, is north", LonLat{30, 60}, LonLat{-150, 60}, 0},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			got := FromLonLat(tt.from).Azimuth(FromLonLat(tt.to))
			if math.Abs(WrapLon(got-tt.want)) > 1e-6 {
				t.Errorf("azimuth %g, want %g", got, tt.want)
			}
		})
	}
}

func TestEastNorthAtPoles(t *testing.T) {
	tests := []struct {
		name        string
		at          LonLat
		east, north Vec
	}{
		// Who comes up the meridian of Greenwich sees 90°E on the right hand.
		{"North Pole", LonLat{0, 90}, Vec{0, 1, 0}, Vec{-1, 0, 0}},
		{"North Pole with another longitude", LonLat{123, 90}, Vec{0, 1, 0}, Vec{-1, 0, 0}},
		// Who leaves the South Pole along Greenwich goes north towards (1, 0, 0).
		{"South Pole", LonLat{0, -90}, Vec{0, 1, 0}, Vec{1, 0, 0}},
		{"Null Island", LonLat{0, 0}, Vec{0, 1, 0}, Vec{0, 0, 1}},
		{"90 east", LonLat{90, 0}, Vec{-1, 0, 0}, Vec{0, 0, 1}},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			east, north := FromLonLat(tt.at).EastNorth()
			if east.Sub(tt.east).Norm() > 1e-15 || north.Sub(tt.north).Norm() > 1e-15 {
				t.Errorf("east %v, north %v; want %v, %v", east, north, tt.east, tt.north)
			}
		})
	}
	// at the North Pole every meridian leaves southward: azimuth 180 - longitude
	// counted from Greenwich; at the South Pole it is the longitude itself
	for _, lon := range []float64{-135, -90, 0, 30, 90, 180} {
		d := FromLonLat(LonLat{lon, 0})
		if got := (Vec{0, 0, 1}).Azimuth(d); math.Abs(WrapLon(got-(180-lon))) > 1e-12 {
			t.Errorf("North Pole, along %g°: azimuth %g, want %g", lon, got, Wrap360(180-lon))
		}
		if got := (Vec{0, 0, -1}).Azimuth(d); math.Abs(WrapLon(got-lon)) > 1e-12 {
			t.Errorf("South Pole, along %g°: azimuth %g, want %g", lon, got, Wrap360(lon))
		}
	}
}

func TestAzimuthOfNothing(t *testing.T) {
	for _, v := range []Vec{{0, 0, 1}, {0, 0, -1}, {1, 0, 0}} {
		if got := v.Azimuth(Vec{}); !math.IsNaN(got) {
			t.Errorf("azimuth of the zero vector at %v = %g, want NaN", v, got)
		}
		if got := v.Azimuth(v); !math.IsNaN(got) {
			t.Errorf("azimuth straight up at %v = %g, want NaN", v, got)
		}
	}
}

func TestEastNorthProperties(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		v := genVec().Draw(t, "v")
		east, north := v.EastNorth()
		for name, x := range map[string]float64{
			"|east|-1": east.Norm() - 1, "|north|-1": north.Norm() - 1,
			"east·north": east.Dot(north), "east·up": east.Dot(v), "north·up": north.Dot(v), "east·axis": east.Z,
		} {
			if math.Abs(x) > 1e-15 {
				t.Fatalf("at %v: %s = %g, want 0", v, name, x)
			}
		}
		if north.Z < -1e-15 {
			t.Fatalf("at %v north points south: %v", v, north)
		}
		az := rapid.Float64Range(0, 359.999).Draw(t, "az")
		sin, cos := math.Sincos(az * math.Pi / 180)
		got := v.Azimuth(east.Scale(7 * sin).Add(north.Scale(7 * cos)).Add(v.Scale(3)))
		if math.Abs(WrapLon(got-az)) > 1e-12 {
			t.Fatalf("at %v: direction built with azimuth %g reads %g", v, az, got)
		}
	})
}

func TestVectorAlgebra(t *testing.T) {
	x, y, z := Vec{1, 0, 0}, Vec{0, 1, 0}, Vec{0, 0, 1}
	if x.Cross(y) != z || y.Cross(z) != x || z.Cross(x) != y {
		t.Error("the frame is not right-handed")
	}
	if got := (Vec{}).Unit(); got != (Vec{}) {
		t.Errorf("unit of the zero vector = %v, want zero", got)
	}
	if got := (Vec{0, 3, 4}).Unit(); got.Sub(Vec{0, 0.6, 0.8}).Norm() > 2e-16 {
		t.Errorf("unit of (0, 3, 4) = %v", got)
	}
}

func TestKmAndRadians(t *testing.T) {
	// (2a+b)/3 with WGS84's a = 6378.137 km, 1/f = 298.257223563
	a := 6378.137
	b := a * (1 - 1/298.257223563)
	if want := (2*a + b) / 3; math.Abs(MeanRadiusKm-want) > 5e-5 {
		t.Errorf("MeanRadiusKm = %v, want %.4f", MeanRadiusKm, want)
	}
	if got := RadToKm(math.Pi); math.Abs(got-20015.115) > 0.001 {
		t.Errorf("half way around is %v km, want 20015.115", got)
	}
	if got := KmToRad(RadToKm(0.25)); math.Abs(got-0.25) > 1e-16 {
		t.Errorf("0.25 rad came back as %v", got)
	}
}
