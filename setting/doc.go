// Package setting answers in what tectonic setting a place lies: on which plate,
// how far from which boundary, how the plates move against each other there, and
// what that makes of the place.
//
// A [Model] is immutable and safe for concurrent use; a new edition is a new
// Model. [Model.Lookup] fixes the choices that hold for many sites, [Lookup.At]
// answers for one site into an [Answer] of the caller's, without allocating.
//
// The package knows no file format, no HTTP and no SQL. Reasons and notes are
// codes with numbers; [Answer.ReasonText] and its like put them into words.
//
// # Conventions
//
// Longitude and latitude in degrees on WGS84; input longitude -180…360, output
// (-180, 180]. Depth in km, positive down from sea level. Distances in km along
// the WGS84 geodesic. Azimuths in degrees clockwise from north, [0, 360). Rates
// in mm/yr. Every σ is one standard deviation. NaN stands for a quantity that
// is absent.
//
// # Present day
//
// The setting is that of the present day, not of the time when a rock formed.
package setting
