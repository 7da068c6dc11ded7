package sphere

import (
	"flag"
	"math"
	"math/rand/v2"
	"testing"
	"time"

	"pgregory.net/rapid"
)

var seedFlag = flag.Uint64("seed", 20030314, "seed of the random tests; 0 takes one from the clock")

// seeded returns a random source for one test and logs the seed that repeats it.
func seeded(tb testing.TB) *rand.Rand {
	tb.Helper()
	seed := *seedFlag
	if seed == 0 {
		seed = uint64(time.Now().UnixNano())
	}
	tb.Logf("random test: repeat with -seed %d", seed)
	return rand.New(rand.NewPCG(seed, 1))
}

// anyVec returns a unit vector, evenly spread over the sphere.
func anyVec(r *rand.Rand) Vec {
	z := 2*r.Float64() - 1
	sin, cos := math.Sincos(2 * math.Pi * r.Float64())
	h := math.Sqrt(1 - z*z)
	return Vec{h * cos, h * sin, z}
}

// near returns a unit vector at most rad away from v.
func near(r *rand.Rand, v Vec, rad float64) Vec {
	return v.Add(anyVec(r).Scale(math.Tan(rad) * r.Float64())).Unit()
}

// genLonLat draws positions; poles, the equator and the antimeridian come often.
func genLonLat() *rapid.Generator[LonLat] {
	return rapid.Custom(func(t *rapid.T) LonLat {
		lon := rapid.OneOf(
			rapid.Float64Range(-180, 180),
			rapid.SampledFrom([]float64{-180, -90, 0, 90, 180, 179.9999999, -179.9999999}),
		).Draw(t, "lon")
		lat := rapid.OneOf(
			rapid.Float64Range(-90, 90),
			rapid.SampledFrom([]float64{-90, -89.9999999, 0, 89.9999999, 90}),
		).Draw(t, "lat")
		return LonLat{lon, lat}
	})
}

func genVec() *rapid.Generator[Vec] {
	return rapid.Map(genLonLat(), FromLonLat)
}

func genArc() *rapid.Generator[Arc] {
	return rapid.Custom(func(t *rapid.T) Arc {
		for {
			if s, ok := NewArc(genVec().Draw(t, "a"), genVec().Draw(t, "b")); ok {
				return s
			}
		}
	})
}

// apartRad is the angle between two places by another formula than [Angle]:
// atan2 of the norms of the vector and the scalar product.
func apartRad(a, b Vec) float64 {
	return math.Atan2(a.Cross(b).Norm(), a.Dot(b))
}
