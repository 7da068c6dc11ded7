package setting

// LimitID names a limit of the rule table.
type LimitID uint8

// The limits.
const (
	limitTrench          LimitID = 0
	limitRidgeAxis       LimitID = 1
	limitOceanTransform  LimitID = 2
	limitLandTransform   LimitID = 3
	limitRift            LimitID = 4
	limitSpreadingDepth  LimitID = 5
	limitSlabForearc     LimitID = 6
	limitArcMin          LimitID = 7
	limitSlabArc         LimitID = 8
	limitSlabArcMaybe    LimitID = 9
	limitSlabBackArc     LimitID = 10
	limitSlabTrench      LimitID = 11
	limitPastRim         LimitID = 12
	limitForearc         LimitID = 13
	limitArc             LimitID = 14
	limitBackArc         LimitID = 15
	limitOuterRise       LimitID = 16
	limitFlankAge        LimitID = 17
	limitFlank           LimitID = 18
	limitConvergent      LimitID = 19
	limitCollisionUpper  LimitID = 20
	limitCollisionLower  LimitID = 21
	limitCollisionEither LimitID = 22
	limitCollisionZone   LimitID = 23
)

const numLimits = 24

// Limit is one number of the rule table with its own uncertainty.
type Limit struct {
	ID    LimitID
	Name  string
	Value float64
	Sigma float64 // 1σ, in the unit of Value
	Unit  string  // "km", "Myr" or "×"
	Why   string  // where the number comes from
}

const fifteen = 0.15 // of a limit's value, where its σ is not better known

// Limits is the table of limits, in the order of their ids. "Common practice"
// marks a rule of thumb of the trade without one source.
var Limits = [numLimits]Limit{
	{limitTrench, "trench", 10, 10 * fifteen, "km", "common practice: half the width of a trench axis"},
	{limitRidgeAxis, "ridge_axis", 20, 20 * fifteen, "km", "common practice: the rift valley and its walls"},
	{limitOceanTransform, "transform_oceanic", 30, 30 * fifteen, "km", "common practice: width of a fracture zone's valley and ridges"},
	{limitLandTransform, "transform_continental", 50, 50 * fifteen, "km", "common practice: width of a continental fault system"},
	{limitRift, "rift", 75, 75 * fifteen, "km", "common practice: rift valley and shoulders"},
	{limitSpreadingDepth, "back_arc_spreading_depth", 40, 40 * fifteen, "km", "depth of the slab's top; common practice: thicker than the upper plate's crust"},
	{limitSlabForearc, "slab_forearc", 60, 60 * fifteen, "km", "depth of the slab's top; common practice"},
	{limitArcMin, "slab_arc_min", 1, fifteen, "×", "times the slab's own arc_min_depth_km, 60 to 100 km"},
	{limitSlabArc, "slab_arc", 170, 170 * fifteen, "km", "depth of the slab's top; segments of arcs lie 70 to 170 km above it (Syracuse and Abers 2006)"},
	{limitSlabArcMaybe, "slab_arc_maybe", 240, 240 * fifteen, "km", "depth of the slab's top; 95th percentile of Holocene arc volcanoes"},
	{limitSlabBackArc, "slab_back_arc", 350, 350 * fifteen, "km", "depth of the slab's top; common practice"},
	{limitSlabTrench, "slab_trench", 550, 550 * fifteen, "km", "distance from the trench; common practice"},
	{limitPastRim, "slab_past_rim", 100, 100 * fifteen, "km", "common practice: how far the depth at the down-dip rim says something"},
	{limitForearc, "forearc", 140, 40, "km", "volcanic front 103 to 353 km from the trench in the 5th to 95th percentile of Holocene arc volcanoes"},
	{limitArc, "volcanic_arc", 350, 40, "km", "as for the forearc"},
	{limitBackArc, "back_arc", 550, 40, "km", "common practice"},
	{limitOuterRise, "outer_rise", 150, 150 * fifteen, "km", "common practice: flexural bulge seaward of a trench"},
	{limitFlankAge, "flank_age", 10, 10 * fifteen, "Myr", "common practice: young crust of a ridge's flank"},
	{limitFlank, "flank", 350, 350 * fifteen, "km", "common practice: at the fastest ridges"},
	{limitConvergent, "convergent", 100, 100 * fifteen, "km", "common practice"},
	{limitCollisionUpper, "collision_upper", 200, 200 * fifteen, "km", "common practice: thrust belt and plateau edge"},
	{limitCollisionLower, "collision_lower", 100, 100 * fifteen, "km", "common practice: foredeep and outer folds"},
	{limitCollisionEither, "collision_either", 150, 50, "km", "between the two where it is not known which plate is the upper"},
	{limitCollisionZone, "collision_zone", 600, 600 * fifteen, "km", "common practice: width of a broad collision belt"},
}

// baseLimits are the limits as they stand in the table.
var baseLimits = limitValues()

func limitValues() (v [numLimits]float64) {
	for i := range Limits {
		v[i] = Limits[i].Value
	}
	return v
}
