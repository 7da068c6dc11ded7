// Package motion holds plate motion models: one angular velocity a plate, and
// the relative velocity of two plates at a place, with its uncertainty.
//
// # Frame and units
//
// Angular velocities are vectors in the Earth-centred frame of package sphere,
// in radians per million years (rad/Myr), positive anticlockwise seen from
// above the pole. Velocities are mm/yr, which is km/Myr; they are taken on a
// sphere of radius sphere.MeanRadiusKm. Azimuths are degrees clockwise from
// north, [0, 360).
//
// # Signs
//
// Opening is positive where the plates part. Shear is positive right-lateral.
// Neither depends on which of the two plates is looked from.
//
// # Uncertainty
//
// Published tables differ in what they give: the σ of the rate of rotation
// alone, the σ of each Cartesian component, a covariance, or nothing. None
// gives the correlation between two plates, so the σ of a difference is the sum
// of both plates' σ along the direction asked for, an upper bound. All σ are one
// standard deviation.
//
// All types are immutable after they are built and safe for concurrent use.
package motion
