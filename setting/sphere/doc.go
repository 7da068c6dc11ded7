// Package sphere holds the geometry that the rest of the domain stands on:
// unit vectors, great-circle arcs, and distances along the WGS84 ellipsoid.
//
// # Frame
//
// Vectors are Earth-centred: X through (0°E, 0°N), Y through (90°E, 0°N), Z
// through the North Pole. Geographic latitude is taken as spherical latitude,
// as is usual where lines are great-circle arcs between geographic positions.
//
// # Units
//
// Longitude and latitude are degrees, longitude first; angles on the sphere are
// radians unless the name says _deg; distances are kilometres. Where an angle
// is turned into a length on the sphere the radius is MeanRadiusKm.
//
// # Two distances
//
// Searches run on the unit sphere, where they are cheap. A distance that an
// answer shows comes from [Inverse], the geodesic on WGS84. The two differ by up
// to 0.56 %.
//
// Everything in this package is a value or a pure function and is safe for
// concurrent use.
package sphere
