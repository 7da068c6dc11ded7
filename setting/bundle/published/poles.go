package published

import (
	"fmt"
	"io"
	"strconv"
	"strings"

	"nearmargin/setting/bundle"
)

// Pole is one row of a table of poles.
type Pole struct {
	Line int
	bundle.MotionRow
	Fixed bool // the rate is 0: the plate that the others move against
}

// ReadPoles reads the table of poles of Bird (2003), Table 1, in its fixed columns
// (PB2002_poles.dat): plate A2, latitude F9.3, longitude F10.3, rate in degrees per
// million years F9.4, anticlockwise, relative to the Pacific plate; then a remark.
// Numbers keep their spelling.
func ReadPoles(name string, text io.Reader, codes Codes) ([]Pole, Tally, error) {
	t := Tally{File: name}
	seen := map[string]int{}
	var out []Pole
	err := eachLine(name, text, func(line int, s string) {
		p, err := parsePole(s, codes)
		if err == nil && seen[p.Plate] > 0 {
			err = fmt.Errorf("plate %s stands in line %d already", p.Plate, seen[p.Plate])
		}
		if err != nil {
			t.reject(line, "%v", err)
			return
		}
		p.Line, seen[p.Plate] = line, line
		out = append(out, p)
		t.Read++
	})
	return out, t, err
}

func parsePole(s string, codes Codes) (Pole, error) {
	var p Pole
	const width = 30
	if len(s) < width {
		return p, fmt.Errorf("has %d characters; a row of the table of poles has at least %d", len(s), width)
	}
	if !isCode(s[:2]) {
		return p, fmt.Errorf("columns 1-2: %q is no plate code", s[:2])
	}
	p.Plate = codes.of(s[:2])
	var x [3]float64
	for i, c := range [...]struct {
		name     string
		from, to int
		most     float64
	}{{"latitude", 2, 11, 90}, {"longitude", 11, 21, 360}, {"rate", 21, 30, 285}} {
		field := strings.TrimSpace(s[c.from:c.to])
		var err error
		if x[i], err = strconv.ParseFloat(field, 64); err != nil || !(x[i] >= -c.most && x[i] <= c.most) {
			return p, fmt.Errorf("columns %d-%d, the %s: %q is no number within -%g and %g", c.from+1, c.to, c.name, field, c.most, c.most)
		}
		p.Numbers = append(p.Numbers, plain(field))
	}
	p.Numbers = append(p.Numbers, "") // no σ is published
	p.Fixed = x[2] == 0
	return p, p.Check(bundle.PoleForm)
}

// plain drops a plus sign in front of a number.
func plain(s string) string { return strings.TrimPrefix(s, "+") }
