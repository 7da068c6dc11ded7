package figure

import (
	"math"
	"strings"

	"nearmargin/setting/sphere"
)

func (m *locationMap) drawSea() {
	if world, ok := m.proj.(equalEarth); ok {
		m.leaf("path", like("sea", "d", pathOf(m.rim(world), true)))
		return
	}
	m.leaf("rect", like("sea", "x", px(m.x), "y", px(m.y), "width", px(m.w), "height", px(m.h)))
}

// rim returns the outline of a world map.
func (m *locationMap) rim(world equalEarth) (rim []point) {
	for lat := -90.0; lat <= 90; lat += 2 {
		p, _ := m.past(world.edge(lat, 1))
		rim = append(rim, p)
	}
	for lat := 90.0; lat >= -90; lat -= 2 {
		p, _ := m.past(world.edge(lat, -1))
		rim = append(rim, p)
	}
	return rim
}

// drawLand fills the land.
func (m *locationMap) drawLand() {
	az, regional := m.proj.(*azimuthal)
	world, _ := m.proj.(equalEarth)
	if !regional {
		m.start("g", attrs{"clip-path", "url(#nm-rim)"})
		defer m.end()
	}
	for _, rings := range m.s.Land {
		var d strings.Builder
		near := false
		for _, ring := range rings {
			if !regional {
				m.worldRing(&d, world, ring)
				near = true
				continue
			}
			var pts []point
			for _, p := range ring {
				if q, ok := m.to(p); ok {
					pts = append(pts, q)
				}
			}
			near = near || m.meets(pts)
			d.WriteString(pathOf(pts, true))
		}
		// Where the antipode is land, so is all beyond the rings.
		if regional && landAt(az.centre.Scale(-1), rings) {
			const far = 1e6
			d.WriteString(pathOf([]point{{-far, -far}, {far, -far}, {far, far}, {-far, far}}, true))
			near = true
		}
		if near {
			m.leaf("path", like("land", "d", d.String()))
		}
	}
}

// meets reports whether the box around points meets the frame.
func (m *locationMap) meets(pts []point) bool {
	low, high := point{math.Inf(1), math.Inf(1)}, point{math.Inf(-1), math.Inf(-1)}
	for _, p := range pts {
		low = point{math.Min(low.x, p.x), math.Min(low.y, p.y)}
		high = point{math.Max(high.x, p.x), math.Max(high.y, p.y)}
	}
	return low.x < m.x+m.w && high.x > m.x && low.y < m.y+m.h && high.y > m.y
}

// worldRing appends a ring on a world map. Longitudes run on past ±180°, and the ring
// is drawn again a turn away where it passes the edge; a ring about a pole is closed
// along it.
func (m *locationMap) worldRing(d *strings.Builder, world equalEarth, ring []sphere.LonLat) {
	run := []sphere.LonLat{ring[0]}
	low, high := ring[0].Lon, ring[0].Lon
	for _, p := range ring[1:] {
		last := run[len(run)-1].Lon
		p.Lon += 360 * math.Round((last-p.Lon)/360)
		low, high = math.Min(low, p.Lon), math.Max(high, p.Lon)
		run = append(run, p)
	}
	if end := run[len(run)-1].Lon; math.Abs(end-ring[0].Lon) > 180 {
		pole := math.Copysign(90, ring[0].Lat)
		run = append(run, sphere.LonLat{Lon: end, Lat: pole}, sphere.LonLat{Lon: ring[0].Lon, Lat: pole})
	}
	for _, turn := range []float64{-360, 0, 360} {
		if low+turn-world.middle >= 180 || high+turn-world.middle <= -180 {
			continue
		}
		var pts []point
		for _, p := range run {
			q, _ := m.past(sphere.LonLat{Lon: p.Lon + turn, Lat: p.Lat})
			pts = append(pts, q)
		}
		d.WriteString(pathOf(pts, true))
	}
}

// landAt reports whether a place is within a polygon on the sphere whose outer ring
// runs clockwise, so that its inside is on the right, and whose holes run the other
// way round.
func landAt(v sphere.Vec, rings [][]sphere.LonLat) bool {
	plane := newAzimuthal(v)
	inside := false
	for i, ring := range rings {
		var pts []point
		for _, p := range ring {
			if x, y, ok := plane.at(p); ok {
				pts = append(pts, point{x, -y})
			}
		}
		if len(pts) < 3 {
			continue
		}
		within := circles(pts)
		if middle, small := compact(ring); small { // the direction of a sliver says nothing
			within = within && v.Dot(middle) > 0
		} else if clockwise := turn(pts) > 0; clockwise != (i == 0) { // it holds the far side instead
			within = !within
		}
		if within {
			inside = i == 0
		}
	}
	return inside
}

// compact returns the middle of a ring and whether all of it lies within 60° of that.
func compact(ring []sphere.LonLat) (middle sphere.Vec, small bool) {
	for _, p := range ring {
		middle = middle.Add(sphere.FromLonLat(p))
	}
	if middle.Norm() == 0 {
		return middle, false
	}
	middle = middle.Unit()
	for _, p := range ring {
		if middle.Dot(sphere.FromLonLat(p)) < 0.5 {
			return middle, false
		}
	}
	return middle, true
}

// circles reports whether a ring in the plane goes round the origin.
func circles(pts []point) (in bool) {
	for i, p := range pts {
		q := pts[(i+1)%len(pts)]
		if (p.y > 0) != (q.y > 0) && p.x-p.y*(q.x-p.x)/(q.y-p.y) > 0 {
			in = !in
		}
	}
	return in
}

// turn is positive for a ring that runs clockwise on the figure.
func turn(pts []point) (sum float64) {
	for i, p := range pts {
		q := pts[(i+1)%len(pts)]
		sum += p.x*q.y - q.x*p.y
	}
	return sum
}
