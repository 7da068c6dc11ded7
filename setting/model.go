package setting

import (
	"fmt"
	"slices"
	"strings"

	"nearmargin/setting/boundary"
	"nearmargin/setting/motion"
	"nearmargin/setting/slab"
	"nearmargin/setting/sphere"
)

// Plate is a plate's code and name.
type Plate struct{ Code, Name string }

// Junction is a triple junction with its name.
type Junction struct {
	Name   string
	At     sphere.LonLat
	Plates []string
	vec    sphere.Vec
}

// Contents is what a model is built from.
type Contents struct {
	ID, Edition, Title, Licence string
	SHA256                      string // hex, of the model's files in their canonical form
	Citations                   []string
	Plates                      []Plate
	Boundaries                  []*boundary.Boundary
	JunctionNames               map[sphere.LonLat]string
	Motions                     []*motion.Model
	DefaultMotion               string
	Zones                       []*Zone
	Hotspots                    []Hotspot
	Slabs                       []*slab.Slab
	Land                        []*Land // land near spreading ridges
	Warnings                    []Warning
}

// Model is one edition of everything that an answer rests on.
type Model struct {
	c          Contents
	network    *boundary.Network
	plates     map[string]*Plate
	motions    map[string]*motion.Model
	junctions  []Junction
	hotspots   []sphere.Vec
	slabTies   []slabTie                  // of each slab
	slabOf     map[string]bool            // of which boundaries there is a slab
	maxSigmaKm [boundary.NumTypes]float64 // the largest σ of a boundary of each type
}

// NewModel checks that the parts fit together and builds a model from them.
func NewModel(c Contents) (*Model, error) {
	c.Slabs = slices.Clone(c.Slabs)
	slices.SortFunc(c.Slabs, func(a, b *slab.Slab) int { return strings.Compare(a.ID, b.ID) })
	m := &Model{c: c, plates: map[string]*Plate{}, motions: map[string]*motion.Model{}}
	switch {
	case c.ID == "" || strings.ContainsAny(c.ID, "@/ "):
		return nil, fmt.Errorf("model id %q must be given and hold no '@', '/' or blank", c.ID)
	case c.Edition == "" || strings.ContainsAny(c.Edition, "@/ "):
		return nil, fmt.Errorf("model edition %q must be given and hold no '@', '/' or blank", c.Edition)
	}
	m.c.Plates = slices.Clone(c.Plates)
	slices.SortFunc(m.c.Plates, func(a, b Plate) int { return strings.Compare(a.Code, b.Code) })
	for i := range m.c.Plates {
		p := &m.c.Plates[i]
		if m.plates[p.Code] != nil {
			return nil, fmt.Errorf("plate %q stands twice", p.Code)
		}
		m.plates[p.Code] = p
	}
	var err error
	if m.network, err = boundary.NewNetwork(c.Boundaries); err != nil {
		return nil, err
	}
	for _, b := range m.network.Boundaries() {
		m.maxSigmaKm[b.Type()] = max(m.maxSigmaKm[b.Type()], b.SigmaKm())
	}
	for _, code := range m.network.Plates() {
		if m.plates[code] == nil {
			return nil, fmt.Errorf("plate %q bounds something and is not in the table of plates", code)
		}
	}
	for _, mm := range c.Motions {
		if m.motions[mm.Name()] != nil {
			return nil, fmt.Errorf("motion model %q stands twice", mm.Name())
		}
		m.motions[mm.Name()] = mm
		for _, e := range mm.Entries() {
			if m.plates[e.Plate] == nil {
				return nil, fmt.Errorf("motion model %q: plate %q is not in the table of plates", mm.Name(), e.Plate)
			}
		}
	}
	if m.motions[c.DefaultMotion] == nil {
		return nil, fmt.Errorf("the default motion model %q is not among the model's: %s", c.DefaultMotion, strings.Join(m.MotionNames(), ", "))
	}
	if err := m.tieSlabs(); err != nil {
		return nil, err
	}
	m.nameJunctions()
	for _, h := range c.Hotspots {
		m.hotspots = append(m.hotspots, sphere.FromLonLat(h.At))
	}
	return m, nil
}

