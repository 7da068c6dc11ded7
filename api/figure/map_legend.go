package figure

import (
	"fmt"
	"math"
	"strings"

	"nearmargin/setting/sphere"
)

func marksOf(line []point, teeth bool) string {
	var d strings.Builder
	markAlong(&d, line, 1, teeth)
	return d.String()
}

// markerKey is where a marker stands, to 3 px, and how it looks.
type markerKey struct {
	x, y   int
	label  string
	family string
	low    bool
}

// drawSites draws the markers, those of low confidence open, and the names of not too
// many, where they find room. Of markers alike that nobody could tell apart one is drawn,
// so that a figure of any number of sites stays one that programs can open.
func (m *locationMap) drawSites() {
	shapes := map[string]string{}
	for _, l := range siteLooks {
		shapes[l.label] = l.shape
	}
	var taken [][4]float64
	place := make([]point, len(m.s.Sites))
	seen := map[markerKey]bool{}
	for i := range m.s.Sites {
		s := &m.s.Sites[i]
		p, ok := m.to(s.At)
		if !ok {
			continue
		}
		place[i] = p
		key := markerKey{int(math.Floor(p.x / 3)), int(math.Floor(p.y / 3)), s.Label, s.Family, s.Confidence == "low"}
		if seen[key] {
			continue
		}
		seen[key] = true
		taken = append(taken, [4]float64{p.x - 7, p.y - 7, p.x + 7, p.y + 7})
		m.drawMarker(shapes[s.Label], s.Family, s.Confidence == "low", p)
	}
	if len(m.s.Sites) > mostNamed {
		return // the report's reader has the table
	}
	for i := range m.s.Sites {
		s := &m.s.Sites[i]
		if s.Name == "" || !m.within(place[i], 0) {
			continue
		}
		name := shorten(s.Name, longestName)
		w, named := textWidth(name, smallSize), false
		for _, side := range []struct {
			x, y   float64
			anchor string
			left   float64
		}{{10, 4, "start", 0}, {-10, 4, "end", -w}, {0, -10, "middle", -w / 2}, {0, 18, "middle", -w / 2}} {
			p := point{place[i].x + side.x, place[i].y + side.y}
			box := [4]float64{p.x + side.left, p.y - 10, p.x + side.left + w, p.y + 3}
			if box[0] < m.x+2 || box[2] > m.x+m.w-2 || overlaps(taken, box) {
				continue
			}
			taken = append(taken, box)
			m.textAt(name, p.x, p.y, smallSize, side.anchor)
			named = true
			break
		}
		if !named {
			m.unnamed++
		}
	}
}

// shorten cuts a text to a number of characters.
func shorten(s string, most int) string {
	if r := []rune(s); len(r) > most {
		return string(r[:most-1]) + "\u2026"
	}
	return s
}

func overlaps(list [][4]float64, b [4]float64) bool {
	for _, a := range list {
		if a[0] < b[2] && b[0] < a[2] && a[1] < b[3] && b[1] < a[3] {
			return true
		}
	}
	return false
}

// drawMarker draws one marker; an open one stands for low confidence.
func (m *locationMap) drawMarker(shape, family string, open bool, p point) {
	at := "translate(" + px(p.x) + " " + px(p.y) + ")"
	m.leaf("path", like("s-"+family, "d", shape, "transform", at))
	if open {
		m.leaf("path", like("bg", "d", shape, "transform", at+" scale(0.5)"))
	}
}

// drawBar draws the scale: true at the middle of a regional map, and along the equator
// of a world map.
func (m *locationMap) drawBar() {
	perKm := m.k / sphere.MeanRadiusKm
	words := ""
	if world, ok := m.proj.(equalEarth); ok {
		right, _, _ := world.at(world.edge(0, 1))
		perKm = right * m.k / (math.Pi * 6378.137)
		words = " at the equator"
	}
	km := 5000.0
	for _, s := range tickSteps {
		if s*perKm >= 70 {
			km = s
			break
		}
	}
	x1, y := m.x+m.w-14, m.y+m.h-14
	x0 := x1 - km*perKm
	bar := []point{{x0, y - 5}, {x0, y}, {x1, y}, {x1, y - 5}}
	m.leaf("path", like("halo", "d", pathOf(bar, false)))
	m.leaf("path", like("ground", "d", pathOf(bar, false)))
	m.textAt(fmt.Sprintf("%g km%s", km, words), x1, y-9, smallSize, "end")
}

// drawBelow draws the legend and the caption below the frame, and returns the
// figure's height.
func (m *locationMap) drawBelow(y float64) float64 {
	const columns = 3
	width := float64(figureW-2*marginX) / columns
	counts, family, low := map[string]int{}, map[string]string{}, 0
	for i := range m.s.Sites {
		s := &m.s.Sites[i]
		counts[s.Label]++
		family[s.Label] = s.Family
		if s.Confidence == "low" {
			low++
		}
	}
	var entries []func(p point)
	for _, l := range siteLooks {
		if counts[l.label] == 0 {
			continue
		}
		entries = append(entries, func(p point) {
			m.drawMarker(l.shape, family[l.label], false, point{p.x + 18, p.y - 4})
			m.content("text", fmt.Sprintf("%s (%d)", l.words, counts[l.label]), like("ink", "x", px(p.x+44), "y", px(p.y), "font-size", px(textSize)))
		})
	}
	if low > 0 {
		entries = append(entries, func(p point) {
			m.drawMarker(shapeCircle, "interior", true, point{p.x + 18, p.y - 4})
			m.content("text", fmt.Sprintf("Open: low confidence (%d)", low), like("ink", "x", px(p.x+44), "y", px(p.y), "font-size", px(textSize)))
		})
	}
	for _, look := range lineLooks {
		if !m.drawn[look.typ] {
			continue
		}
		entries = append(entries, func(p point) {
			line := []point{{p.x, p.y - 4}, {p.x + 36, p.y - 4}}
			marks := ""
			if look.teeth || look.ticks {
				marks = marksOf(line, look.teeth)
			}
			m.drawLine(look, pathOf(line, false), marks)
			m.content("text", look.words, like("ink", "x", px(p.x+44), "y", px(p.y), "font-size", px(textSize)))
		})
	}
	rows := (len(entries) + columns - 1) / columns
	for i, draw := range entries {
		draw(point{marginX + float64(i/rows)*width, y + 24 + float64(i%rows)*19})
	}
	y += 24 + float64(rows)*19
	for _, n := range []struct {
		words string
		count int
	}{{"Rows without an answer, which are not drawn", m.s.Others}, {"Sites whose name has no room on the map", m.unnamed}} {
		if n.count > 0 {
			m.content("text", fmt.Sprintf("%s: %d.", n.words, n.count), like("soft", "x", px(marginX), "y", px(y+8), "font-size", px(smallSize)))
			y += 18
		}
	}
	for _, par := range m.s.Caption {
		for _, l := range wrap(par, smallSize, figureW-2*marginX) {
			y += smallSize * lineH
			m.content("text", l, like("soft", "x", px(marginX), "y", px(y), "font-size", px(smallSize)))
		}
		y += 4
	}
	return math.Ceil(y + marginX/2)
}
