package published

import (
	"fmt"
	"io"
	"strconv"
	"strings"

	"nearmargin/setting/boundary"
	"nearmargin/setting/sphere"
)

// Step is one row of a table of plate boundary steps: a great-circle arc of one
// class between two plates.
type Step struct {
	Line, Seq   int    // in the file; as the table numbers it
	Left, Right string // the project's plate codes, seen from From towards To
	Subducting  string // the plate that goes down; "" where the class is not SUB
	Type        boundary.Type
	From, To    sphere.LonLat
	LengthKm    float64
	// The velocity of the left plate relative to the right at the step's middle.
	SpeedMmYr, AzimuthDeg       float64
	OpeningMmYr, RightLateralMm float64 // its parts across the step and along it, mm/yr
	InOrogen                    bool
}

// Columns of the table, counted from 0, end excluded: I4, 2 blanks of which the
// second may be the mark of continuity, A5, F9.3, F8.3, F9.3, F8.3, F6.1, I4, F6.1,
// I4, F7.1, F7.1, I7, I4, 2 characters likewise, A3, A1.
const (
	seqEnd    = 4
	pairAt    = 6
	pairEnd   = 11
	classAt   = 92
	classEnd  = 95
	stepWidth = 96
)

var stepNumbers = [...]struct {
	name     string
	from, to int
}{
	{"start longitude", 11, 20}, {"start latitude", 20, 28},
	{"end longitude", 28, 37}, {"end latitude", 37, 45},
	{"length", 45, 51}, {"azimuth", 51, 55},
	{"speed", 55, 61}, {"azimuth of the velocity", 61, 65},
	{"divergence", 65, 72}, {"right-lateral rate", 72, 79},
}

// ReadSteps reads the table of steps of Bird (2003), An updated digital model of
// plate boundaries, G-cubed 4(3), 1027, Table 2, in its fixed columns
// (PB2002_steps.dat). Marks of continuity (':') and of orogens ('*') are taken
// off. In a pair A/B the right plate goes down under the left, in A\B the left
// under the right; where the class is not SUB the class decides, and no plate
// goes down. The error is one of reading; lines at fault are in the tally.
func ReadSteps(name string, text io.Reader, codes Codes) ([]Step, Tally, error) {
	t := Tally{File: name}
	var out []Step
	err := eachLine(name, text, func(line int, s string) {
		step, err := parseStep(s, codes)
		if err != nil {
			t.reject(line, "%v", err)
			return
		}
		step.Line = line
		out = append(out, step)
		t.Read++
	})
	return out, t, err
}

func parseStep(s string, codes Codes) (Step, error) {
	var p Step
	if len(s) < classEnd || len(s) > stepWidth {
		return p, fmt.Errorf("has %d characters; a row of the table of steps has %d or %d", len(s), classEnd, stepWidth)
	}
	var err error
	if p.Seq, err = strconv.Atoi(strings.TrimSpace(s[:seqEnd])); err != nil {
		return p, fmt.Errorf("columns 1-%d, the number of the step: %q is no number", seqEnd, s[:seqEnd])
	}
	if err := p.parsePair(s[pairAt:pairEnd], s[classAt:classEnd], codes); err != nil {
		return p, err
	}
	var x [len(stepNumbers)]float64
	for i, c := range stepNumbers {
		field := strings.TrimSpace(s[c.from:c.to])
		if x[i], err = strconv.ParseFloat(field, 64); err != nil || x[i]-x[i] != 0 {
			return p, fmt.Errorf("columns %d-%d, the %s: %q is no number", c.from+1, c.to, c.name, field)
		}
	}
	if p.From, err = place(x[0], x[1]); err != nil {
		return p, err
	}
	if p.To, err = place(x[2], x[3]); err != nil {
		return p, err
	}
	p.LengthKm, p.SpeedMmYr, p.AzimuthDeg, p.OpeningMmYr, p.RightLateralMm = x[4], x[6], x[7], x[8], x[9]
	p.InOrogen = strings.HasSuffix(s, "*")
	arc, ok := sphere.NewArc(sphere.FromLonLat(p.From), sphere.FromLonLat(p.To))
	if !ok {
		return p, fmt.Errorf("the ends %v and %v coincide or are antipodes", p.From, p.To)
	}
	// two rounded ends and a rounded length, on a sphere and on an ellipsoid
	if km := sphere.RadToKm(arc.Length()); km > 1.02*p.LengthKm+1 || p.LengthKm > 1.02*km+1 {
		return p, fmt.Errorf("the ends are %.1f km apart and the length says %.1f; a column is out of place", km, p.LengthKm)
	}
	return p, nil
}

