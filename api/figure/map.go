package figure

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"nearmargin/setting/boundary"
	"nearmargin/setting/sphere"
)

// MapSite is a site with its answer.
type MapSite struct {
	Name                      string
	At                        sphere.LonLat
	Label, Family, Confidence string
}

// MapSpec is what a location map shows.
type MapSpec struct {
	Title      string
	Sites      []MapSite
	Others     int // rows without an answer or a place
	Boundaries []*boundary.Boundary
	Land       [][][]sphere.LonLat // polygons: an outer ring, clockwise, and holes
	Caption    []string            // paragraphs: model, citation, cautions
}

const (
	leastReachKm = 250 // from the middle of a map to its edge
	mostMapH     = 760
	mostNamed    = 40 // sites; more are not named
	longestName  = 40 // characters of a name
)

// locationMap is a map on its way to a figure.
type locationMap struct {
	canvas
	s          *MapSpec
	proj       projection
	k          float64                // px to the Earth radius
	cx, cy     float64                // px of the plane's origin
	x, y, w, h float64                // the frame
	drawn      map[boundary.Type]bool // the types of boundary within the frame
	unnamed    int                    // sites whose name found no room
}

// Map draws sites by their setting among land and plate boundaries: a location map
// with legend, scale and caption. The result is one SVG document.
func Map(s *MapSpec) []byte {
	m := &locationMap{s: s, drawn: map[boundary.Type]bool{}}
	bottom := m.measure()
	m.drawMap()
	height := m.drawBelow(bottom)
	head := &canvas{}
	head.b = append(head.b, `<?xml version="1.0" encoding="UTF-8"?>`+"\n"...)
	head.start("svg", attrs{"xmlns", "http://www.w3.org/2000/svg", "width", px(figureW), "height", px(height), "viewBox", "0 0 " + px(figureW) + " " + px(height),
		"role", "img", "aria-labelledby", "nm-title nm-desc", "font-family", "sans-serif", "color-scheme", "light dark"})
	head.content("title", s.Title, attrs{"id", "nm-title"})
	head.content("desc", s.describe(), attrs{"id", "nm-desc"})
	head.content("style", darkSheet(looks)+darkSheet(mapLooks), nil)
	head.start("defs", nil)
	head.start("clipPath", attrs{"id", "nm-frame"})
	head.leaf("rect", attrs{"x", px(m.x), "y", px(m.y), "width", px(m.w), "height", px(m.h)})
	head.end()
	if world, ok := m.proj.(equalEarth); ok {
		head.start("clipPath", attrs{"id", "nm-rim"})
		head.leaf("path", attrs{"d", pathOf(m.rim(world), true)})
		head.end()
	}
	head.end()
	head.leaf("rect", like("bg", "width", px(figureW), "height", px(height)))
	head.b = append(head.b, m.b...)
	head.end()
	return head.b
}

// describe says in one sentence what the map shows.
func (s *MapSpec) describe() string {
	counts := map[string]int{}
	for i := range s.Sites {
		counts[s.Sites[i].Label]++
	}
	var parts []string
	for _, l := range siteLooks {
		if n := counts[l.label]; n > 0 {
			parts = append(parts, fmt.Sprintf("%d %s", n, strings.ToLower(l.words)))
		}
	}
	return fmt.Sprintf("Location map of %d sites: %s.", len(s.Sites), strings.Join(parts, ", "))
}

// measure settles projection, scale and frame, draws the title, and returns where the
// frame ends.
func (m *locationMap) measure() float64 {
	var places []sphere.LonLat
	for i := range m.s.Sites {
		places = append(places, m.s.Sites[i].At)
	}
	m.x, m.w = marginX, figureW-2*marginX
	m.y = marginX
	for _, l := range wrap(m.s.Title, titleSize*1.08, m.w) { // a bold face is wider
		m.content("text", l, like("ink", "x", px(marginX), "y", px(m.y+titleSize), "font-size", px(titleSize), "font-weight", "bold"))
		m.y += titleSize * lineH
	}
	m.y += 14 - titleSize*(lineH-1)
	m.proj, _ = chooseProjection(places)
	if world, ok := m.proj.(equalEarth); ok {
		right, _, _ := world.at(world.edge(0, 1))
		_, top, _ := m.proj.at(sphere.LonLat{Lat: 90})
		m.k = m.w / 2 / right
		m.h = 2 * top * m.k
		m.cx, m.cy = m.x+m.w/2, m.y+m.h/2
		return m.y + m.h
	}
	box := [4]float64{math.Inf(1), math.Inf(1), math.Inf(-1), math.Inf(-1)}
	for _, at := range places {
		x, y, _ := m.proj.at(at)
		box = [4]float64{math.Min(box[0], x), math.Min(box[1], y), math.Max(box[2], x), math.Max(box[3], y)}
	}
	least := leastReachKm / sphere.MeanRadiusKm
	halfW := math.Max((box[2]-box[0])/2*1.2, least)
	halfH := math.Max((box[3]-box[1])/2*1.25, least)
	m.k = math.Min(m.w/2/halfW, mostMapH/2/halfH)
	m.h = math.Min(mostMapH, math.Max(2*halfH*m.k, m.w*0.5))
	m.cx = m.x + m.w/2 - (box[0]+box[2])/2*m.k
	m.cy = m.y + m.h/2 + (box[1]+box[3])/2*m.k
	return m.y + m.h
}

