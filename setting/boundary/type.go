package boundary

import "fmt"

// Type is the kind of a plate boundary.
type Type uint8

// The types of boundary; the zero value is no type. The classes follow Bird
// (2003), An updated digital model of plate boundaries, G-cubed 4(3), 1027,
// section 4.
const (
	Unknown               Type = 0
	Subduction            Type = 1
	SpreadingRidge        Type = 2
	OceanicTransform      Type = 3
	ContinentalTransform  Type = 4
	ContinentalRift       Type = 5
	ContinentalConvergent Type = 6
	OceanicConvergent     Type = 7
)

// NumTypes is one more than the highest type, for arrays indexed by Type.
const NumTypes = 8

// AllTypes lists the types in their order.
var AllTypes = [...]Type{
	Subduction, SpreadingRidge, OceanicTransform, ContinentalTransform,
	ContinentalRift, ContinentalConvergent, OceanicConvergent,
}

var typeNames = [NumTypes]string{
	Unknown:               "unknown",
	Subduction:            "subduction",
	SpreadingRidge:        "spreading_ridge",
	OceanicTransform:      "oceanic_transform",
	ContinentalTransform:  "continental_transform",
	ContinentalRift:       "continental_rift",
	ContinentalConvergent: "continental_convergence",
	OceanicConvergent:     "oceanic_convergence",
}

// String returns the name of the type as model files and answers spell it.
func (t Type) String() string {
	if int(t) < len(typeNames) {
		return typeNames[t]
	}
	return fmt.Sprintf("Type(%d)", uint8(t))
}

// ParseType returns the type of that name.
func ParseType(s string) (Type, error) {
	for _, t := range AllTypes {
		if typeNames[t] == s {
			return t, nil
		}
	}
	return Unknown, fmt.Errorf("boundary type %q is unknown; the types are %v", s, AllTypes)
}
