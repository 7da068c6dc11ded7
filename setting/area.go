package setting

import (
	"errors"
	"fmt"

	"nearmargin/setting/boundary"
	"nearmargin/setting/sphere"
)

// The limits of an area.
const (
	MaxAreaPositions = 20000
	MaxAreaRings     = 1000
)

// Area is a part of the Earth's surface to be asked about: one polygon, several,
// or a box of meridians and parallels. It is immutable.
type Area struct {
	shapes []sphere.Shape
	km2    float64
}

// AreaFault says what kind of fault an area has.
type AreaFault uint8

// The kinds of fault.
const (
	AreaForm     AreaFault = 1 // form or range: not closed, too short, out of range
	AreaGeometry AreaFault = 2 // well formed, and impossible: crosses itself, has no area
	AreaTooLarge AreaFault = 3 // more positions or rings than the limits
)

// AreaError says where an area is at fault. Polygon, Ring and Position count from
// 0; Ring is -1 where the polygon as a whole is at fault, Position where the ring
// is, and Polygon where all is.
type AreaError struct {
	Fault                   AreaFault
	Polygon, Ring, Position int
	Detail                  string
}

func (e *AreaError) Error() string {
	if e.Polygon < 0 {
		return e.Detail
	}
	if e.Ring < 0 {
		return fmt.Sprintf("polygon %d: %s", e.Polygon, e.Detail)
	}
	if e.Position < 0 {
		return fmt.Sprintf("polygon %d, ring %d: %s", e.Polygon, e.Ring, e.Detail)
	}
	return fmt.Sprintf("polygon %d, ring %d, position %d: %s", e.Polygon, e.Ring, e.Position, e.Detail)
}

// NewArea builds an area from polygons, each an outer ring and any holes; see
// [sphere.NewPolygon] for what a ring must be. Polygons may touch and not
// overlap. The error is an *AreaError.
func NewArea(polygons ...[][]sphere.LonLat) (*Area, error) {
	if len(polygons) == 0 {
		return nil, &AreaError{AreaForm, -1, -1, -1, "there is no polygon; at least one is needed"}
	}
	rings, positions := 0, 0
	for i, rs := range polygons {
		if rings += len(rs); rings > MaxAreaRings {
			return nil, &AreaError{AreaTooLarge, i, -1, -1, fmt.Sprintf("the area has more than %d rings, which is the limit", MaxAreaRings)}
		}
		for j, r := range rs {
			if positions += len(r); positions > MaxAreaPositions {
				return nil, &AreaError{AreaTooLarge, i, j, -1, fmt.Sprintf("the area has more than %d positions, which is the limit; generalise it", MaxAreaPositions)}
			}
		}
	}
	a := &Area{}
	var done []*sphere.Polygon
	for i, rs := range polygons {
		if len(rs) == 0 {
			return nil, &AreaError{AreaForm, i, -1, -1, "the polygon is empty; it needs an outer ring"}
		}
		p, err := sphere.NewPolygon(rs...)
		var re *sphere.RingError
		switch {
		case errors.As(err, &re):
			fault := AreaGeometry
			if re.Form {
				fault = AreaForm
			}
			return nil, &AreaError{fault, i, re.Ring, re.Position, re.Detail}
		case err != nil:
			return nil, err
		}
		for j, o := range done {
			if v, over := p.Overlaps(o); over {
				at := v.LonLat()
				return nil, &AreaError{AreaGeometry, i, -1, -1, fmt.Sprintf("polygon %d overlaps polygon %d, near %.6g, %.6g; polygons of one area may touch and not overlap", i, j, at.Lon, at.Lat)}
			}
		}
		done = append(done, p)
		a.shapes, a.km2 = append(a.shapes, p), a.km2+p.AreaKm2()
	}
	return a, nil
}

// NewBoxArea builds an area from a box, whose sides are meridians and parallels.
// The error is an *AreaError.
func NewBoxArea(b boundary.Box) (*Area, error) {
	if err := b.Validate(); err != nil {
		return nil, &AreaError{AreaForm, -1, -1, -1, err.Error()}
	}
	q, err := sphere.NewQuad(b.West, b.South, b.East, b.North)
	if err != nil {
		return nil, &AreaError{AreaGeometry, -1, -1, -1, err.Error()}
	}
	return &Area{[]sphere.Shape{q}, q.AreaKm2()}, nil
}

// AreaKm2 returns the area on the WGS84 ellipsoid.
func (a *Area) AreaKm2() float64 { return a.km2 }
