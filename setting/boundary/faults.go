package boundary

import (
	"fmt"
	"math"
	"slices"

	"nearmargin/setting/sphere"
)

// Fault is one place where a network is not closed or not consistent.
type Fault struct {
	Code   string        // one of the Fault… constants
	At     sphere.LonLat // where
	Detail string        // what is wrong, and what would be right
}

// The codes of faults.
const (
	FaultOpenEnd      = "open_end"      // an end that no other line meets
	FaultPlates       = "plates"        // the plates around a node disagree
	FaultCrossing     = "crossing"      // two lines cross
	FaultTouch        = "touch"         // a vertex lies on another line
	FaultDisconnected = "disconnected"  // part of the network hangs in the air
	FaultAreas        = "areas"         // the plates do not cover the Earth once
	FaultCoincident   = "coincident"    // two legs have the same ends
	maxFaultsOfAKind  = 200             // a network with more is no network
	touchRad          = 10. / 6371008.8 // 10 m
)

// Faults returns every place where the network is not closed or not consistent:
// ends that meet nothing, nodes whose plates disagree, lines that cross, touch
// or coincide, parts that are not joined to the rest, and plates whose areas do
// not add up to the sphere (left and right exchanged). None means that the plate
// under any place follows from its nearest boundary.
func (n *Network) Faults() []Fault {
	var out []Fault
	out = append(out, n.nodeFaults()...)
	out = append(out, n.legFaults()...)
	out = append(out, n.partFaults()...)
	// areas mean nothing while rings are open; exchanged ones are closed, though
	// the plates around every junction disagree
	if len(out) == 0 || n.exchanged() {
		out = append(n.areaFaults(), out...)
	}
	return out
}

// exchanged reports whether the plates around every node would agree if left and
// right were exchanged everywhere.
func (n *Network) exchanged() bool {
	for i := range n.nodes {
		spokes := n.nodes[i].spokes
		for j := range spokes {
			if len(spokes) == 1 || spokes[j].left != spokes[(j+1)%len(spokes)].right {
				return false
			}
		}
	}
	return true
}

func (n *Network) nodeFaults() []Fault {
	var out []Fault
	for i := range n.nodes {
		v := &n.nodes[i]
		if len(v.spokes) == 1 {
			out = append(out, Fault{FaultOpenEnd, v.at, fmt.Sprintf("boundary %q ends here and no other line does", n.idOf(v.spokes[0].leg))})
			continue
		}
		for j := range v.spokes {
			a, b := v.spokes[j], v.spokes[(j+1)%len(v.spokes)]
			if a.right != b.left {
				out = append(out, Fault{FaultPlates, v.at, fmt.Sprintf(
					"clockwise from boundary %q (leaving at azimuth %.0f, %s on its right) to %q (azimuth %.0f, %s on its left): the sector between them must be one plate",
					n.idOf(a.leg), a.azimuth, n.plates[a.right], n.idOf(b.leg), b.azimuth, n.plates[b.left])})
			}
		}
	}
	return out
}

func (n *Network) idOf(leg int32) string { return n.boundaries[n.legs[leg].boundary].ID() }

// legFaults finds legs that cross, touch or coincide with others.
func (n *Network) legFaults() []Fault {
	var out []Fault
	var near []int32
	for i := range n.legs {
		a := &n.legs[i]
		near = n.legsAround(&a.arc, near[:0])
		for _, j := range near {
			if int(j) <= i {
				continue
			}
			b := &n.legs[j]
			if sameEnds(a, b) {
				out = append(out, Fault{FaultCoincident, a.arc.Midpoint().LonLat(), fmt.Sprintf("boundaries %q and %q hold the same leg", n.idOf(int32(i)), n.idOf(j))})
				continue
			}
			if q, ok := a.arc.Cross(&b.arc); ok {
				out = append(out, Fault{FaultCrossing, q.LonLat(), fmt.Sprintf("boundaries %q and %q cross; lines may meet at shared ends only", n.idOf(int32(i)), n.idOf(j))})
				continue
			}
			for _, v := range []struct {
				p    sphere.Vec
				on   *leg
				from int32
				to   int32
			}{{a.arc.A, b, int32(i), j}, {a.arc.B, b, int32(i), j}, {b.arc.A, a, j, int32(i)}, {b.arc.B, a, j, int32(i)}} {
				if v.p == v.on.arc.A || v.p == v.on.arc.B {
					continue
				}
				if d, _ := v.on.chordSq(v.p); d < touchRad*touchRad {
					out = append(out, Fault{FaultTouch, v.p.LonLat(), fmt.Sprintf("a vertex of boundary %q lies on a leg of %q; share a node there or keep 10 m apart", n.idOf(v.from), n.idOf(v.to))})
				}
			}
		}
		if len(out) > maxFaultsOfAKind {
			return out
		}
	}
	return out
}

