package builtin_test

import (
	"flag"
	"math"
	"math/rand/v2"
	"testing"
	"time"

	"nearmargin/setting"
	"nearmargin/setting/sphere"
)

var seedFlag = flag.Uint64("seed", 20030314, "seed of the random tests; 0 takes one from the clock")

// scattered returns n places spread evenly over the sphere, land and ocean.
func scattered(tb testing.TB, n int) []sphere.LonLat {
	tb.Helper()
	seed := *seedFlag
	if seed == 0 {
		seed = uint64(time.Now().UnixNano())
	}
	tb.Logf("random places: repeat with -seed %d", seed)
	r := rand.New(rand.NewPCG(seed, 2))
	out := make([]sphere.LonLat, n)
	for i := range out {
		out[i] = sphere.LonLat{Lon: 360*r.Float64() - 180, Lat: math.Asin(2*r.Float64()-1) * 180 / math.Pi}
	}
	return out
}

var _ = setting.High
