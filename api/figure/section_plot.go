package figure

import (
	"math"
	"slices"
	"strconv"

	"nearmargin/setting/slab"
	"nearmargin/setting/sphere"
)

// class returns the name of a class for one slab of a section.
func class(name string, profile int) string {
	return name + string(rune('0'+min(profile, numSlabLooks-1))) // #nosec G115 -- a digit
}

func (f *sectionFigure) at(km, depthKm float64) point {
	return point{f.x.px(km), f.y.px(depthKm)}
}

// bottom is the y of the plot's lower edge.
func (f *sectionFigure) bottom() float64 { return f.y.at + f.plotH }

const (
	leastTickX = 50
	leastTickY = 30
)

func (f *sectionFigure) depths() []float64 {
	step := tickStep(f.y.k, leastTickY)
	if f.exaggeration == 1 { // squares show the true scale
		step = tickStep(f.k, leastTickX)
	}
	return ticks(0, f.plotH/f.y.k, step)
}

func (f *sectionFigure) distances() []float64 {
	return ticks(f.s.Line.FromKm, f.s.Line.ToKm, tickStep(f.k, leastTickX))
}

// drawGrid draws a line at every labelled tick.
func (f *sectionFigure) drawGrid() {
	for _, z := range f.depths() {
		y := f.y.px(z)
		f.leaf("path", like("grid", "d", pathOf([]point{{f.x.at, y}, {f.x.at + f.plotW, y}}, false)))
	}
	for _, km := range f.distances() {
		x := f.x.px(km)
		f.leaf("path", like("grid", "d", pathOf([]point{{x, f.y.at}, {x, f.bottom()}}, false)))
	}
}

// runs calls draw for every run of samples with the slab below, from sample i up
// to and with sample j.
func (f *sectionFigure) runs(profile int, draw func(i, j int)) {
	p := &f.s.Profiles[profile]
	for i := 0; i < len(p.Readings); i++ {
		if !p.Has(i) {
			continue
		}
		j := i
		for j+1 < len(p.Readings) && p.Has(j+1) {
			j++
		}
		draw(i, j)
		i = j
	}
}

// curve returns the slab's top from sample i to sample j, moved by a number of σ;
// never above the surface.
func (f *sectionFigure) curve(profile, i, j int, sigmas float64) (pts []point) {
	for n := i; n <= j; n++ {
		r := &f.s.Profiles[profile].Readings[n]
		pts = append(pts, f.at(f.s.Samples[n].Km, math.Max(0, r.DepthKm+sigmas*sigma(r))))
	}
	return pts
}

// drawBand draws 1σ of a slab's depth either way.
func (f *sectionFigure) drawBand(profile int) {
	f.runs(profile, func(i, j int) {
		up, low := f.curve(profile, i, j, -1), f.curve(profile, i, j, 1)
		ring := append([]point{}, up...)
		for n := len(low) - 1; n >= 0; n-- {
			ring = append(ring, low[n])
		}
		f.leaf("path", like(class("band", profile), "d", pathOf(ring, true)))
		f.leaf("path", like(class("edge", profile), "d", pathOf(up, false)))
		f.leaf("path", like(class("edge", profile), "d", pathOf(low, false)))
	})
}

// drawSlab draws the top of a slab.
func (f *sectionFigure) drawSlab(profile int) {
	f.runs(profile, func(i, j int) {
		f.leaf("path", like(class("slab", profile), "d", pathOf(f.curve(profile, i, j, 0), false)))
	})
}

// mostJoinKm is the widest gap that is drawn across.
const mostJoinKm = 150

// join returns the dotted line from the trench to where the slab is first known,
// and whether there is a gap to draw it across.
func (f *sectionFigure) join() ([]point, bool) {
	if !f.s.HasTrench {
		return nil, false
	}
	p := &f.s.Profiles[0]
	for i := range p.Readings {
		if !p.Has(i) {
			continue
		}
		if km := f.s.Samples[i].Km; km > 0 && km <= mostJoinKm {
			return []point{f.at(0, 0), f.at(km, p.Readings[i].DepthKm)}, true
		}
		break
	}
	return nil, false
}

func (f *sectionFigure) drawJoin() {
	if pts, ok := f.join(); ok {
		f.leaf("path", like("join", "d", pathOf(pts, false)))
	}
}

