package boundary_test

import (
	"fmt"

	"nearmargin/setting/boundary"
	"nearmargin/setting/sphere"
)

// A small island plate on the antimeridian, seen from its own ground and from
// the plate around it.
func Example() {
	trench, err := boundary.New(boundary.Spec{
		ID: "trench", Name: "Eastern trench", Type: boundary.Subduction,
		Left: "IS", Right: "PA", Subducting: "PA",
		SigmaKm: 5, Source: "made up for the example", SourceStatus: boundary.FromMemory,
		// northward, so that the island is on the left hand
		Path: []sphere.LonLat{{Lon: -178, Lat: -20}, {Lon: -178, Lat: -16}},
	})
	if err != nil {
		panic(err)
	}
	ridge, err := boundary.New(boundary.Spec{
		ID: "ridge", Name: "Western ridge", Type: boundary.SpreadingRidge,
		Left: "IS", Right: "PA",
		SigmaKm: 5, Source: "made up for the example", SourceStatus: boundary.FromMemory,
		Path: []sphere.LonLat{{Lon: -178, Lat: -16}, {Lon: 178, Lat: -16}, {Lon: 178, Lat: -20}, {Lon: -178, Lat: -20}},
	})
	if err != nil {
		panic(err)
	}
	net, err := boundary.NewNetwork([]*boundary.Boundary{trench, ridge})
	if err != nil {
		panic(err)
	}
	fmt.Println("faults:", len(net.Faults()))
	for _, lon := range []float64{-178.5, -177} {
		site := boundary.PlaceAt(sphere.LonLat{Lon: lon, Lat: -18})
		plate, near := net.Locate(site)
		fmt.Printf("%g°: on %s, %s %.1f km away towards %.0f°\n", lon, plate, near.Boundary.Type(), near.DistanceKm, near.AzimuthDeg)
	}
	// Output:
	// faults: 0
	// -178.5°: on IS, subduction 53.0 km away towards 90°
	// -177°: on PA, subduction 105.9 km away towards 270°
}

func ExampleNetwork_NearestOf() {
	trench, err := boundary.New(boundary.Spec{
		ID: "trench", Name: "Trench", Type: boundary.Subduction, Left: "SA", Right: "NZ", Subducting: "NZ",
		SigmaKm: 5, Source: "made up for the example", SourceStatus: boundary.FromMemory,
		Path: []sphere.LonLat{{Lon: -72, Lat: -20}, {Lon: -72, Lat: -30}},
	})
	if err != nil {
		panic(err)
	}
	net, err := boundary.NewNetwork([]*boundary.Boundary{trench})
	if err != nil {
		panic(err)
	}
	site := boundary.PlaceAt(sphere.LonLat{Lon: -69, Lat: -25})
	h, ok := net.NearestOf(site, boundary.Subduction, "SA", boundary.Overriding, 500)
	fmt.Printf("SA overrides: %v, %.0f km away\n", ok, h.DistanceKm)
	_, ok = net.NearestOf(site, boundary.Subduction, "SA", boundary.Subducting, 500)
	fmt.Printf("SA goes down: %v\n", ok)
	// Output:
	// SA overrides: true, 303 km away
	// SA goes down: false
}
