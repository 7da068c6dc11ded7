package revision

import (
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"nearmargin/setting"
	"nearmargin/setting/boundary"
	"nearmargin/setting/motion"
	"nearmargin/setting/slab"
	"nearmargin/setting/sphere"
)

// The parts of a model.
const (
	partAbout    = "description"
	partPlate    = "plate"
	partBoundary = "boundary"
	partJunction = "triple junction"
	partMotion   = "motion model"
	partVelocity = "angular velocity"
	partSlab     = "slab"
	partZone     = "diffuse zone"
	partHotspot  = "hotspot"
	partLand     = "land"
)

func (r *Report) about(a, b *setting.Model) {
	var d details
	d.text("title", a.Title(), b.Title())
	d.text("licence", a.Licence(), b.Licence())
	d.text("citations", strings.Join(a.Citations(), " | "), strings.Join(b.Citations(), " | "))
	d.word("default motion model", a.DefaultMotion(), b.DefaultMotion())
	r.note(partAbout, "model.json", 0, d)
}

func (r *Report) plates(a, b *setting.Model) {
	names := func(m *setting.Model) map[string]string {
		out := map[string]string{}
		for _, p := range m.Plates() {
			out[p.Code] = p.Name
		}
		return out
	}
	compare(r, partPlate, names(a), names(b), func(code, x, y string) {
		var d details
		d.text("name", x, y)
		r.note(partPlate, code, 0, d)
	})
}

func (r *Report) boundaries(a, b *setting.Model) {
	byID := func(m *setting.Model) map[string]*boundary.Boundary {
		out := map[string]*boundary.Boundary{}
		for _, x := range m.Network().Boundaries() {
			out[x.ID()] = x
		}
		return out
	}
	compare(r, partBoundary, byID(a), byID(b), func(id string, x, y *boundary.Boundary) {
		var d details
		km := lineMove(x.Path(), y.Path())
		switch {
		case km > 0:
			d = append(d, fmt.Sprintf("moved by up to %.2f km", km))
		case !slices.Equal(x.Path(), y.Path()):
			d = append(d, "the same line with other vertices or in the other direction")
		}
		d.word("type", x.Type().String(), y.Type().String())
		d.word("left_plate", x.Left(), y.Left())
		d.word("right_plate", x.Right(), y.Right())
		d.word("subducting_plate", x.Subducting(), y.Subducting())
		d.number("sigma", "km", x.SigmaKm(), y.SigmaKm())
		d.text("name", x.Name(), y.Name())
		d.text("source", x.Source(), y.Source())
		d.word("source_status", string(x.SourceStatus()), string(y.SourceStatus()))
		r.note(partBoundary, id, km, d)
	})
}

// still is the distance below which nothing has moved: rounding of the geometry.
const still = 1e-6 // km

// lineMove returns the largest distance in km from a vertex of either line to the other.
func lineMove(a, b []sphere.LonLat) float64 {
	if slices.Equal(a, b) {
		return 0
	}
	km := max(farthest(a, b), farthest(b, a))
	if km < still {
		return 0
	}
	return km
}

func farthest(from, to []sphere.LonLat) (km float64) {
	var pts []sphere.Vec
	for _, p := range to {
		pts = append(pts, sphere.FromLonLat(p))
	}
	path, err := sphere.NewPath(pts)
	if err != nil {
		return math.NaN() // no line of a model is without a path
	}
	for _, p := range from {
		_, _, _, rad := path.Nearest(sphere.FromLonLat(p))
		km = max(km, sphere.RadToKm(rad))
	}
	return km
}

func move(a, b sphere.LonLat) float64 {
	km, _ := sphere.Inverse(a, b)
	return km
}

func (r *Report) junctions(a, b *setting.Model) {
	places := func(m *setting.Model) map[string]sphere.LonLat {
		out := map[string]sphere.LonLat{}
		for _, j := range m.Junctions() {
			out[unique(out, j.Name)] = j.At
		}
		return out
	}
	compare(r, partJunction, places(a), places(b), func(name string, x, y sphere.LonLat) { r.place(partJunction, name, x, y, nil) })
}

