package published

import (
	"errors"
	"fmt"
	"io"
	"maps"
	"math"
	"slices"
	"strings"

	"nearmargin/setting"
	"nearmargin/setting/boundary"
	"nearmargin/setting/bundle"
	"nearmargin/setting/motion"
	"nearmargin/setting/slab"
)

// PB2002 is the name of the motion model that a table of poles becomes.
const PB2002 = "pb2002"

// Build puts a model together. The report is there with an error too. Faults of
// the network and rejected lines are kept with the model as warnings; more of them
// in one file than the request allows are an error.
func Build(q Request) (*bundle.Bundle, *Report, error) {
	b := builder{q: q, report: &Report{}}
	if b.q.MaxRejected == 0 {
		b.q.MaxRejected = DefaultMaxRejected
	}
	if b.q.Progress == nil {
		b.q.Progress = func(string) {}
	}
	out, err := b.build()
	return out, b.report, err
}

type builder struct {
	q        Request
	report   *Report
	draft    *bundle.Draft
	names    map[string]string
	warnings []setting.Warning
	network  *boundary.Network
	outlines []Outline
	sources  []string // citations of what was read
	licences []string
}

func (b *builder) build() (*bundle.Bundle, error) {
	if err := b.check(); err != nil {
		return nil, err
	}
	var err error
	if b.draft, err = bundle.NewDraft(b.q.Base); err != nil {
		return nil, err
	}
	b.names = maps.Clone(plateNames)
	if b.q.Base != nil {
		for _, p := range b.q.Base.Model.Plates() {
			b.names[p.Code] = p.Name
		}
		b.warnings = b.keptWarnings()
	}
	for _, part := range [...]func() error{b.boundaries, b.zones, b.motions, b.plates, b.slabs} {
		if err := part(); err != nil {
			return nil, err
		}
	}
	b.addWarnings()
	b.draft.SetIdentity(b.identity())
	b.q.Progress("checking the model")
	return b.draft.Bundle()
}

func (b *builder) check() error {
	q := &b.q
	switch {
	case q.Steps != nil && q.Boundaries != nil:
		return fmt.Errorf("steps and boundaries are both given; a model has one network")
	case q.Steps == nil && q.Boundaries == nil && q.Base == nil:
		return fmt.Errorf("there are no boundaries: give steps, boundaries, or a base")
	case q.Poles == nil && len(q.Velocities) == 0 && q.Base == nil:
		return fmt.Errorf("there are no angular velocities: give poles, velocities, or a base")
	case q.Boundaries != nil && q.Mapping == nil:
		return fmt.Errorf("boundaries need a mapping of their properties")
	case !(q.MaxRejected > 0 && q.MaxRejected <= 1):
		return fmt.Errorf("the largest share of rejected lines is %g; it must be more than 0 and at most 1", q.MaxRejected)
	}
	return nil
}

// read opens a file's text, hands it to a reader, and keeps and judges the tally.
func (b *builder) read(f *File, parse func(text io.Reader) (Tally, error)) error {
	b.q.Progress("reading " + f.Name)
	text, closeIt, err := textOf(*f)
	if err != nil {
		return err
	}
	t, err := parse(text)
	if err = errors.Join(err, closeIt()); err != nil {
		if t.Rejected > 0 {
			b.report.Tallies = append(b.report.Tallies, t)
		}
		return err
	}
	return b.judge(t)
}

func (b *builder) judge(t Tally) error {
	b.report.Tallies = append(b.report.Tallies, t)
	all := t.Read + t.Rejected
	switch {
	case t.Read == 0 && all > 0:
		return fmt.Errorf("%s: none of %d lines could be read; the first: %v", t.File, all, t.Rejects[0])
	case all == 0:
		return fmt.Errorf("%s: holds nothing", t.File)
	case float64(t.Rejected) > b.q.MaxRejected*float64(all):
		return fmt.Errorf("%s: %d of %d lines were rejected, more than a share of %g; the first: %v", t.File, t.Rejected, all, b.q.MaxRejected, t.Rejects[0])
	}
	return nil
}

func (b *builder) plateName(code string) string {
	if name := b.names[code]; name != "" {
		return name
	}
	return code
}

func (b *builder) boundaries() error {
	var list []*boundary.Boundary
	var err error
	switch {
	case b.q.Steps != nil:
		err = b.read(b.q.Steps, func(text io.Reader) (Tally, error) {
			steps, t, err := ReadSteps(b.q.Steps.Name, text, b.q.Codes)
			if err == nil {
				list, err = Runs(steps, b.plateName)
			}
			return t, err
		})
		b.cite(citeBird, "ODC-BY-1.0 (Bird 2003)")
	case b.q.Boundaries != nil:
		err = b.read(b.q.Boundaries, func(text io.Reader) (t Tally, err error) {
			list, t, err = ReadGeoJSON(b.q.Boundaries.Name, text, b.q.Mapping, b.q.Codes)
			return t, err
		})
		b.cite("Boundaries: "+b.q.Boundaries.base(), "")
	default:
		b.network = b.q.Base.Model.Network()
	}
	if err != nil {
		return err
	}
	if list != nil {
		if err := b.draft.SetBoundaries(list); err != nil {
			return err
		}
		if b.network, err = boundary.NewNetwork(list); err != nil {
			return err
		}
	}
	return b.readOutlines()
}

