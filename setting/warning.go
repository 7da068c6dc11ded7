package setting

import "nearmargin/setting/sphere"

// Warning is a fault of a model's data that is known and does not keep the model
// from being used: a place where the network is not closed, a line of a
// publisher's file that could not be read.
type Warning struct {
	Code   string        // lower-case words joined by underscores
	Placed bool          // whether At means something
	At     sphere.LonLat // where the fault is
	Detail string        // what is wrong
}