// place notes how far a place moved, and what else there is.
func (r *Report) place(part, id string, x, y sphere.LonLat, d details) {
	km := 0.0
	if x != y {
		km = move(x, y)
		d = append(details{fmt.Sprintf("moved by %.2f km", km)}, d...)
	}
	r.note(part, id, km, d)
}

// unique returns the name, with a number where it is taken.
func unique[P any](have map[string]P, name string) string {
	id := name
	for n := 2; ; n++ {
		if _, taken := have[id]; !taken {
			return id
		}
		id = name + " " + strconv.Itoa(n)
	}
}

func (r *Report) motions(a, b *setting.Model) {
	byName := func(m *setting.Model) map[string]*motion.Model {
		out := map[string]*motion.Model{}
		for _, name := range m.MotionNames() {
			out[name], _ = m.Motion(name)
		}
		return out
	}
	compare(r, partMotion, byName(a), byName(b), func(name string, x, y *motion.Model) {
		var d details
		from, to := x.Info(), y.Info()
		d.text("title", from.Title, to.Title)
		d.text("frame", from.Frame, to.Frame)
		d.text("time span", from.TimeSpan, to.TimeSpan)
		d.text("citation", from.Citation, to.Citation)
		d.word("relative to", from.RelativeTo, to.RelativeTo)
		r.note(partMotion, name, 0, d)
		r.velocities(name, x, y)
	})
}

func (r *Report) velocities(name string, a, b *motion.Model) {
	entries := func(m *motion.Model) map[string]motion.Entry {
		out := map[string]motion.Entry{}
		for _, e := range m.Entries() {
			out[name+" "+e.Plate] = e
		}
		return out
	}
	compare(r, partVelocity, entries(a), entries(b), func(id string, x, y motion.Entry) {
		var d details
		if x.Vector != y.Vector {
			p, q := motion.PoleOf(x.Vector), motion.PoleOf(y.Vector)
			// rad/Myr times km is km/Myr, which is mm/yr
			mmYr := y.Vector.Sub(x.Vector).Norm() * sphere.MeanRadiusKm
			d = append(d, fmt.Sprintf("pole %.3f°N %.3f°E %.4f°/Myr to %.3f°N %.3f°E %.4f°/Myr, up to %.2f mm/yr at the surface",
				p.Lat, p.Lon, p.RateDegMyr, q.Lat, q.Lon, q.RateDegMyr, mmYr))
		}
		if x.Spread != y.Spread {
			d = append(d, "uncertainty changed")
		}
		d.word("basis", x.Basis, y.Basis)
		r.note(partVelocity, id, 0, d)
	})
}

func (r *Report) slabs(a, b *setting.Model) {
	byID := func(m *setting.Model) map[string]*slab.Slab {
		out := map[string]*slab.Slab{}
		for _, s := range m.Slabs() {
			out[s.ID] = s
		}
		return out
	}
	compare(r, partSlab, byID(a), byID(b), func(id string, x, y *slab.Slab) {
		var d details
		km, note := surfaceMove(x.Surface, y.Surface)
		if note != "" {
			d = append(d, note)
		}
		d.word("kind", x.Kind.String(), y.Kind.String())
		d.word("subducting_plate", x.Subducting, y.Subducting)
		d.word("overriding_plate", x.Overriding, y.Overriding)
		d.number("arc_min_depth", "km", x.ArcMinDepthKm, y.ArcMinDepthKm)
		d.word("boundary_ids", strings.Join(x.BoundaryIDs, " "), strings.Join(y.BoundaryIDs, " "))
		d.text("name", x.Name, y.Name)
		d.text("source", x.Source, y.Source)
		d.word("source_status", x.SourceStatus, y.SourceStatus)
		r.note(partSlab, id, km, d)
	})
}

