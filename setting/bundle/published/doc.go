// Package published reads files in the forms in which their authors publish them,
// and puts a model together from them.
//
//	steps.go        plate boundary steps in fixed columns (Bird 2003, Table 2)
//	dig.go          outlines of plates and orogens as .dig text (Bird 2003)
//	poles.go        poles of rotation in fixed columns (Bird 2003, Table 1)
//	slab2.go        grids of slabs as .xyz text (Hayes et al. 2018)
//	geojson.go      boundaries as GeoJSON with properties of any name
//	velocities.go   angular velocities as CSV
//
// A line that cannot be read is left out and named, with its file, its number and
// the reason; the reader goes on. Whether so much may be left out is for [Build]
// to say. The package opens nothing by itself: it is handed [File] values.
package published
