package sphere_test

import (
	"fmt"

	"nearmargin/setting/sphere"
)

func ExampleInverse() {
	// the airports of New York and London
	km, azimuthDeg := sphere.Inverse(sphere.LonLat{Lon: -73.8, Lat: 40.6}, sphere.LonLat{Lon: -0.5, Lat: 51.6})
	fmt.Printf("%.3f km, azimuth %.3f°\n", km, azimuthDeg)
	// Output: 5551.759 km, azimuth 51.199°
}

func ExampleArc_Nearest() {
	// the equator from 170°E over the antimeridian to 170°W
	arc, _ := sphere.NewArc(
		sphere.FromLonLat(sphere.LonLat{Lon: 170, Lat: 0}),
		sphere.FromLonLat(sphere.LonLat{Lon: -170, Lat: 0}),
	)
	site := sphere.FromLonLat(sphere.LonLat{Lon: -175, Lat: 2})
	q, where := arc.Nearest(site)
	fmt.Printf("%.0f°, inside: %v, left: %v\n", q.LonLat().Lon, where == sphere.Inside, arc.Side(site) > 0)
	// Output: -175°, inside: true, left: true
}

func ExampleRegion() {
	fiji, err := sphere.NewRegion([]sphere.LonLat{
		{Lon: 176, Lat: -20}, {Lon: -178, Lat: -20}, {Lon: -178, Lat: -15}, {Lon: 176, Lat: -15}, {Lon: 176, Lat: -20},
	})
	if err != nil {
		panic(err)
	}
	fmt.Println(fiji.Contains(sphere.FromLonLat(sphere.LonLat{Lon: 180, Lat: -17})))
	fmt.Println(fiji.Contains(sphere.FromLonLat(sphere.LonLat{Lon: 0, Lat: 17}))) // the antipode
	// Output:
	// true
	// false
}
