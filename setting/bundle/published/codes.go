package published

import (
	"fmt"
	"maps"
	"slices"
	"strings"

	"nearmargin/setting/boundary"
)

// Codes maps a publisher's plate codes to the project's. A code that it does not
// hold stays as it is.
type Codes map[string]string

// BirdCodes returns the codes that Bird (2003) spells otherwise than the project:
// Africa without Somalia is the project's Nubia.
func BirdCodes() Codes { return Codes{"AF": "NU", "SO": "SM", "YA": "YZ"} }

// ParseCodes reads a list such as "AF=NU,SO=SM".
func ParseCodes(s string) (Codes, error) {
	out := Codes{}
	for _, pair := range strings.Split(s, ",") {
		if pair = strings.TrimSpace(pair); pair == "" {
			continue
		}
		theirs, ours, ok := strings.Cut(pair, "=")
		if !ok || theirs == "" || !isCode(ours) {
			return nil, fmt.Errorf("%q: want a publisher's code, '=' and the project's code of two upper-case letters, such as AF=NU", pair)
		}
		if _, twice := out[theirs]; twice {
			return nil, fmt.Errorf("code %q is mapped twice", theirs)
		}
		out[theirs] = ours
	}
	return out, nil
}

// String returns the list that [ParseCodes] reads, sorted.
func (c Codes) String() string {
	var out []string
	for _, theirs := range slices.Sorted(maps.Keys(c)) {
		out = append(out, theirs+"="+c[theirs])
	}
	return strings.Join(out, ",")
}

func (c Codes) of(code string) string {
	if ours, ok := c[code]; ok {
		return ours
	}
	return code
}

func isCode(s string) bool {
	return len(s) == 2 && s[0] >= 'A' && s[0] <= 'Z' && s[1] >= 'A' && s[1] <= 'Z'
}

// classes are the classes of Bird (2003), section 4.
var classes = map[string]boundary.Type{
	"SUB": boundary.Subduction,
	"OSR": boundary.SpreadingRidge,
	"OTF": boundary.OceanicTransform,
	"CTF": boundary.ContinentalTransform,
	"CRB": boundary.ContinentalRift,
	"CCB": boundary.ContinentalConvergent,
	"OCB": boundary.OceanicConvergent,
}

// classSigmaKm is 1σ of a line's position, by type, where the publisher gives
// none: the project's judgement, no source. Ridges and trenches are seen in the sea
// floor; belts on land are wide.
var classSigmaKm = [boundary.NumTypes]float64{
	boundary.Subduction:            12,
	boundary.SpreadingRidge:        10,
	boundary.OceanicTransform:      10,
	boundary.ContinentalTransform:  20,
	boundary.ContinentalRift:       30,
	boundary.ContinentalConvergent: 40,
	boundary.OceanicConvergent:     40,
}

var typeWords = [boundary.NumTypes]string{
	boundary.Subduction:            "subduction zone",
	boundary.SpreadingRidge:        "spreading ridge",
	boundary.OceanicTransform:      "oceanic transform",
	boundary.ContinentalTransform:  "continental transform",
	boundary.ContinentalRift:       "continental rift",
	boundary.ContinentalConvergent: "continental convergence",
	boundary.OceanicConvergent:     "oceanic convergence",
}
