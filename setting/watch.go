package setting

import "math"

// watch notes, while the rules are tried on the evidence as it stands, which
// quantities could change the verdict if they alone moved by one σ.
//
// The rules go by comparisons. A quantity that none of the comparisons met on the
// way would see, moved by one σ, leaves the way and so the verdict as they are;
// only the others need be tried. A rule that compares several quantities with each
// other marks them all: too many marks cost time, not truth.
type watch struct {
	on     bool
	siteKm float64 // 1σ of the site
	km     [numSources]bool
	limit  [numLimits]bool
	z      [maxSlabs]bool // depth of a slab's top
	trench [maxSlabs]bool // distance to a slab's boundary
}

// sees reports whether a comparison of two numbers may turn out differently when
// one of them moves by σ.
func sees(a, b, sigma float64) bool { return math.Abs(a-b) <= sigma*(1+1e-9)+1e-9 } // false for +Inf

// moveKm is the farthest that a source's distance is moved.
func (e *evidence) moveKm(s source) float64 { return max(e.sigma[s], e.watch.siteKm) }

// within reports whether a source is no farther than a limit.
func (e *evidence) within(s source, l LimitID) bool {
	km := e.upTo(s, e.about(s, l))
	if e.watch.on {
		if sees(km, e.limit[l], e.moveKm(s)) {
			e.watch.km[s] = true
		}
		e.watchLimit(km, l, 1)
	}
	return km <= e.limit[l]
}

// closer reports whether a source is nearer than a limit.
func (e *evidence) closer(s source, l LimitID) bool {
	return e.within(s, l) && e.km[s] < e.limit[l]
}

// watchLimit marks a limit, times a factor, that x is compared with.
func (e *evidence) watchLimit(x float64, l LimitID, factor float64) {
	if sees(x, e.limit[l]*factor, Limits[l].Sigma*factor) {
		e.watch.limit[l] = true
	}
}

// watchDepth marks the depth of slab i and a limit, times a factor, that it is
// compared with.
func (e *evidence) watchDepth(i int, l LimitID, factor float64) {
	if !e.watch.on {
		return
	}
	s := &e.slabs[i]
	if sees(s.z, e.limit[l]*factor, s.sigma) {
		e.watch.z[i] = true
	}
	e.watchLimit(s.z, l, factor)
}

// trenchWithin reports whether the boundary of slab i is no farther than a limit.
func (e *evidence) trenchWithin(i int, l LimitID) bool {
	s := &e.slabs[i]
	if math.IsInf(e.slabTrench(i), 1) {
		return false
	}
	if e.watch.on {
		if sees(s.trenchKm, e.limit[l], s.trench.Boundary.SigmaKm()) {
			e.watch.trench[i] = true
		}
		e.watchLimit(s.trenchKm, l, 1)
	}
	return s.trenchKm <= e.limit[l]
}
