package figure

import (
	"fmt"
	"math"
)

// entry is one row of a legend.
type entry struct {
	text string
	draw func(x, y float64) // the sample, around (x, y), at most swatchW wide
}

const (
	swatchW    = 34
	legendSize = 12
)

// legend lists what the figure shows.
func (f *sectionFigure) legend() (out []entry) {
	add := func(text string, draw func(x, y float64)) { out = append(out, entry{text, draw}) }
	line := func(class string) func(x, y float64) {
		return func(x, y float64) {
			f.leaf("path", like(class, "d", pathOf([]point{{x - swatchW/2, y}, {x + swatchW/2, y}}, false)))
		}
	}
	for i := range f.s.Profiles {
		add(f.slabEntry(i), func(x, y float64) {
			box := []point{{x - swatchW/2, y - 6}, {x + swatchW/2, y - 6}, {x + swatchW/2, y + 6}, {x - swatchW/2, y + 6}}
			f.leaf("path", like(class("band", i), "d", pathOf(box, true)))
			f.leaf("path", like(class("edge", i), "d", pathOf(box[:2], false)))
			f.leaf("path", like(class("edge", i), "d", pathOf(box[2:], false)))
			line(class("slab", i))(x, y)
		})
	}
	if _, ok := f.join(); ok {
		add("from the "+f.zero()+" to where depth is known: for the eye", line("join"))
	}
	if f.isSubduction() {
		text := fmt.Sprintf("arc band: slab top %s to %s km deep", number(f.s.Arc.MinDepthKm, 0), number(f.s.Arc.MaxDepthKm, 0))
		if len(f.s.Arc.Ranges) == 0 {
			text += " (none here)"
		}
		add(text, func(x, y float64) {
			f.leaf("rect", like("arcbar", "x", px(x-swatchW/2), "y", px(y-6), "width", px(swatchW), "height", "5"))
			f.leaf("rect", attrs{"x", px(x - swatchW/2), "y", px(y - 1), "width", px(swatchW), "height", "8", "fill", "url(#nm-hatch)", "fill-opacity", "0.6"})
		})
	}
	if f.s.HasTrench {
		add(f.s.Trench.Boundary.Name()+", 1\u03c3 of its position "+number(f.s.Trench.Boundary.SigmaKm(), 0)+" km", func(x, y float64) {
			f.leaf("path", like("ring", "d", pathOf([]point{{x, y + 6}, {x - 6, y - 5}, {x + 6, y - 5}}, true)))
		})
	}
	site := "site"
	if f.s.IsBelow {
		site += ", and the slab\u2019s top below it"
	}
	add(site, func(x, y float64) {
		if !f.s.IsBelow {
			f.leaf("path", like("mark", "d", f.siteShape(x, y+6)))
			return
		}
		f.leaf("path", like("mark", "d", f.siteShape(x-8, y+6)))
		f.leaf("circle", like("ring", "cx", px(x+8), "cy", px(y), "r", "4"))
	})
	if d := f.s.Site.DepthKm; !math.IsNaN(d) {
		text := fmt.Sprintf("site at %s km depth", trimmed(d, 1))
		if f.s.IsBelow {
			text += ", " + relation(&f.s.Below)
		}
		add(text, func(x, y float64) { f.leaf("path", like("mark", "d", depthShape(x, y))) })
	}
	return out
}

func (f *sectionFigure) slabEntry(i int) string {
	return "slab top \u00b1 1\u03c3: " + f.s.Profiles[i].Slab.Name
}

// drawLegend sets the entries in columns below y, and returns where they end.
func (f *sectionFigure) drawLegend(entries []entry, x, y, width float64, columns int) float64 {
	colW := width / float64(columns)
	for i := 0; i < len(entries); i += columns {
		rowH := 0.0
		for c := 0; c < columns && i+c < len(entries); c++ {
			e := &entries[i+c]
			left := x + float64(c)*colW
			e.draw(left+swatchW/2, y+8)
			end := f.paragraph(e.text, "ink", legendSize, left+swatchW+8, y, colW-swatchW-14)
			rowH = math.Max(rowH, end-y)
		}
		y += rowH + 5
	}
	return y
}