// to returns where a place is in px.
func (m *locationMap) to(p sphere.LonLat) (point, bool) {
	if world, ok := m.proj.(equalEarth); ok {
		p = world.seen(p)
	}
	return m.past(p)
}

// past returns where a place is in px; on a world map its longitude may run on past the
// edges.
func (m *locationMap) past(p sphere.LonLat) (point, bool) {
	x, y, ok := m.proj.at(p)
	return point{m.cx + x*m.k, m.cy - y*m.k}, ok
}

// within reports whether a point is in the frame, or at most d px off it.
func (m *locationMap) within(p point, d float64) bool {
	return p.x >= m.x-d && p.x <= m.x+m.w+d && p.y >= m.y-d && p.y <= m.y+m.h+d
}

// lines returns the parts of a path that come near the frame, in px.
func (m *locationMap) lines(path []sphere.LonLat) (out [][]point) {
	var run []point
	flush := func() {
		if len(run) > 1 {
			out = append(out, run)
		}
		run = nil
	}
	for _, p := range densify(path) {
		q, ok := m.to(p)
		if !ok || !m.within(q, 400) {
			flush()
			continue
		}
		if m.jumps(run, q) {
			flush()
		}
		run = append(run, q)
	}
	flush()
	return out
}

// jumps reports whether a line that runs on to a point crosses the edges of a world map.
func (m *locationMap) jumps(run []point, q point) bool {
	_, world := m.proj.(equalEarth)
	return world && len(run) > 0 && math.Abs(q.x-run[len(run)-1].x) > m.w/2
}

func (m *locationMap) drawMap() {
	m.start("g", attrs{"clip-path", "url(#nm-frame)"})
	m.drawSea()
	m.drawLand()
	labels := m.drawMesh()
	m.drawBoundaries()
	m.drawSites()
	m.end()
	m.leaf("rect", like("frame", "x", px(m.x), "y", px(m.y), "width", px(m.w), "height", px(m.h)))
	for _, l := range labels {
		m.textAt(l.words, l.at.x, l.at.y, smallSize, l.anchor)
	}
	m.drawBar()
}

// textAt writes a text with a light edge.
func (m *locationMap) textAt(s string, x, y, size float64, anchor string) {
	for _, class := range []string{"textback", "ink"} {
		m.content("text", s, like(class, "x", px(x), "y", px(y), "font-size", px(size), "text-anchor", anchor))
	}
}

// meshLabel is the number of a meridian or parallel at the frame.
type meshLabel struct {
	words, anchor string
	at            point
}

// drawMesh draws meridians and parallels and returns their labels.
func (m *locationMap) drawMesh() (labels []meshLabel) {
	degPx := m.k * math.Pi / 180
	shrink := 1.0 // of a degree of longitude at the middle
	if az, ok := m.proj.(*azimuthal); ok {
		shrink = math.Max(math.Cos(az.centre.LonLat().Lat*math.Pi/180), 0.05)
	}
	step, lonStep := meshStep(degPx), meshStep(degPx*shrink)
	for lon := -180.0; lon < 180; lon += lonStep {
		var line []sphere.LonLat
		for lat := -90.0; lat <= 90; lat += 1 {
			line = append(line, sphere.LonLat{Lon: lon, Lat: lat})
		}
		if p, ok := m.meshLine(line, func(p point) float64 { return p.y - (m.y + m.h) }); ok {
			labels = append(labels, meshLabel{meshDegrees(lon, "E", "W"), "middle", point{p.x, m.y + m.h - 5}})
		}
	}
	for lat := -90 + step; lat < 90; lat += step {
		var line []sphere.LonLat
		for lon := -180.0; lon <= 180; lon += 1 {
			line = append(line, sphere.LonLat{Lon: lon, Lat: lat})
		}
		if p, ok := m.meshLine(line, func(p point) float64 { return p.x - m.x }); ok && p.y > m.y+12 && p.y < m.y+m.h-20 {
			labels = append(labels, meshLabel{meshDegrees(lat, "N", "S"), "start", point{m.x + 5, p.y + 4}})
		}
	}
	return labels
}

