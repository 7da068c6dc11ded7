// Package annotate adds the answer to rows of a table or to features: CSV,
// newline-delimited JSON, GeoJSON and JSON arrays. Everything that was in the
// input stays as it was, in its order; a row that cannot be answered keeps its
// place and says why.
//
// CSV, NDJSON and GeoJSON are streamed: memory does not grow with the number of
// rows.
package annotate
