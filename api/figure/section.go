package figure

import (
	"math"
	"slices"

	"nearmargin/setting"
	"nearmargin/setting/slab"
)

// The measures of a section's figure, in px.
const (
	figureW   = 900
	marginX   = 24 // around everything
	axisW     = 48 // left of the plot, for the labels of depths
	mostPlotH = 620
	leastH    = 170 // of a plot; a flatter section is exaggerated
	laneH     = 19  // one line of labels above the plot
	sideGap   = 28  // between the plot and a legend beside it
	leastSide = 210 // width of a legend beside the plot
	titleSize = 19
	textSize  = 12.5
	smallSize = 11.5
	lineH     = 1.35 // of the font size
)

// sectionFigure is a section on its way to a figure.
type sectionFigure struct {
	canvas
	s            *setting.Section
	x, y         scale
	plotW, plotH float64
	exaggeration float64
	k            float64 // px per km along the surface
}

// Section draws a section: the slabs to scale with the uncertainty of their depth,
// trench, site and arc band, and below them the words that a reader needs to judge
// it. The result is one SVG document.
func Section(s *setting.Section) []byte {
	f := &sectionFigure{s: s}
	f.measure()
	body := &sectionFigure{s: s, x: f.x, y: f.y, plotW: f.plotW, plotH: f.plotH, exaggeration: f.exaggeration, k: f.k}
	height := body.draw()

	f.b = append(f.b, `<?xml version="1.0" encoding="UTF-8"?>`+"\n"...)
	f.start("svg", attrs{
		"xmlns", "http://www.w3.org/2000/svg", "width", px(figureW), "height", px(height), "viewBox", "0 0 " + px(figureW) + " " + px(height),
		"role", "img", "aria-labelledby", "nm-title nm-desc", "font-family", "sans-serif", "color-scheme", "light dark",
	})
	f.content("title", f.title(), attrs{"id", "nm-title"})
	f.content("desc", f.description(), attrs{"id", "nm-desc"})
	f.content("style", styleSheet(), nil)
	f.start("defs", nil)
	f.start("pattern", attrs{"id", "nm-hatch", "width", "7", "height", "7", "patternUnits", "userSpaceOnUse", "patternTransform", "rotate(45)"})
	f.leaf("path", like("arc", "d", "M0 0V7"))
	f.end()
	f.end()
	f.leaf("rect", like("bg", "width", px(figureW), "height", px(height)))
	f.b = append(f.b, body.b...)
	f.end()
	return f.b
}

// measure settles the scale: one for both axes where it fits, else a stated
// exaggeration.
func (f *sectionFigure) measure() {
	line := &f.s.Line
	widthKm, depthKm := line.ToKm-line.FromKm, f.deepestKm()
	left := float64(marginX + axisW)
	f.k, f.exaggeration = fit(widthKm, depthKm, figureW-marginX-left, mostPlotH, leastH)
	f.plotW, f.plotH = widthKm*f.k, depthKm*f.k*f.exaggeration
	f.x = scale{line.FromKm, left, f.k}
	f.y = scale{0, 0, f.k * f.exaggeration} // at is set once it is known what stands above
}

// deepestKm is the depth that the plot reaches down to: below the slabs' tops and
// their σ, and the site.
func (f *sectionFigure) deepestKm() float64 {
	deepest := 50.0
	for i := range f.s.Profiles {
		for _, r := range f.s.Profiles[i].Readings {
			if z := r.DepthKm + sigma(&r); z > deepest { // false for NaN
				deepest = z
			}
		}
	}
	if d := f.s.Site.DepthKm; d > deepest {
		deepest = d
	}
	return math.Ceil(deepest*1.03/10) * 10
}

func sigma(r *slab.Reading) float64 {
	if math.IsNaN(r.SigmaKm) {
		return 0
	}
	return r.SigmaKm
}

// draw draws everything and returns the figure's height.
func (f *sectionFigure) draw() float64 {
	y := float64(marginX)
	y = f.paragraph(f.title(), "ink", titleSize, marginX, y, figureW-2*marginX, "font-weight", "bold")
	y = f.paragraph(f.subtitle(), "soft", textSize, marginX, y+3, figureW-2*marginX)
	top := y + 10 + 3*laneH
	if !f.s.HasTrench { // the uppermost lane is empty
		top -= laneH
	}
	f.y.at = top

	f.drawGrid()
	f.drawArc()
	for i := range slices.Backward(f.s.Profiles) { // the section's own slab above the others
		f.drawBand(i)
	}
	for i := range slices.Backward(f.s.Profiles) {
		f.drawSlab(i)
	}
	f.drawJoin()
	f.drawSurface()
	f.drawMarks()
	y = f.drawAxes()

	legend := f.legend()
	if side := figureW - marginX - (f.x.at + f.plotW + sideGap); side >= leastSide {
		y = math.Max(y, f.drawLegend(legend, f.x.at+f.plotW+sideGap, top, side, 1))
	} else {
		y = f.drawLegend(legend, marginX, y+12, figureW-2*marginX, 2)
	}
	y += 12
	f.leaf("path", like("grid", "d", pathOf([]point{{marginX, y}, {figureW - marginX, y}}, false)))
	y += 8
	for _, p := range f.caption() {
		y = f.paragraph(p, "soft", smallSize, marginX, y, figureW-2*marginX) + 3
	}
	return math.Ceil(y + marginX/2)
}

// paragraph writes wrapped text below y and returns where it ends.
func (f *sectionFigure) paragraph(s, class string, size, x, y, width float64, more ...string) float64 {
	scale := 1.0
	if slices.Contains(more, "bold") {
		scale = 1.1
	}
	for _, l := range wrap(s, size*scale, width) {
		f.content("text", l, like(class, append([]string{"x", px(x), "y", px(y + size), "font-size", px(size)}, more...)...))
		y += size * lineH
	}
	return y
}