func (b *builder) readOutlines() error {
	if b.q.Plates == nil {
		return nil
	}
	return b.read(b.q.Plates, func(text io.Reader) (t Tally, err error) {
		b.outlines, t, err = ReadDig(b.q.Plates.Name, text)
		b.cite(citeBird, "ODC-BY-1.0 (Bird 2003)")
		return t, err
	})
}

func (b *builder) zones() error {
	if b.q.Orogens == nil {
		return nil
	}
	var zones []*setting.Zone
	err := b.read(b.q.Orogens, func(text io.Reader) (Tally, error) {
		outlines, t, err := ReadDig(b.q.Orogens.Name, text)
		zones = Zones(outlines, &t)
		return t, err
	})
	if err != nil {
		return err
	}
	b.cite(citeBird, "ODC-BY-1.0 (Bird 2003)")
	return b.draft.SetZones(zones)
}

func (b *builder) motions() error {
	if f := b.q.Poles; f != nil {
		var rows []bundle.MotionRow
		info := b.infoOf(PB2002)
		err := b.read(f, func(text io.Reader) (Tally, error) {
			poles, t, err := ReadPoles(f.Name, text, b.q.Codes)
			for _, p := range poles {
				rows = append(rows, p.MotionRow)
				if p.Fixed {
					info.RelativeTo = p.Plate
				}
			}
			return t, err
		})
		if err != nil {
			return err
		}
		b.cite(citeBird, "ODC-BY-1.0 (Bird 2003)")
		if err := b.draft.SetMotion(info, bundle.PoleForm, rows); err != nil {
			return err
		}
	}
	for _, v := range b.q.Velocities {
		var rows []bundle.MotionRow
		var form bundle.MotionForm
		err := b.read(&v.File, func(text io.Reader) (t Tally, err error) {
			form, rows, t, err = ReadVelocities(v.File.Name, text, b.namedPlates(), b.q.Codes)
			return t, err
		})
		if err != nil {
			return err
		}
		info := b.infoOf(v.Name)
		b.cite(info.Citation, "")
		if err := b.draft.SetMotion(info, form, rows); err != nil {
			return err
		}
	}
	return nil
}

// infoOf says what a motion model is: as the base does for one of that name.
func (b *builder) infoOf(name string) motion.Info {
	if b.q.Base != nil {
		if m, ok := b.q.Base.Model.Motion(name); ok {
			return m.Info()
		}
	}
	if name == PB2002 {
		return motion.Info{
			Name: PB2002, Title: "Poles of the PB2002 plate model", Frame: "Pacific plate fixed", RelativeTo: "PA",
			TimeSpan: "0 to 3.16 Myr for the large plates; decades for plates known from geodesy",
			Citation: "Bird (2003), Table 1",
		}
	}
	return motion.Info{Name: name, Title: name, Frame: "that of the published table", TimeSpan: "that of the published table", Citation: "Angular velocities: " + name}
}

func (b *builder) namedPlates() []setting.Plate {
	var out []setting.Plate
	for _, code := range slices.Sorted(maps.Keys(b.names)) {
		out = append(out, setting.Plate{Code: code, Name: b.names[code]})
	}
	return out
}

// plates makes the table of plates: those of the network, and those that a
// composed velocity hangs on. Motion models keep no others.
func (b *builder) plates() error {
	moving, err := b.draft.KeepMotionsOf(b.network.Plates())
	if err != nil {
		return err
	}
	codes := slices.Concat(b.network.Plates(), moving)
	slices.Sort(codes)
	var out []setting.Plate
	for _, code := range slices.Compact(codes) {
		out = append(out, setting.Plate{Code: code, Name: b.plateName(code)})
	}
	b.draft.SetPlates(out)
	if len(b.outlines) > 0 {
		b.warnings = append(b.warnings, CheckOutlines(b.outlines, b.network, b.q.Codes)...)
	}
	return nil
}

// supersededShare is the share of a base slab's places above which it gives way to
// an imported slab that lies there too.
const supersededShare = 0.25

// slabs reads the grids, and ties them and the slabs of the base to the network.
func (b *builder) slabs() error {
	var list []*slab.Slab
	ties := Ties{b.network}
	if len(b.q.Slab2) > 0 {
		b.q.Progress(fmt.Sprintf("reading %d files of slabs", len(b.q.Slab2)))
		grids, tallies, skipped, err := ReadSlab2(b.q.Slab2)
		b.report.Skipped = skipped
		for _, t := range tallies {
			if e := b.judge(t); e != nil && err == nil {
				err = e
			}
		}
		switch {
		case err != nil:
			return err
		case len(grids) == 0:
			return fmt.Errorf("none of %d files is named ZONE_slab2_LAYER_DATE.xyz or .xyz.gz, LAYER one of dep, unc, dip, str, thk", len(b.q.Slab2))
		}
		for i := range grids {
			s, err := b.slabOf(&grids[i], ties)
			if err != nil {
				return err
			}
			list = append(list, s)
		}
		b.cite(citeSlab2, "public domain in the United States (Slab2, U.S. Geological Survey)")
	}
	if b.q.Base != nil {
		kept, err := b.keptSlabs(list, ties)
		if err != nil {
			return err
		}
		list = append(list, kept...)
	}
	return b.draft.SetSlabs(list)
}