// meshStep returns the degrees between lines so that they stand some 90 px apart.
func meshStep(degPx float64) float64 {
	for _, s := range []float64{0.5, 1, 2, 5, 10, 15} {
		if s*degPx >= 90 {
			return s
		}
	}
	return 30
}

// meshLine draws a line and returns where it crosses an edge of the frame, on which a
// function is zero.
func (m *locationMap) meshLine(line []sphere.LonLat, off func(point) float64) (at point, ok bool) {
	var run []point
	flush := func() {
		if len(run) > 1 {
			m.leaf("path", like("mesh", "d", pathOf(run, false)))
		}
		run = nil
	}
	for _, p := range line {
		q, has := m.to(p)
		if !has || !m.within(q, 400) {
			flush()
			continue
		}
		if m.jumps(run, q) {
			flush()
		}
		if n := len(run); n > 0 {
			a, b := off(run[n-1]), off(q)
			if a*b < 0 {
				f := a / (a - b)
				c := point{run[n-1].x + f*(q.x-run[n-1].x), run[n-1].y + f*(q.y-run[n-1].y)}
				if m.within(c, 1) && c.x > m.x-1 && c.x < m.x+m.w-150 {
					at, ok = c, true
				}
			}
		}
		run = append(run, q)
	}
	flush()
	return at, ok
}

// meshDegrees writes a longitude or latitude.
func meshDegrees(x float64, plus, minus string) string {
	switch {
	case x == 0 || x == -180:
		return px(math.Abs(x)) + "\u00b0"
	case x < 0:
		return px(-x) + "\u00b0 " + minus
	}
	return px(x) + "\u00b0 " + plus
}

func (m *locationMap) drawBoundaries() {
	for _, look := range slices.Backward(lineLooks[:]) {
		var d, marks strings.Builder
		for _, b := range m.s.Boundaries {
			if b.Type() != look.typ {
				continue
			}
			side := 1.0
			if b.Subducting() != "" && b.Subducting() == b.Left() {
				side = -1
			}
			for _, part := range b.Parts() {
				for _, l := range m.lines(part) {
					m.drawn[look.typ] = m.drawn[look.typ] || slices.ContainsFunc(l, func(p point) bool { return m.within(p, 0) })
					d.WriteString(pathOf(l, false))
					if look.teeth || look.ticks {
						markAlong(&marks, l, side, look.teeth)
					}
				}
			}
		}
		if d.Len() == 0 {
			continue
		}
		m.drawLine(look, d.String(), marks.String())
	}
}

// drawLine draws path data in the manner of a type.
func (m *locationMap) drawLine(look lineLook, d, marks string) {
	m.leaf("path", like(look.class, "d", d))
	if look.core {
		m.leaf("path", like("core", "d", d))
	}
	if marks == "" {
		return
	}
	class := "tick"
	if look.teeth {
		class = "tooth"
	}
	m.leaf("path", like(class, "d", marks))
}

// markAlong appends teeth on the upper side, or ticks, at equal steps along a line.
// side is 1 where the upper side is on the left of the line.
func markAlong(d *strings.Builder, l []point, side float64, teeth bool) {
	step := 11.0
	if teeth {
		step = 15
	}
	left := step / 2
	for i := 1; i < len(l); i++ {
		a, b := l[i-1], l[i]
		n := math.Hypot(b.x-a.x, b.y-a.y)
		if n == 0 {
			continue
		}
		tx, ty := (b.x-a.x)/n, (b.y-a.y)/n
		nx, ny := ty*side, -tx*side
		at := left
		for ; at <= n; at += step {
			x, y := a.x+tx*at, a.y+ty*at
			if teeth {
				d.WriteString(pathOf([]point{{x - tx*3.6, y - ty*3.6}, {x + nx*6, y + ny*6}, {x + tx*3.6, y + ty*3.6}}, true))
			} else {
				d.WriteString(pathOf([]point{{x - nx*3.4, y - ny*3.4}, {x + nx*3.4, y + ny*3.4}}, false))
			}
		}
		left = at - n
	}
}
