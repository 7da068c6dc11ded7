// Package slab holds the tops of subducting slabs as surfaces: from contours of
// equal depth, or from grids.
//
// Depths are km, positive down from sea level; distances km on the sphere of
// radius sphere.MeanRadiusKm; angles degrees. Dip is 0 for a flat slab and 90 for
// a vertical one, dip azimuth is the direction in which it goes down, clockwise
// from north. Every σ is one standard deviation. NaN stands for a quantity that
// is not known.
//
// All types are immutable after they are built and safe for concurrent use.
package slab