func (p *Step) parsePair(pair, class string, codes Codes) error {
	var ok bool
	if p.Type, ok = classes[class]; !ok {
		return fmt.Errorf("columns %d-%d, the class: %q is none of CCB, CRB, CTF, OCB, OSR, OTF, SUB", classAt+1, classEnd, class)
	}
	if !isCode(pair[:2]) || !isCode(pair[3:]) || !strings.ContainsRune(`-/\`, rune(pair[2])) {
		return fmt.Errorf(`columns %d-%d, the plates: %q is not two codes joined by '-', '/' or '\'`, pairAt+1, pairEnd, pair)
	}
	p.Left, p.Right = codes.of(pair[:2]), codes.of(pair[3:])
	if p.Left == p.Right {
		return fmt.Errorf("both plates of %q are %s", pair, p.Left)
	}
	if p.Type != boundary.Subduction {
		return nil
	}
	switch pair[2] {
	case '/':
		p.Subducting = p.Right
	case '\\':
		p.Subducting = p.Left
	default:
		return fmt.Errorf(`class SUB and plates %q; '/' or '\' must say which plate goes down`, pair)
	}
	return nil
}

// place checks a position and brings its longitude within (-180, 180].
func place(lon, lat float64) (sphere.LonLat, error) {
	if !(lon >= -360 && lon <= 360) || !(lat >= -90 && lat <= 90) {
		return sphere.LonLat{}, fmt.Errorf("%g, %g is not a longitude and a latitude", lon, lat)
	}
	return sphere.LonLat{Lon: sphere.WrapLon(lon), Lat: lat}, nil
}

// Runs joins steps that follow each other without a gap and have one class and
// one pair of plates into boundaries. Every end of a step is a vertex. Ids are the
// codes of both plates and the number of the run among those of the pair.
func Runs(steps []Step, plateName func(string) string) ([]*boundary.Boundary, error) {
	var out []*boundary.Boundary
	count := map[string]int{}
	for i := 0; i < len(steps); {
		first := &steps[i]
		path := []sphere.LonLat{first.From, first.To}
		j := i + 1
		for ; j < len(steps) && steps[j].continues(&steps[j-1]); j++ {
			path = append(path, steps[j].To)
		}
		pair := strings.ToLower(first.Left + "-" + first.Right)
		count[pair]++
		source := fmt.Sprintf("Bird (2003), step %d", first.Seq)
		if j > i+1 {
			source = fmt.Sprintf("Bird (2003), steps %d to %d", first.Seq, steps[j-1].Seq)
		}
		b, err := boundary.New(boundary.Spec{
			ID: fmt.Sprintf("%s-%d", pair, count[pair]), Name: plateName(first.Left) + "-" + plateName(first.Right) + " " + typeWords[first.Type],
			Type: first.Type, Left: first.Left, Right: first.Right, Subducting: first.Subducting,
			SigmaKm: classSigmaKm[first.Type], Source: source, SourceStatus: boundary.Consulted, Path: path,
		})
		if err != nil {
			return nil, err
		}
		out = append(out, b)
		i = j
	}
	return out, nil
}

func (p *Step) continues(q *Step) bool {
	return p.From == q.To && p.Left == q.Left && p.Right == q.Right && p.Type == q.Type && p.Subducting == q.Subducting
}
