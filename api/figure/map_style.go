package figure

import "nearmargin/setting/boundary"

// mapLooks are the classes of a location map beside those of all figures.
var mapLooks = map[string]look{
	"sea":      {attrs{"fill", "#eaf1f3"}, "fill:#10202a"},
	"land":     {attrs{"fill", "#efe3c3", "stroke", "#9a8c64", "stroke-width", "0.6", "fill-rule", "evenodd"}, "fill:#343329;stroke:#7d7960"},
	"mesh":     {attrs{"fill", "none", "stroke", "#b9c8cd", "stroke-width", "0.6"}, "stroke:#2a3d49"},
	"textback": {attrs{"fill", "none", "stroke", "#ffffff", "stroke-width", "3", "stroke-linejoin", "round"}, "stroke:#14181d"},

	"trench":       {attrs{"fill", "none", "stroke", "#0a4a86", "stroke-width", "2"}, "stroke:#7cc0f7"},
	"tooth":        {attrs{"fill", "#0a4a86"}, "fill:#7cc0f7"},
	"ridge":        {attrs{"fill", "none", "stroke", "#b8420b", "stroke-width", "3.4"}, "stroke:#f59a63"},
	"rift":         {attrs{"fill", "none", "stroke", "#8a5a00", "stroke-width", "3.4", "stroke-dasharray", "7 4"}, "stroke:#e8bf5e"},
	"core":         {attrs{"fill", "none", "stroke", "#ffffff", "stroke-width", "1.2"}, "stroke:#14181d"},
	"otransform":   {attrs{"fill", "none", "stroke", "#00694f", "stroke-width", "1.2"}, "stroke:#58cbaa"},
	"ctransform":   {attrs{"fill", "none", "stroke", "#00694f", "stroke-width", "2", "stroke-dasharray", "10 3 2 3"}, "stroke:#58cbaa"},
	"oconvergence": {attrs{"fill", "none", "stroke", "#6b2f94", "stroke-width", "1.6", "stroke-dasharray", "6 3"}, "stroke:#d2adee"},
	"cconvergence": {attrs{"fill", "none", "stroke", "#6b2f94", "stroke-width", "2"}, "stroke:#d2adee"},
	"tick":         {attrs{"fill", "none", "stroke", "#6b2f94", "stroke-width", "1.2"}, "stroke:#d2adee"},

	"s-subduction":  {siteAttrs("#0a5a99"), "fill:#7cc0f7;stroke:#14181d"},
	"s-spreading":   {siteAttrs("#c2510c"), "fill:#f59a63;stroke:#14181d"},
	"s-rift":        {siteAttrs("#8a5a00"), "fill:#e8bf5e;stroke:#14181d"},
	"s-transform":   {siteAttrs("#00694f"), "fill:#58cbaa;stroke:#14181d"},
	"s-collision":   {siteAttrs("#6b2f94"), "fill:#d2adee;stroke:#14181d"},
	"s-convergence": {siteAttrs("#a3276b"), "fill:#f5a3cd;stroke:#14181d"},
	"s-interior":    {siteAttrs("#4c5765"), "fill:#c3ccd4;stroke:#14181d"},
}

func siteAttrs(fill string) attrs {
	return attrs{"fill", fill, "stroke", "#ffffff", "stroke-width", "1.2"}
}

// lineLook is how boundaries of a type look: a line, perhaps with a lighter core,
// teeth on the upper plate, or ticks.
type lineLook struct {
	typ          boundary.Type
	class, words string
	core         bool
	teeth, ticks bool
}

// lineLooks lists the types in the order of the legend; they are drawn from the last
// to the first.
var lineLooks = [...]lineLook{
	{boundary.Subduction, "trench", "Subduction (teeth: upper plate)", false, true, false},
	{boundary.SpreadingRidge, "ridge", "Spreading ridge", true, false, false},
	{boundary.ContinentalRift, "rift", "Continental rift", true, false, false},
	{boundary.OceanicTransform, "otransform", "Oceanic transform", false, false, false},
	{boundary.ContinentalTransform, "ctransform", "Continental transform", false, false, false},
	{boundary.OceanicConvergent, "oconvergence", "Oceanic convergence", false, false, true},
	{boundary.ContinentalConvergent, "cconvergence", "Continental convergence", false, false, true},
}

// siteLook is how the sites of a label look: the colour is the family's, the shape
// the label's own within it.
type siteLook struct{ label, words, shape string }

// siteLooks lists the labels in the order of the legend.
var siteLooks = [...]siteLook{
	{"trench", "Trench", shapeTriangle}, {"outer_rise", "Outer rise", shapeDiamond}, {"forearc", "Forearc", shapeCircle},
	{"volcanic_arc", "Volcanic arc", shapeStar}, {"back_arc", "Back-arc", shapeSquare}, {"back_arc_spreading", "Back-arc spreading", shapeDiamond},
	{"ridge_axis", "Ridge axis", shapeCircle}, {"ridge_flank", "Ridge flank", shapeSquare}, {"transform_zone", "Transform zone", shapeBar},
	{"continental_rift", "Continental rift", shapeTriangle}, {"collision_zone", "Collision zone", shapeCross}, {"convergent_margin", "Convergent margin", shapeStar},
	{"deforming_zone", "Deforming zone", shapeDiamond}, {"plate_interior", "Plate interior", shapeCircle},
}

// Markers around the origin, about 11 px across.
const (
	shapeCircle   = "M-5 0A5 5 0 1 1 5 0A5 5 0 1 1 -5 0Z"
	shapeSquare   = "M-4.6 -4.6H4.6V4.6H-4.6Z"
	shapeTriangle = "M0 -6L5.5 4.5H-5.5Z"
	shapeDiamond  = "M0 -6.5L4.5 0L0 6.5L-4.5 0Z"
	shapeCross    = "M-2 -5.5H2V-2H5.5V2H2V5.5H-2V2H-5.5V-2H-2Z"
	shapeBar      = "M-6.5 -2.5H2.5V2.5H-6.5ZM3.5 -2.5H6.5V2.5H3.5Z"
	shapeStar     = "M0 -7L1.7 -2.3L6.7 -2.2L2.7 0.9L4.1 5.7L0 2.9L-4.1 5.7L-2.7 0.9L-6.7 -2.2L-1.7 -2.3Z"
)
