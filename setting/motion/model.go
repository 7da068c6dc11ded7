package motion

import (
	"fmt"
	"slices"
	"strings"

	"nearmargin/setting/sphere"
)

// Published is the basis of an angular velocity that stands so in a publication.
const Published = "published"

// composedPrefix stands before the anchor's code in the basis of an angular
// velocity that was composed; see [Compose].
const composedPrefix = "composed:"

// Composed returns the basis of an angular velocity composed on an anchor plate.
func Composed(anchor string) string { return composedPrefix + anchor }

// Entry is one plate's angular velocity in a model.
type Entry struct {
	Plate  string
	Vector sphere.Vec // rad/Myr
	Spread Spread
	Basis  string // Published or Composed(anchor)
}

// Anchor returns the plate on which the entry was composed, "" where it was
// published.
func (e *Entry) Anchor() string {
	anchor, _ := strings.CutPrefix(e.Basis, composedPrefix)
	if anchor == e.Basis {
		return ""
	}
	return anchor
}

// Info says what a motion model is.
type Info struct {
	Name       string // such as "nnr-morvel56"
	Title      string
	Frame      string // what the angular velocities are relative to
	TimeSpan   string // what span of time the rates average over
	Citation   string
	RelativeTo string // code of a fixed plate, "" where the frame is none
}

// Model is a set of angular velocities in one frame.
type Model struct {
	info    Info
	entries []Entry // sorted by plate
	byPlate map[string]*Entry
}

// NewModel checks the entries and builds a model from them.
func NewModel(info Info, entries []Entry) (*Model, error) {
	fail := func(format string, args ...any) (*Model, error) {
		return nil, fmt.Errorf("motion model %q: "+format, append([]any{info.Name}, args...)...)
	}
	if info.Name == "" {
		return fail("name is empty")
	}
	m := &Model{info: info, entries: slices.Clone(entries)}
	slices.SortFunc(m.entries, func(a, b Entry) int { return strings.Compare(a.Plate, b.Plate) })
	m.byPlate = make(map[string]*Entry, len(m.entries))
	for i := range m.entries {
		e := &m.entries[i]
		m.byPlate[e.Plate] = e
		if i > 0 && m.entries[i-1].Plate == e.Plate {
			return fail("plate %q stands twice", e.Plate)
		}
		if n := e.Vector.Norm(); !(n >= 0 && n < 5) { // 5 rad/Myr is 290°/Myr; the fastest microplate turns at 52
			return fail("plate %q turns at %g rad/Myr; that is not a plate's rate", e.Plate, n)
		}
	}
	for i := range m.entries {
		e := &m.entries[i]
		if e.Basis == Published {
			continue
		}
		anchor, ok := strings.CutPrefix(e.Basis, composedPrefix)
		if !ok {
			return fail("plate %q: basis %q must be %q or %q and a plate's code", e.Plate, e.Basis, Published, composedPrefix)
		}
		if a := m.entry(anchor); a == nil || a.Basis != Published {
			return fail("plate %q is composed on %q, which is not a published plate of this model", e.Plate, anchor)
		}
	}
	return m, nil
}

// Info returns what the model is.
func (m *Model) Info() Info { return m.info }

// Name returns the model's name.
func (m *Model) Name() string { return m.info.Name }

// Entries returns the angular velocities, sorted by plate. The slice is the
// caller's.
func (m *Model) Entries() []Entry { return slices.Clone(m.entries) }

// Has reports whether the model holds the plate.
func (m *Model) Has(plate string) bool { return m.entry(plate) != nil }

func (m *Model) entry(plate string) *Entry { return m.byPlate[plate] }

// Basis returns the basis of the plate's angular velocity, "" where the model
// lacks the plate.
func (m *Model) Basis(plate string) string {
	if e := m.entry(plate); e != nil {
		return e.Basis
	}
	return ""
}
