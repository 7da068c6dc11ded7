package annotate

import (
	"errors"
	"math"
	"strings"
	"testing"
)

func TestDepthOptions(t *testing.T) {
	for _, c := range []struct {
		name      string
		o         Options
		parameter string // at fault; "" for none
		detail    string
	}{
		{"default", Options{}, "", ""},
		{"metres below sea level", Options{DepthColumn: "tvd", DepthUnit: "m"}, "", ""},
		{"feet below ground", Options{DepthColumn: "tvd", DepthUnit: "ft", DepthDatum: "ground", ElevationColumn: "gl"}, "", ""},
		{"unknown unit", Options{DepthUnit: "fathom"}, "depth_unit", "km, m or ft"},
		{"unknown datum", Options{DepthDatum: "kelly bushing"}, "depth_datum", "sea_level or ground"},
		{"along the hole as datum", Options{DepthDatum: "along_hole"}, "depth_datum", "true vertical depth"},
		{"along the hole by the column's name", Options{DepthColumn: "MD"}, "depth_column", "true vertical depth"},
		{"measured depth", Options{DepthColumn: "measured_depth"}, "depth_column", "along the hole"},
		{"ground without elevation", Options{DepthDatum: "ground"}, "elevation_column", "positive up"},
		{"elevation without ground", Options{ElevationColumn: "gl"}, "elevation_column", "depth_datum=ground"},
	} {
		t.Run(c.name, func(t *testing.T) {
			err := c.o.fill()
			if c.parameter == "" {
				if err != nil {
					t.Fatal(err)
				}
				return
			}
			var input *InputError
			if !errors.As(err, &input) || input.Parameter != c.parameter || !strings.Contains(input.Detail, c.detail) {
				t.Errorf("got %v, want a fault of %s with %q", err, c.parameter, c.detail)
			}
		})
	}
}

func TestDepthOfSite(t *testing.T) {
	ground := Options{DepthColumn: "tvd", DepthUnit: "m", DepthDatum: "ground", ElevationColumn: "gl"}
	feet := Options{DepthColumn: "tvd", DepthUnit: "ft"}
	for _, c := range []struct {
		name             string
		o                Options
		depth, elevation string
		want             float64 // km below sea level; NaN for none
		fault            string
	}{
		{"km", Options{DepthColumn: "z"}, "12.5", "", 12.5, ""},
		{"feet", feet, "10000", "", 3.048, ""},
		{"below ground", ground, "2500", "400", 2.1, ""},
		{"above sea level", ground, "100", "1,600", math.NaN(), `elevation: "1,600"`},
		{"shallower than the ground is high", ground, "100", "1600", -1.5, ""},
		{"no depth", ground, "", "", math.NaN(), ""},
		{"no depth, elevation known", ground, "-999.25", "20", math.NaN(), ""},
		{"no elevation", ground, "100", "", math.NaN(), "elevation: is missing"},
	} {
		t.Run(c.name, func(t *testing.T) {
			if err := c.o.fill(); err != nil {
				t.Fatal(err)
			}
			s, err := c.o.site(cells{lon: "1", lat: "2", depth: c.depth, elevation: c.elevation}, false)
			if c.fault != "" {
				if err == nil || !strings.Contains(err.Error(), c.fault) {
					t.Errorf("got %v, want %q", err, c.fault)
				}
				return
			}
			if err != nil {
				t.Fatal(err)
			}
			if math.IsNaN(c.want) != math.IsNaN(s.DepthKm) || math.Abs(s.DepthKm-c.want) > 1e-9 {
				t.Errorf("depth %g km, want %g", s.DepthKm, c.want)
			}
		})
	}
}
