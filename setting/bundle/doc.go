// Package bundle reads, checks and writes a model directory, the one form that a
// model has outside of memory: the built-in model, an export, an import. It is
// the only place that knows the names and formats of its files.
//
//	model.json               id, edition, title, licence, citations, motion models
//	plates.csv               code,name
//	boundaries.geojson       one feature for each run of one type; or instead
//	boundaries/*.txt         the same, written for people (see [lines.go])
//	junctions.csv            name,lon,lat of named triple junctions (optional)
//	motion/NAME.csv          one angular velocity a plate
//	zones.geojson            polygons of diffuse deformation (optional)
//	hotspots.csv             name,lon,lat,source (optional)
//	land.geojson             outlines of land near spreading ridges (optional)
//	warnings.csv             code,lon,lat,detail of known faults of the data (optional)
//	slabs/slabs.csv          one row a slab, with
//	slabs/contours.geojson   contours of equal depth, or
//	slabs/SLAB/depth.xyz     grids: depth, sigma, dip, strike, thickness, also .gz;
//	slabs/*.txt              or instead the slabs written for people
//
// Reading is strict: an unknown member, a missing column or a number out of
// range is an error that names the file, the place in it and what would be
// right. Writing is canonical: the same model gives the same bytes, and the
// model's checksum is taken over them. A [Draft] puts a new model together from
// parts; package published reads those from the files of their authors.
package bundle
