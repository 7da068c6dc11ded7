// Package geojson reads GeoJSON polygons (RFC 7946) strictly and says, by JSON
// pointer (RFC 6901), where one is at fault.
//
// Two things differ from RFC 7946 on purpose: edges are great-circle arcs rather
// than lines of constant slope in longitude and latitude, and a ring encloses the
// smaller area on either side of it, whichever way round it is written. So a ring
// may cross ±180° and hold a pole, and need not be cut there.
package geojson
