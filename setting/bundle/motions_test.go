package bundle

import (
	"math"
	"testing"

	"nearmargin/setting/motion"
	"nearmargin/setting/sphere"
)

// Each form gives the same plate in its own units: one degree per Myr is 3.6 mas
// a year, and a place on the rotation's equator then moves by 111.195 mm a year.
func TestMotionFormsInTheirUnits(t *testing.T) {
	const still = "ZZ,0,0,0,"
	for _, c := range []struct {
		name, table         string
		rateSigma, aziSigma float64 // mm/yr and degrees at 90 east on the equator; NaN for none
	}{
		{"pole, σ 5 % of the rate", "plate,lat_deg,lon_deg,rate_deg_myr,rate_sigma_deg_myr,basis\nAA,0,0,1,0.05,published\nZZ,0,0,0.000001,0,published\n", 0.05 * 111.19508, math.NaN()},
		{"pole without σ", "plate,lat_deg,lon_deg,rate_deg_myr,rate_sigma_deg_myr,basis\nAA,0,0,1,,published\n" + still + ",published\n", math.NaN(), math.NaN()},
		// 0.01 mas/yr of 6,371 km are 0.30888 mm/yr; about z it moves the place sideways
		{"components", "plate,wx_mas_yr,wy_mas_yr,wz_mas_yr,sx_mas_yr,sy_mas_yr,sz_mas_yr,basis\nAA,3.6,0,0,0.01,0,0.02,published\n" + still + "0,0,0,published\n", 0.30888, math.Atan(2*0.30888/111.19508) * 180 / math.Pi},
		{"covariance", "plate,wx_mas_yr,wy_mas_yr,wz_mas_yr,cxx,cxy,cxz,cyy,cyz,czz,basis\nAA,3.6,0,0,1e-4,0,0,0,0,4e-4,published\n" + still + "0,0,0,0,0,0,published\n", 0.30888, math.Atan(2*0.30888/111.19508) * 180 / math.Pi},
	} {
		m, _, err := readMotion(motion.Info{Name: "m"}, []byte(c.table))
		if err != nil {
			t.Errorf("%s: %v", c.name, err)
			continue
		}
		at := sphere.FromLonLat(sphere.LonLat{Lon: 90})
		_, north := at.EastNorth()
		r, ok := m.Relative("AA", "ZZ", at, north, true)
		if !ok || math.Abs(r.RateMmYr-111.195) > 0.001 || math.Abs(r.AzimuthDeg) > 1e-9 {
			t.Errorf("%s: %g mm/yr towards %g, want 111.195 northward", c.name, r.RateMmYr, r.AzimuthDeg)
		}
		for _, x := range []struct {
			what           string
			got, want, tol float64
		}{{"rate σ", r.RateSigmaMmYr, c.rateSigma, 1e-4}, {"azimuth σ", r.AzimuthSigmaDeg, c.aziSigma, 1e-4}} {
			if math.IsNaN(x.want) != math.IsNaN(x.got) || math.Abs(x.got-x.want) > x.tol {
				t.Errorf("%s: %s %g, want %g", c.name, x.what, x.got, x.want)
			}
		}
	}
}
