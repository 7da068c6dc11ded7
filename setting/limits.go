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
	limitForearc         LimitID = 5
	limitArc             LimitID = 6
	limitBackArc         LimitID = 7
	limitOuterRise       LimitID = 8
	limitFlankAge        LimitID = 9
	limitFlank           LimitID = 10
	limitConvergent      LimitID = 11
	limitCollisionUpper  LimitID = 12
	limitCollisionLower  LimitID = 13
	limitCollisionEither LimitID = 14
	limitCollisionZone   LimitID = 15
)

const numLimits = 16

// Limit is one number of the rule table with its own uncertainty.
type Limit struct {
	ID    LimitID
	Name  string
	Value float64
	Sigma float64 // 1σ, in the unit of Value
	Unit  string  // "km" or "Myr"
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

func limitValues() (v [numLimits]float64) {
	for i := range Limits {
		v[i] = Limits[i].Value
	}
	return v
}