func sameEnds(a, b *leg) bool {
	return a.arc.A == b.arc.A && a.arc.B == b.arc.B || a.arc.A == b.arc.B && a.arc.B == b.arc.A
}

// legsAround returns the legs that may lie within 10 m of an arc.
func (n *Network) legsAround(s *sphere.Arc, out []int32) []int32 {
	const margin = 2e-4 // degrees of latitude: more than 10 m
	for _, box := range boxes(s) {
		// the same in longitude; towards a pole the meridians draw together
		poleward := min(90, max(box.Max[1], -box.Min[1])+margin)
		wide := min(360, margin/math.Cos(poleward*math.Pi/180))
		south, north := box.Min[1]-margin, box.Max[1]+margin
		// and the same places with other longitudes, for what lies across ±180°
		for _, turn := range []float64{0, -360, 360} {
			w, e := box.Min[0]-wide+turn, box.Max[0]+wide+turn
			if e < -180 || w > 180 {
				continue
			}
			n.boxes.Search([2]float64{w, south}, [2]float64{e, north}, func(_, _ [2]float64, i int32) bool {
				out = append(out, i)
				return true
			})
		}
	}
	slices.Sort(out)
	return slices.Compact(out)
}

// partFaults finds parts that are not joined to the rest.
func (n *Network) partFaults() []Fault {
	parent := make([]int32, len(n.boundaries))
	for i := range parent {
		parent[i] = int32(i)
	}
	root := func(i int32) int32 {
		for parent[i] != i {
			parent[i] = parent[parent[i]]
			i = parent[i]
		}
		return i
	}
	for i := range n.nodes {
		s := n.nodes[i].spokes
		for j := 1; j < len(s); j++ {
			parent[root(n.legs[s[0].leg].boundary)] = root(n.legs[s[j].leg].boundary)
		}
	}
	size := map[int32]int{}
	for i := range parent {
		size[root(int32(i))]++
	}
	largest := root(0)
	for r, k := range size {
		if k > size[largest] || k == size[largest] && r < largest {
			largest = r
		}
	}
	var out []Fault
	for i, b := range n.boundaries {
		if r := root(int32(i)); r != largest && r == int32(i) {
			out = append(out, Fault{FaultDisconnected, b.spec.Path[0], fmt.Sprintf("boundary %q and what is joined to it (%d in all) do not reach the rest of the network", b.ID(), size[r])})
		}
	}
	return out
}

// areaFaults checks that the plates cover the sphere once: with left and right
// exchanged everywhere each would be all of the Earth but itself.
func (n *Network) areaFaults() []Fault {
	sum, biggest := 0.0, ""
	most := 0.0
	for code, sr := range n.plateSteradians() {
		sum += sr
		if sr > most {
			biggest, most = code, sr
		}
	}
	if math.Abs(sum-4*math.Pi) < 1e-6 {
		return nil
	}
	return []Fault{{FaultAreas, n.boundaries[0].spec.Path[0], fmt.Sprintf(
		"the plates' areas add up to %.4f times the Earth's, not once (the largest is %s with %.2f): left and right are exchanged, or a ring is open",
		sum/(4*math.Pi), biggest, most/(4*math.Pi))}}
}

// plateSteradians returns the area of each plate on the unit sphere, by summing
// the signed triangles between a fixed point and each leg (Eriksson 1990, On the
// measure of solid angles, Math. Mag. 63, 184).
func (n *Network) plateSteradians() map[string]float64 {
	o := sphere.FromLonLat(sphere.LonLat{Lon: 12.345, Lat: 6.789}) // any point off the network
	out := map[string]float64{}
	for i := range n.legs {
		l := &n.legs[i]
		a, b := l.arc.A, l.arc.B
		e := 2 * math.Atan2(o.Dot(a.Cross(b)), 1+o.Dot(a)+a.Dot(b)+b.Dot(o))
		out[n.plates[l.left]] += e
		out[n.plates[l.right]] -= e
	}
	for code, sr := range out {
		sr = math.Mod(sr, 4*math.Pi)
		if sr < 0 {
			sr += 4 * math.Pi
		}
		out[code] = sr
	}
	return out
}

// PlateAreasKm2 returns the area of each plate in km² on a sphere with the
// area of the WGS84 ellipsoid (authalic radius 6371.0072 km); it is meaningful
// only where the network has no faults.
func (n *Network) PlateAreasKm2() map[string]float64 {
	const authalicRadiusKm = 6371.0072
	out := n.plateSteradians()
	for code := range out {
		out[code] *= authalicRadiusKm * authalicRadiusKm
	}
	return out
}
