package setting

import "fmt"

// Label is a tectonic setting.
type Label uint8

// The labels; the zero value is none.
const (
	NoLabel          Label = 0
	Trench           Label = 1
	OuterRise        Label = 2
	Forearc          Label = 3
	VolcanicArc      Label = 4
	BackArc          Label = 5
	BackArcSpreading Label = 6
	RidgeAxis        Label = 7
	RidgeFlank       Label = 8
	TransformZone    Label = 9
	ContinentalRift  Label = 10
	CollisionZone    Label = 11
	ConvergentMargin Label = 12
	DeformingZone    Label = 13
	PlateInterior    Label = 14
)

const numLabels = 15

// AllLabels lists the labels in their order.
var AllLabels = [...]Label{
	Trench, OuterRise, Forearc, VolcanicArc, BackArc, BackArcSpreading, RidgeAxis, RidgeFlank,
	TransformZone, ContinentalRift, CollisionZone, ConvergentMargin, DeformingZone, PlateInterior,
}

var labelNames = [numLabels]string{
	"none", "trench", "outer_rise", "forearc", "volcanic_arc", "back_arc", "back_arc_spreading",
	"ridge_axis", "ridge_flank", "transform_zone", "continental_rift", "collision_zone",
	"convergent_margin", "deforming_zone", "plate_interior",
}

// String returns the label as answers spell it.
func (l Label) String() string {
	if int(l) < len(labelNames) {
		return labelNames[l]
	}
	return fmt.Sprintf("Label(%d)", uint8(l))
}

// Family groups labels that differ in degree, not in kind.
type Family uint8

// The families; the zero value is none.
const (
	NoFamily          Family = 0
	SubductionFamily  Family = 1
	SpreadingFamily   Family = 2
	RiftFamily        Family = 3
	TransformFamily   Family = 4
	CollisionFamily   Family = 5
	ConvergenceFamily Family = 6
	InteriorFamily    Family = 7
)

// AllFamilies lists the families in their order.
var AllFamilies = [...]Family{
	SubductionFamily, SpreadingFamily, RiftFamily, TransformFamily, CollisionFamily, ConvergenceFamily, InteriorFamily,
}

var familyNames = [...]string{"none", "subduction", "spreading", "rift", "transform", "collision", "convergence", "interior"}

// String returns the family as answers spell it.
func (f Family) String() string {
	if int(f) < len(familyNames) {
		return familyNames[f]
	}
	return fmt.Sprintf("Family(%d)", uint8(f))
}

// family returns the label's family; a deforming zone's follows its kind.
func (l Label) family(kind ZoneKind) Family {
	switch l {
	case Trench, OuterRise, Forearc, VolcanicArc, BackArc:
		return SubductionFamily
	case BackArcSpreading, RidgeAxis, RidgeFlank:
		return SpreadingFamily
	case ContinentalRift:
		return RiftFamily
	case TransformZone:
		return TransformFamily
	case CollisionZone:
		return CollisionFamily
	case ConvergentMargin:
		return ConvergenceFamily
	case DeformingZone:
		switch kind {
		case CollisionKind:
			return CollisionFamily
		case ExtensionKind:
			return RiftFamily
		case ShearKind:
			return TransformFamily
		}
	}
	return InteriorFamily
}

// Confidence says how far a label stands above the uncertainty of what it rests on.
type Confidence uint8

// The degrees of confidence.
const (
	NoConfidence Confidence = 0
	Low          Confidence = 1 // within 1σ a label of another family is met
	Medium       Confidence = 2 // within 1σ another label of the same family is met, or the rule itself allows no more
	High         Confidence = 3 // no other label is met
)

var confidenceNames = [...]string{"none", "low", "medium", "high"}

// String returns the confidence as answers spell it.
func (c Confidence) String() string {
	if int(c) < len(confidenceNames) {
		return confidenceNames[c]
	}
	return fmt.Sprintf("Confidence(%d)", uint8(c))
}