// slabTie is what ties a slab to the network.
type slabTie struct {
	group    *boundary.Group // the boundaries that it goes down from
	collides bool            // one of them is continental convergence
}

// tieSlabs ties each slab to its boundaries and plates.
func (m *Model) tieSlabs() error {
	m.slabOf = map[string]bool{}
	ids := map[string]bool{}
	for _, s := range m.c.Slabs {
		if ids[s.ID] {
			return fmt.Errorf("slab %q stands twice", s.ID)
		}
		ids[s.ID] = true
		for _, code := range [...]string{s.Subducting, s.Overriding} {
			if m.plates[code] == nil {
				return fmt.Errorf("slab %q: plate %q is not in the table of plates", s.ID, code)
			}
		}
		g, err := m.network.Group(s.BoundaryIDs)
		if err != nil {
			return fmt.Errorf("slab %q: boundary_ids: %w", s.ID, err)
		}
		tie := slabTie{group: g}
		for _, id := range s.BoundaryIDs {
			m.slabOf[id] = true
			b, _ := m.network.Boundary(id) // the group has it
			tie.collides = tie.collides || b.Type() == boundary.ContinentalConvergent
		}
		m.slabTies = append(m.slabTies, tie)
	}
	return nil
}

// nameJunctions names the network's triple junctions: as the model says, else
// after their plates.
func (m *Model) nameJunctions() {
	for _, j := range m.network.Junctions() {
		name, ok := m.c.JunctionNames[j.At]
		if !ok {
			var plates []string
			for _, code := range j.Plates {
				plates = append(plates, m.plates[code].Name)
			}
			name = strings.Join(plates, "-") + " triple junction"
		}
		m.junctions = append(m.junctions, Junction{name, j.At, j.Plates, sphere.FromLonLat(j.At)})
	}
	slices.SortFunc(m.junctions, func(a, b Junction) int { return strings.Compare(a.Name, b.Name) })
}

// ID returns the model's name.
func (m *Model) ID() string { return m.c.ID }

// Edition returns which edition of the model this is.
func (m *Model) Edition() string { return m.c.Edition }

// Ref returns "id@edition".
func (m *Model) Ref() string { return m.c.ID + "@" + m.c.Edition }

// SHA256 returns the checksum, in hex, of the model's canonical files.
func (m *Model) SHA256() string { return m.c.SHA256 }

// Title returns the model's title.
func (m *Model) Title() string { return m.c.Title }

// Licence returns the licence of the model's data.
func (m *Model) Licence() string { return m.c.Licence }

// Citations returns what an author who uses the answers should cite.
func (m *Model) Citations() []string { return slices.Clone(m.c.Citations) }

// Network returns the boundaries.
func (m *Model) Network() *boundary.Network { return m.network }

// Plates returns the plates, sorted by code.
func (m *Model) Plates() []Plate { return slices.Clone(m.c.Plates) }

// Junctions returns the triple junctions, sorted by name.
func (m *Model) Junctions() []Junction { return slices.Clone(m.junctions) }

// Zones returns the zones of diffuse deformation. They must not be changed.
func (m *Model) Zones() []*Zone { return slices.Clone(m.c.Zones) }

// Hotspots returns the hotspots.
func (m *Model) Hotspots() []Hotspot { return slices.Clone(m.c.Hotspots) }

// Slabs returns the slabs. They must not be changed.
func (m *Model) Slabs() []*slab.Slab { return slices.Clone(m.c.Slabs) }

// Land returns the outlines of land near spreading ridges.
func (m *Model) Land() []*Land { return slices.Clone(m.c.Land) }

// Warnings returns the known faults of the model's data.
func (m *Model) Warnings() []Warning { return slices.Clone(m.c.Warnings) }

// DefaultMotion returns the name of the motion model used where none is asked for.
func (m *Model) DefaultMotion() string { return m.c.DefaultMotion }

// Motion returns the motion model of that name.
func (m *Model) Motion(name string) (*motion.Model, bool) {
	mm, ok := m.motions[name]
	return mm, ok
}

// MotionNames returns the names of the motion models, sorted.
func (m *Model) MotionNames() []string {
	var names []string
	for name := range m.motions {
		names = append(names, name)
	}
	slices.Sort(names)
	return names
}