// surfaceMove compares two surfaces where both have a depth.
func surfaceMove(a, b slab.Surface) (km float64, note string) {
	places := append(knots(a), knots(b)...)
	both, one := 0, 0
	for _, v := range places {
		x, inA := a.At(v)
		y, inB := b.At(v)
		switch {
		case inA && inB:
			both++
			km = max(km, math.Abs(x.DepthKm-y.DepthKm))
		case inA != inB:
			one++
		}
	}
	same := slices.EqualFunc(slab.Contours(a), slab.Contours(b), func(x, y slab.Contour) bool {
		return x.DepthKm == y.DepthKm && x.SigmaKm == y.SigmaKm && slices.Equal(x.Path, y.Path)
	}) && slices.EqualFunc(knots(a), knots(b), func(v, w sphere.Vec) bool { return v == w })
	switch {
	case km > still:
		return km, fmt.Sprintf("depth changed by up to %.2f km at %d places; %d places lie on one of the two alone", km, both, one)
	case !same:
		return 0, fmt.Sprintf("surface changed where it reaches or in its σ; %d of %d places lie on one of the two alone", one, both+one)
	}
	return 0, ""
}

// maxKnots bounds the nodes of a grid that are compared.
const maxKnots = 20_000

// knots returns the vertices of a surface's contours, or nodes of its grid.
func knots(s slab.Surface) []sphere.Vec {
	var out []sphere.Vec
	for _, c := range slab.Contours(s) {
		for _, p := range c.Path {
			out = append(out, sphere.FromLonLat(p))
		}
	}
	l, ok := slab.GridLayers(s)
	if !ok {
		return out
	}
	d := l.Depth
	for i := 0; i < len(d.Values); i += 1 + len(d.Values)/maxKnots {
		if d.Values[i] == d.Values[i] { // a node with a depth
			out = append(out, sphere.FromLonLat(sphere.LonLat{Lon: d.West + float64(i%d.Cols)*d.Step, Lat: d.South + float64(i/d.Cols)*d.Step}))
		}
	}
	return out
}

func (r *Report) zones(a, b *setting.Model) {
	byName := func(m *setting.Model) map[string]*setting.Zone {
		out := map[string]*setting.Zone{}
		for _, z := range m.Zones() {
			out[unique(out, z.Name)] = z
		}
		return out
	}
	compare(r, partZone, byName(a), byName(b), func(name string, x, y *setting.Zone) {
		var d details
		km := ringsMove(x.Rings, y.Rings, &d)
		d.word("kind", x.Kind.String(), y.Kind.String())
		d.text("source", x.Source, y.Source)
		r.note(partZone, name, km, d)
	})
}

// ringsMove compares outlines.
func ringsMove(a, b [][]sphere.LonLat, d *details) (km float64) {
	if slices.EqualFunc(a, b, slices.Equal) {
		return 0
	}
	if len(a) != len(b) {
		*d = append(*d, fmt.Sprintf("%d rings to %d", len(a), len(b)))
	}
	for i := range min(len(a), len(b)) {
		km = max(km, lineMove(a[i], b[i])) // #nosec G602 -- i is below the length of both
	}
	*d = append(*d, fmt.Sprintf("outline moved by up to %.2f km", km))
	return km
}

func (r *Report) hotspots(a, b *setting.Model) {
	byName := func(m *setting.Model) map[string]setting.Hotspot {
		out := map[string]setting.Hotspot{}
		for _, h := range m.Hotspots() {
			out[unique(out, h.Name)] = h
		}
		return out
	}
	compare(r, partHotspot, byName(a), byName(b), func(name string, x, y setting.Hotspot) {
		var d details
		d.text("source", x.Source, y.Source)
		r.place(partHotspot, name, x.At, y.At, d)
	})
}

func (r *Report) land(a, b *setting.Model) {
	byName := func(m *setting.Model) map[string]*setting.Land {
		out := map[string]*setting.Land{}
		for _, l := range m.Land() {
			out[unique(out, l.Name)] = l
		}
		return out
	}
	compare(r, partLand, byName(a), byName(b), func(name string, x, y *setting.Land) {
		var d details
		km := ringsMove([][]sphere.LonLat{x.Ring}, [][]sphere.LonLat{y.Ring}, &d)
		r.note(partLand, name, km, d)
	})
}