func (b *builder) slabOf(g *Grids, ties Ties) (*slab.Slab, error) {
	zone, ok := slabZones[g.Zone]
	if !ok {
		zone = slabZone{"Slab " + g.Zone, slab.Subduction}
	}
	surface, err := slab.NewGrid(g.Layers)
	if err != nil {
		return nil, fmt.Errorf("%s: %w", g.File, err)
	}
	tie := ties.Of(surface, zone.kind, Tie{})
	if len(tie.BoundaryIDs) == 0 {
		b.warn("slab_without_boundary", "slab %s (%s): no boundary from which it could go down lies within %d km of its up-dip rim; it is taken to lie within plate %s", g.Zone, zone.name, tieReachKm, tie.Overriding)
	}
	return slab.New(slab.Spec{
		ID: g.Zone, Name: zone.name, Kind: zone.kind, BoundaryIDs: tie.BoundaryIDs, Subducting: tie.Subducting, Overriding: tie.Overriding,
		ArcMinDepthKm: arcMinDepthKm, Source: "Hayes et al. (2018), grid of " + g.Date, SourceStatus: string(boundary.Consulted), Surface: surface,
	})
}

// keptSlabs returns the slabs of the base that no imported slab takes the place
// of, tied anew where the network is another.
func (b *builder) keptSlabs(imported []*slab.Slab, ties Ties) ([]*slab.Slab, error) {
	var out []*slab.Slab
	for _, s := range b.q.Base.Model.Slabs() {
		if by := superseding(s, imported); by != "" {
			b.report.Superseded = append(b.report.Superseded, s.ID+" by "+by)
			continue
		}
		if b.network != b.q.Base.Model.Network() {
			spec := s.Spec
			tie := ties.Of(s.Surface, s.Kind, Tie{Subducting: s.Subducting, Overriding: s.Overriding})
			spec.BoundaryIDs, spec.Subducting, spec.Overriding = tie.BoundaryIDs, tie.Subducting, tie.Overriding
			var err error
			if s, err = slab.New(spec); err != nil {
				return nil, err
			}
			if len(tie.BoundaryIDs) == 0 {
				b.warn("slab_without_boundary", "slab %s (%s), of the base: no boundary from which it could go down lies within %d km of its up-dip rim; it is taken to lie within plate %s", s.ID, s.Name, tieReachKm, tie.Overriding)
			}
		}
		out = append(out, s)
	}
	return out, nil
}

// superseding returns the id of the imported slab that takes a slab's place, "".
func superseding(s *slab.Slab, imported []*slab.Slab) string {
	spots := slab.Spots(s.Surface)
	for _, x := range imported {
		over := 0
		for _, p := range spots {
			if _, in := x.Surface.At(p); in {
				over++
			}
		}
		if x.ID == s.ID || float64(over) > supersededShare*float64(len(spots)) {
			return x.ID
		}
	}
	return ""
}

func (b *builder) warn(code, format string, args ...any) {
	b.warnings = append(b.warnings, setting.Warning{Code: code, Detail: fmt.Sprintf(format, args...)})
}

// keptWarnings returns the base's warnings of what is kept of it.
func (b *builder) keptWarnings() []setting.Warning {
	if b.q.Steps != nil || b.q.Boundaries != nil {
		return nil // they hold for the network that is replaced
	}
	return slices.DeleteFunc(b.q.Base.Model.Warnings(), func(w setting.Warning) bool { return strings.HasPrefix(w.Code, networkFault) })
}

const networkFault = "network_"

// addWarnings puts the faults of the network first, then the other warnings, then
// the rejected lines.
func (b *builder) addWarnings() {
	var out []setting.Warning
	for _, f := range b.network.Faults() {
		at := f.At
		at.Lon, at.Lat = round6(at.Lon), round6(at.Lat)
		out = append(out, setting.Warning{Code: networkFault + f.Code, Placed: true, At: at, Detail: f.Detail})
	}
	out = append(out, b.warnings...)
	for _, t := range b.report.Tallies {
		for _, r := range t.Rejects {
			out = append(out, setting.Warning{Code: "rejected_line", Detail: strings.Map(printable, Reject{File{Name: r.File}.base(), r.Line, r.Reason}.String())})
		}
	}
	b.draft.SetWarnings(out)
}

func round6(x float64) float64 { return math.Round(x*1e6)/1e6 + 0 }
