package page_test

import (
	"fmt"
	"math"
	"testing"
)

// TestCoordinatesAsPasted reads positions in the forms that people paste.
func TestCoordinatesAsPasted(t *testing.T) {
	h := newHost(t)
	b := newTab(t, h, 1000, 700, false, "")
	type read struct {
		Lon, Lat float64
		Sure     bool
		Error    string
		Swapped  *struct{ Lon, Lat float64 }
	}
	for _, c := range []struct {
		text     string
		lon, lat float64
		sure     bool
	}{
		{"33.5 S 71.6 W", -71.6, -33.5, true},
		{"33.5S, 71.6W", -71.6, -33.5, true},
		{"S33.5 W71.6", -71.6, -33.5, true},
		{"71.6 W 33.5 S", -71.6, -33.5, true},
		{"33.5° S 71.6° W", -71.6, -33.5, true},
		{"33.5 south, 71.6 west", -71.6, -33.5, true},
		{`33°30'00"S 71°36'00"W`, -71.6, -33.5, true},
		{"33°30′S 71°36′W", -71.6, -33.5, true},
		{"33 30 00 S 71 36 00 W", -71.6, -33.5, true},
		{"N 27° 42.5' E 085° 19.0'", 85.316667, 27.708333, true},
		{`-33°30'0", -71°36'0"`, -71.6, -33.5, false},
		{"-0°30'0\", 10°0'0\"", 10, -0.5, false},
		{"-33.5, -71.6", -71.6, -33.5, false},
		{"-33.5 -71.6", -71.6, -33.5, false},
		{"\u221233.5, \u221271.6", -71.6, -33.5, false},
		{"142.5 39.3", 142.5, 39.3, true},
		{"39.3, 142.5", 142.5, 39.3, true},
		{"39,3 N 142,5 E", 142.5, 39.3, true},
		{"48,137; 11,575", 11.575, 48.137, false},
		{"lon=-72.4&lat=-36.1", -72.4, -36.1, true},
		{"Latitude: -36.1, Longitude: -72.4", -72.4, -36.1, true},
		{`{"type":"Point","coordinates":[-72.4,-36.1]}`, -72.4, -36.1, true},
		{"POINT(-72.4 -36.1)", -72.4, -36.1, true},
		{"geo:-36.1,-72.4", -72.4, -36.1, true},
		{"004,Osprey Mapocho-4,well,-33.10,-71.40,Chilean coastal range", -71.4, -33.1, false},
		{"s1\t142.5\t39.3\tgranite", 142.5, 39.3, true},
		{"s1;142,5;39,3", 142.5, 39.3, true},
		{"0, 359.5", -0.5, 0, true},
		{"33°27'S, 70°40'W", -70.666667, -33.45, true},
		{"33°27’S 70°40’W", -70.666667, -33.45, true},
		{"33°27'36''S 70°40'12''W", -70.67, -33.46, true},
		{"33:27:36 S, 70:40:12 W", -70.67, -33.46, true},
		{"-33:27:36 -70:40:12", -70.67, -33.46, false},
		{"-33.45,-70.66", -70.66, -33.45, false},
		{"-33.45, -70.66, 520", -70.66, -33.45, false},
		{"Well A-1;35.2;139.5;12", 139.5, 35.2, true},
		{"SE-3;35.2;139.5", 139.5, 35.2, true},
		{"NW-1,35.2,139.5", 139.5, 35.2, true},
		{"E12;35.2;39.5", 39.5, 35.2, false},
		{"Well A-1;33°27'S;70°40'W;12", -70.666667, -33.45, true},
		{"Well A-1\t70.67 W\t33.45 S\t12.5", -70.67, -33.45, true},
		{"Lat 33.5S Long 71.6W", -71.6, -33.5, true},
		{"lat: 33°30'S, lon: 71°36'W, depth 10", -71.6, -33.5, true},
		{"33.5 S, -71.6", -71.6, -33.5, true},
		{"-33.5 71.6W", -71.6, -33.5, true},
		{"90 N 0 E", 0, 90, true},
		{"90 S, 0 W", 0, -90, true},
		{"-90, 12", 12, -90, false},
		{"0 N 180 W", -180, 0, true},
		{"0, 180", 180, 0, true},
		{"-16.5, -179.99", -179.99, -16.5, true},
	} {
		got := eval[read](b, fmt.Sprintf(`import("/assets/coords.js").then((m) => m.parse(%q))`, c.text))
		if got.Error != "" || math.Abs(got.Lon-c.lon) > 1e-6 || math.Abs(got.Lat-c.lat) > 1e-6 || got.Sure != c.sure {
			t.Errorf("%q: got %+v, want lon %g lat %g sure %v", c.text, got, c.lon, c.lat, c.sure)
		}
		if got.Swapped != nil && (got.Sure || math.Abs(got.Swapped.Lon-c.lat) > 1e-6) {
			t.Errorf("%q: the other reading is %+v", c.text, *got.Swapped)
		}
	}
	for _, text := range []string{"", "here", "12", "1 2 3", "91 N 10 E", "10 N 20 S", "33°75' S 71° W", "100, 200", "33.5 S, 71.6", "33.5, 71.6 W", "33.5 S 71.6 O", "lat 33.5 W lon 71.6 S",
		"Easting 345678 Northing 6298765"} {
		if got := eval[read](b, fmt.Sprintf(`import("/assets/coords.js").then((m) => m.parse(%q))`, text)); got.Error == "" {
			t.Errorf("%q: read as %+v, want an error", text, got)
		}
	}
}
