// Package revision tells what changed from one model to another, and by how much.
//
// Distances are in km on the sphere of [sphere.MeanRadiusKm], rates in degrees per
// million years, speeds in mm/yr. How far a line moved is the largest distance from
// a vertex of either line to the other line (the Hausdorff distance over vertices);
// how far a surface moved, the largest difference of depth over the vertices of
// both models' contours.
package revision

import (
	"fmt"
	"maps"
	"slices"
	"strings"

	"nearmargin/setting"
)

// Kind says what happened to a part.
type Kind uint8

// The kinds of change; the zero value is none.
const (
	NoChange Kind = 0
	Added    Kind = 1
	Removed  Kind = 2
	Changed  Kind = 3
)

var kindNames = [...]string{"none", "added", "removed", "changed"}

// String returns the kind as the report spells it.
func (k Kind) String() string { return kindNames[k] }

// Change is what happened to one part of a model.
type Change struct {
	Part    string // "boundary", "plate", "motion model", "angular velocity", "slab", ...
	ID      string
	Kind    Kind
	Details []string // of a change: what, from what, to what
	// MovedKm is how far a line, a place or a surface moved, 0 where it did not.
	MovedKm float64
}

// Report is the changes from one model to another, in the order of the files and
// then of ids.
type Report struct {
	From, To             string // id@edition
	FromSHA256, ToSHA256 string
	Changes              []Change
}

// Compare returns what changed from a to b.
func Compare(a, b *setting.Model) Report {
	r := Report{From: a.Ref(), To: b.Ref(), FromSHA256: a.SHA256(), ToSHA256: b.SHA256()}
	r.about(a, b)
	r.plates(a, b)
	r.boundaries(a, b)
	r.junctions(a, b)
	r.motions(a, b)
	r.slabs(a, b)
	r.zones(a, b)
	r.hotspots(a, b)
	r.land(a, b)
	return r
}

// LargestMoveKm returns how far the boundary that moved farthest did, and its id.
func (r *Report) LargestMoveKm() (km float64, id string) {
	for _, c := range r.Changes {
		if c.Part == partBoundary && c.MovedKm > km {
			km, id = c.MovedKm, c.ID
		}
	}
	return km, id
}

// Text tells the report, one line a change, the numbers first.
func (r Report) Text() string {
	var b strings.Builder
	fmt.Fprintf(&b, "from %s (sha256 %.12s) to %s (sha256 %.12s)\n", r.From, r.FromSHA256, r.To, r.ToSHA256)
	if len(r.Changes) == 0 {
		b.WriteString("nothing changed\n")
		return b.String()
	}
	type tally struct{ n [4]int }
	counts := map[string]*tally{}
	var parts []string
	for _, c := range r.Changes {
		if counts[c.Part] == nil {
			counts[c.Part] = &tally{}
			parts = append(parts, c.Part)
		}
		counts[c.Part].n[c.Kind]++
	}
	for _, part := range parts {
		n := counts[part].n
		fmt.Fprintf(&b, "%s: %d added, %d removed, %d changed\n", part, n[Added], n[Removed], n[Changed])
	}
	if km, id := r.LargestMoveKm(); km > 0 {
		fmt.Fprintf(&b, "largest move of a boundary: %.2f km, %s\n", km, id)
	}
	for _, c := range r.Changes {
		fmt.Fprintf(&b, "%s %s %s", c.Kind, c.Part, c.ID)
		if len(c.Details) > 0 {
			b.WriteString(": " + strings.Join(c.Details, "; "))
		}
		b.WriteByte('\n')
	}
	return b.String()
}

// note adds a change where there is something to say of it.
func (r *Report) note(part, id string, movedKm float64, details []string) {
	if len(details) > 0 {
		r.Changes = append(r.Changes, Change{Part: part, ID: id, Kind: Changed, Details: details, MovedKm: movedKm})
	}
}

// compare walks two sets of parts in the order of their keys.
func compare[P any](r *Report, part string, a, b map[string]P, change func(id string, x, y P)) {
	keys := map[string]bool{}
	for _, m := range [...]map[string]P{a, b} {
		for k := range m {
			keys[k] = true
		}
	}
	for _, k := range slices.Sorted(maps.Keys(keys)) {
		x, before := a[k]
		y, after := b[k]
		switch {
		case !before:
			r.Changes = append(r.Changes, Change{Part: part, ID: k, Kind: Added})
		case !after:
			r.Changes = append(r.Changes, Change{Part: part, ID: k, Kind: Removed})
		default:
			change(k, x, y)
		}
	}
}

// details collects what changed in one part.
type details []string

func (d *details) text(what, from, to string) {
	if from != to {
		*d = append(*d, fmt.Sprintf("%s %q to %q", what, from, to))
	}
}

func (d *details) word(what, from, to string) {
	if from != to {
		*d = append(*d, fmt.Sprintf("%s %s to %s", what, orNone(from), orNone(to)))
	}
}

func (d *details) number(what, unit string, from, to float64) {
	if from != to {
		*d = append(*d, fmt.Sprintf("%s %g to %g %s", what, from, to, unit))
	}
}

func orNone(s string) string {
	if s == "" {
		return "none"
	}
	return s
}
