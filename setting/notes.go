package setting

import "nearmargin/setting/motion"

// oldRockMa is the age above which the present-day setting is likely not that of
// the rock's formation.
const oldRockMa = 5

// addNotes adds every note that the answer needs, the one on age first.
func (l *Lookup) addNotes(a *Answer) {
	if a.Site.AgeMa > oldRockMa { // false for NaN
		a.Notes.add(Note{Code: NotePresentDay})
	}
	if a.Site.Lon == 0 && a.Site.Lat == 0 {
		a.Notes.add(Note{Code: NoteZeroZero})
	}
	if a.SideUncertain {
		a.Notes.add(Note{NoteSideUncertain, a.Plate.Code, a.plateAcross})
	}
	l.motionNotes(a, &a.Nearest.Motion)
	if a.IsControlled && a.Controlling.Boundary != a.Nearest.Boundary {
		l.motionNotes(a, &a.Controlling.Motion)
	}
	if a.Zone != nil && a.Nearest.Motion.Known {
		a.Notes.add(Note{NoteZoneTotal, a.Zone.Name, ""})
	}
	if a.IsControlled {
		if b := a.Controlling.Boundary; b.Left() != a.Plate.Code && b.Right() != a.Plate.Code {
			a.Notes.add(Note{NoteOtherPlates, b.Left(), b.Right()})
		}
		if a.Family == SubductionFamily && len(l.m.c.Slabs) == 0 {
			a.Notes.add(Note{Code: NoteNoSlabs})
		}
	}
	if d := a.Site.DepthKm; a.Slabs.Len() > 0 && (d == 10 || d == 33) {
		a.Notes.add(Note{Code: NoteFixedDepth})
	}
	a.Notes.add(Note{Code: NoteScreening})
}

func (l *Lookup) motionNotes(a *Answer, m *Motion) {
	if !m.Known {
		lacking := m.Plate
		if l.motion.Has(lacking) {
			lacking = m.RelativeTo
		}
		a.note(Note{NoteNoMotion, l.motion.Name(), lacking})
		return
	}
	if m.Model != l.motion.Name() {
		a.note(Note{NoteOtherMotion, l.motion.Name(), m.Model})
	}
	mm := l.m.motions[m.Model]
	composed := false
	for _, code := range [...]string{m.Plate, m.RelativeTo} {
		if basis := mm.Basis(code); basis != motion.Published {
			a.note(Note{NoteComposed, code, basis})
			composed = true
		}
	}
	if !composed && m.RateSigmaMmYr == m.RateSigmaMmYr { // not NaN
		a.note(Note{Code: NoteSigmaBound})
	}
}

// note adds a note unless it stands already.
func (a *Answer) note(n Note) {
	for _, have := range a.Notes.All() {
		if have == n {
			return
		}
	}
	a.Notes.add(n)
}
