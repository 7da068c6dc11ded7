package published

import (
	"nearmargin/setting/bundle"
)

// Request is what a model is to be built from. Every part may be absent.
type Request struct {
	Base     *bundle.Bundle // gives what no file does; nil for nothing
	Identity bundle.Identity

	Steps, Plates, Orogens, Poles *File
	Slab2                         []File
	Boundaries                    *File // GeoJSON, instead of steps
	Mapping                       *Mapping
	Velocities                    []Velocities

	Codes       Codes   // of the plates in all files
	MaxRejected float64 // the largest share of a file's lines that may be rejected, 0…1
	Progress    func(what string)
}

// Velocities is a table of angular velocities and the name of the motion model
// that it becomes.
type Velocities struct {
	Name string
	File File
}

// DefaultMaxRejected is the share of a file's lines that may be at fault before
// the file is taken for another than it should be.
const DefaultMaxRejected = 0.01

// Report says what became of the files.
type Report struct {
	Tallies []Tally
	Skipped []string // files of a directory of grids that are named otherwise
	// Superseded lists the slabs of the base that gave way to an imported one.
	Superseded []string
}

// Rejected counts the rejected lines of all files.
func (r *Report) Rejected() (n int) {
	for i := range r.Tallies {
		n += r.Tallies[i].Rejected
	}
	return n
}