// drawArc hatches what lies between the arc band and the slab.
func (f *sectionFigure) drawArc() {
	p := &f.s.Profiles[0]
	for _, r := range f.s.Arc.Ranges {
		ring := []point{f.at(r.FromKm, 0)}
		add := func(km float64) {
			if x, ok := p.Slab.Surface.At(sphere.FromLonLat(f.s.Line.At(km))); ok {
				ring = append(ring, f.at(km, x.DepthKm))
			}
		}
		add(r.FromKm)
		for i := range p.Readings {
			if km := f.s.Samples[i].Km; km > r.FromKm && km < r.ToKm && p.Has(i) {
				ring = append(ring, f.at(km, p.Readings[i].DepthKm))
			}
		}
		add(r.ToKm)
		ring = append(ring, f.at(r.ToKm, 0))
		f.leaf("path", attrs{"d", pathOf(ring, true), "fill", "url(#nm-hatch)", "fill-opacity", "0.45"})
	}
}

// drawSurface draws sea level.
func (f *sectionFigure) drawSurface() {
	f.leaf("path", like("ground", "d", pathOf([]point{{f.x.at, f.y.at}, {f.x.at + f.plotW, f.y.at}}, false)))
}

// drawAxes frames and labels the plot, and returns where it ends.
func (f *sectionFigure) drawAxes() float64 {
	low := f.bottom()
	f.leaf("path", like("frame", "d", pathOf([]point{{f.x.at, f.y.at}, {f.x.at, low}, {f.x.at + f.plotW, low}, {f.x.at + f.plotW, f.y.at}}, false)))
	text := func(s string, x, y float64, anchor string, more ...string) {
		f.content("text", s, like("ink", append([]string{"x", px(x), "y", px(y), "font-size", px(textSize), "text-anchor", anchor}, more...)...))
	}
	for _, z := range f.depths() {
		y := f.y.px(z)
		f.leaf("path", like("frame", "d", pathOf([]point{{f.x.at - 5, y}, {f.x.at, y}}, false)))
		text(number(z, 0), f.x.at-9, y+4.4, "end")
	}
	for _, km := range f.distances() {
		x := f.x.px(km)
		f.leaf("path", like("frame", "d", pathOf([]point{{x, low}, {x, low + 5}}, false)))
		text(number(km, 0), x, low+19, "middle")
	}
	x, y := px(marginX+10), px((f.y.at+low)/2)
	depth := "Depth (km)"
	if f.exaggeration != 1 {
		depth += ", exaggerated \u00d7" + strconv.FormatFloat(f.exaggeration, 'g', -1, 64)
	}
	f.content("text", depth, like("ink", "x", x, "y", y, "font-size", px(textSize), "text-anchor", "middle", "transform", "rotate(-90 "+x+" "+y+")"))

	up, down := f.directions()
	name := "Distance from the " + f.zero() + " (km)"
	const rowH = 17
	y2 := low + 38
	ends := math.Max(textWidth(up, textSize), textWidth(down, textSize)) + 12
	right := f.x.at + f.plotW
	switch w := textWidth(name, textSize); {
	case w+2*ends <= f.plotW: // all in one row
		text(name, f.x.at+f.plotW/2, y2, "middle")
	case w <= f.plotW:
		text(name, f.x.at+f.plotW/2, y2, "middle")
		y2 += rowH
	default:
		text(name, f.x.at, y2, "start")
		y2 += rowH
	}
	text(up, f.x.at, y2, "start")
	if 2*ends > f.plotW { // a very narrow plot
		y2 += rowH
		right = math.Max(right, f.x.at+ends)
	}
	text(down, right, y2, "end")
	return y2 + 6
}

// drawMarks draws and labels trench, site and arc band in the lanes above the
// plot. A label runs to the right of its mark where there is room; trench and site
// change lanes where a lead would else run through a label.
func (f *sectionFigure) drawMarks() {
	lane := func(n int) float64 { return f.y.at - float64(3-n)*laneH + 13 } // baseline, the uppermost lane is 0
	lead := func(x, from float64) {
		f.leaf("path", like("lead", "d", pathOf([]point{{x, from}, {x, f.y.at}}, false)))
	}
	site := f.x.px(f.s.SiteKm)
	siteAt := f.beside(site, f.siteLabel(), f.shortSiteLabel())
	trenchLane, siteLane := 0, 1
	if f.s.HasTrench {
		x := f.x.px(0)
		trenchAt := f.beside(x, f.trenchLabel(), f.s.Trench.Boundary.Name())
		if siteAt.covers(x) && !trenchAt.covers(site) {
			trenchLane, siteLane = 1, 0
		}
		lead(x, lane(trenchLane)-10)
		lead(site, lane(siteLane)-10)
		f.drawArcBar(site, x)
		f.leaf("path", like("ring", "d", pathOf([]point{{x, f.y.at}, {x - 6, f.y.at - 11}, {x + 6, f.y.at - 11}}, true)))
		f.label(trenchAt, lane(trenchLane))
	} else {
		lead(site, lane(siteLane)-10)
		f.drawArcBar(site)
	}
	f.drawSite(site)
	f.label(siteAt, lane(siteLane))
}

