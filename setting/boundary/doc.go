// Package boundary holds plate boundaries, the network they form, and the search
// for the boundary that is nearest to a place.
//
// # Frame and units
//
// Positions are degrees of longitude and latitude on WGS84; edges are
// great-circle arcs between the vertices (see package sphere). Lengths are
// kilometres, azimuths degrees clockwise from north.
//
// # Sides
//
// Travelling along a boundary from its first vertex to its last, the left plate
// is on the left hand.
//
// # The network
//
// Boundaries meet in nodes: places where their ends coincide exactly. In a
// closed network every end meets another, the plates around each node agree and
// no two lines cross, so the plate under any place is the one on the near side
// of its nearest boundary. [Network.Faults] lists where a network falls short of
// that; the search works on one with faults as well as it can.
//
// All types are immutable after they are built and safe for concurrent use.
package boundary
