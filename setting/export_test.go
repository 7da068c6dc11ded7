package setting

// VaryBoth answers for a site and returns the alternatives that moving quantities
// by one σ meets: those found by trying what the watch marked, and by trying all.
// It also returns how many quantities were marked.
func VaryBoth(l *Lookup, s Site) (watched, plain []Alternative, marks int, err error) {
	var a Answer
	if err := l.At(s, &a); err != nil {
		return nil, nil, 0, err
	}
	e := &a.scratch[0]
	for _, list := range [...][]bool{e.watch.km[:], e.watch.limit[:], e.watch.z[:], e.watch.trench[:]} {
		for _, marked := range list {
			if marked {
				marks++
			}
		}
	}
	start := func() { // with what the rule itself allows, as classify does
		a.Alternatives.clear()
		if v, rule := e.decide(); v.also != NoLabel {
			a.alternative(v.also, Cause{Kind: CauseRule, Rule: rule, Limit: v.limit}, e.zone)
		}
	}
	start()
	e.vary(&a)
	watched = append(watched, a.Alternatives.All()...)
	start()
	e.markAll()
	e.vary(&a)
	return watched, a.Alternatives.All(), marks, nil
}

// markAll looks up all that there is to compare and marks it.
func (e *evidence) markAll() {
	for i := range sources {
		e.upTo(source(i), sources[i].reachKm)
		e.watch.km[i] = true
	}
	for i := range e.slabs[:e.nSlabs] {
		e.slabTrench(i)
		e.watch.z[i], e.watch.trench[i] = true, true
	}
	for i := range e.watch.limit {
		e.watch.limit[i] = true
	}
}