// drawArcBar draws the arc band on the surface, and its label where that is clear
// of the marks at the places given.
func (f *sectionFigure) drawArcBar(marks ...float64) {
	ranges := f.s.Arc.Ranges
	if len(ranges) == 0 {
		return
	}
	for _, r := range ranges {
		x1, x2 := f.x.px(r.FromKm), f.x.px(r.ToKm)
		f.leaf("rect", like("arcbar", "x", px(x1), "y", px(f.y.at-9), "width", px(math.Max(1, x2-x1)), "height", "7"))
	}
	at := f.beside(f.x.px(ranges[len(ranges)-1].ToKm), "arc band")
	for _, x := range marks {
		if at.covers(x) {
			at = leftOf("arc band", f.x.px(ranges[0].FromKm))
			break
		}
	}
	if at.left < marginX+axisW { // the labels of depths stand there; the legend names the band as well
		return
	}
	f.label(at, f.y.at-3)
}

// labelAt is a label and the range of x that it takes.
type labelAt struct {
	text        string
	left, right float64
	x           float64
	anchor      string
}

// covers reports whether a mark at x would touch the label.
func (l *labelAt) covers(x float64) bool { return x > l.left-7 && x < l.right+7 && x != l.markX() }

// markX is where the mark is that the label belongs to.
func (l *labelAt) markX() float64 {
	if l.anchor == "end" {
		return l.x + labelGap
	}
	return l.x - labelGap
}

const labelGap = 6 // between a mark and its label

// beside places the first of the texts that fits on the figure, to the right of x
// where there is room, else to the left.
func (f *sectionFigure) beside(x float64, texts ...string) (at labelAt) {
	const edge = 8
	for _, s := range texts {
		w := textWidth(s, textSize)
		at = labelAt{s, x + labelGap, x + labelGap + w, x + labelGap, "start"}
		if at.right <= figureW-edge {
			return at
		}
		if at = leftOf(s, x); at.left >= edge {
			return at
		}
	}
	return at
}

func leftOf(s string, x float64) labelAt {
	return labelAt{s, x - labelGap - textWidth(s, textSize), x - labelGap, x - labelGap, "end"}
}

// label writes one line of text with a halo that sets it off from what is behind.
func (f *sectionFigure) label(l labelAt, y float64) {
	a := []string{"x", px(l.x), "y", px(y), "font-size", px(textSize), "text-anchor", l.anchor}
	f.content("text", l.text, like("halo", append(slices.Clone(a), "aria-hidden", "true")...))
	f.content("text", l.text, like("ink", a...))
}

// drawSite draws the site at the surface and, where it has a depth, at depth, and
// the slab's top below it.
func (f *sectionFigure) drawSite(x float64) {
	if d := f.s.Site.DepthKm; !math.IsNaN(d) {
		f.leaf("path", like("lead", "stroke-dasharray", "3 2", "d", pathOf([]point{{x, f.y.at}, {x, f.y.px(d)}}, false)))
	}
	if f.s.IsBelow {
		z := f.y.px(f.s.Below.DepthKm)
		f.leaf("path", like("lead", "stroke-dasharray", "1 3", "d", pathOf([]point{{x, f.y.at}, {x, z}}, false)))
		f.leaf("circle", like("ring", "cx", px(x), "cy", px(z), "r", "4"))
	}
	f.leaf("path", like("mark", "d", f.siteShape(x, f.y.at)))
	if d := f.s.Site.DepthKm; !math.IsNaN(d) {
		f.leaf("path", like("mark", "d", depthShape(x, f.y.px(d))))
	}
}

// siteShape is a filled triangle that stands on its point.
func (f *sectionFigure) siteShape(x, y float64) string {
	return pathOf([]point{{x, y}, {x - 6.5, y - 12}, {x + 6.5, y - 12}}, true)
}

// depthShape is a filled diamond.
func depthShape(x, y float64) string {
	return pathOf([]point{{x, y - 6}, {x + 6, y}, {x, y + 6}, {x - 6, y}}, true)
}

// isSubduction reports whether an arc may stand over the section's slab.
func (f *sectionFigure) isSubduction() bool { return f.s.Slab.Kind == slab.Subduction }
