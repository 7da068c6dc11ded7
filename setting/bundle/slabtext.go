package bundle

import (
	"slices"
	"strconv"
	"strings"

	"nearmargin/setting/slab"
)

// The written form of slabs, one line of text a vertex:
//
//	slab kermadec
//	name Kermadec
//	kind subduction
//	boundaries kermadec-trench hikurangi-trench
//	subducting_plate PA
//	overriding_plate KE
//	arc_min_depth_km 80
//	sigma_km 10
//	source …
//	source_status memory
//
//	contour 10
//	-177.50 -36.00
//	-176.60 -33.20
//	contour 300 sigma 30
//	…
//
// Contours stand from the shallowest to the deepest, each with the slab deepening
// to its right. Boundaries are ids of lines or of boundaries; a slab within one
// plate has none. What follows a # is a comment.

// slabDraft is one slab before its boundaries are resolved.
type slabDraft struct {
	file       string
	line       int
	spec       slab.Spec
	boundaries []string
	sigmaKm    float64
	contours   []slab.Contour
}

// parseSlabs reads one file of the written form.
func parseSlabs(file, text string) ([]*slabDraft, error) {
	var out []*slabDraft
	var cur *slabDraft
	for i, raw := range strings.Split(text, "\n") {
		n := i + 1
		body, words, err := splitLine(file, n, raw)
		if err != nil {
			return nil, err
		}
		if len(words) == 0 {
			continue
		}
		switch key := words[0]; {
		case key == "slab":
			if len(words) != 2 || !nameForm.MatchString(words[1]) {
				return nil, fault(file, n, `want "slab ID", the id in lower case with hyphens`)
			}
			cur = &slabDraft{file: file, line: n, spec: slab.Spec{ID: words[1]}}
			out = append(out, cur)
		case cur == nil:
			return nil, fault(file, n, "%q stands before the first slab", strings.TrimSpace(body))
		case key == "contour":
			if err := cur.parseContour(n, words); err != nil {
				return nil, err
			}
		case key[0] == '-' || key[0] == '.' || key[0] >= '0' && key[0] <= '9':
			if len(cur.contours) == 0 || len(words) != 2 {
				return nil, fault(file, n, `want "LON LAT" below a contour, not %q`, strings.TrimSpace(body))
			}
			p, err := parsePosition(words[0], words[1])
			if err != nil {
				return nil, fault(file, n, "%v", err)
			}
			c := &cur.contours[len(cur.contours)-1]
			c.Path = append(c.Path, p)
		default:
			if err := cur.parseHeader(n, key, words[1:]); err != nil {
				return nil, err
			}
		}
	}
	return out, nil
}

func (d *slabDraft) parseContour(n int, words []string) error {
	c := slab.Contour{SigmaKm: d.sigmaKm}
	var err error
	switch {
	case len(words) == 2:
	case len(words) == 4 && words[2] == "sigma":
		if c.SigmaKm, err = strconv.ParseFloat(words[3], 64); err != nil {
			return fault(d.file, n, "sigma %q is not a number", words[3])
		}
	default:
		return fault(d.file, n, `want "contour DEPTH_KM [sigma KM]"`)
	}
	if c.DepthKm, err = strconv.ParseFloat(words[1], 64); err != nil {
		return fault(d.file, n, "depth %q is not a number", words[1])
	}
	d.contours = append(d.contours, c)
	return nil
}

func (d *slabDraft) parseHeader(n int, key string, args []string) error {
	text := strings.Join(args, " ")
	var err error
	switch key {
	case "name":
		d.spec.Name = text
	case "kind":
		d.spec.Kind, err = slab.ParseKind(text)
	case "boundaries":
		d.boundaries = args
	case "subducting_plate":
		d.spec.Subducting = text
	case "overriding_plate":
		d.spec.Overriding = text
	case "arc_min_depth_km":
		d.spec.ArcMinDepthKm, err = strconv.ParseFloat(text, 64)
	case "sigma_km":
		d.sigmaKm, err = strconv.ParseFloat(text, 64)
	case "source":
		d.spec.Source = text
	case "source_status":
		d.spec.SourceStatus = text
	default:
		return fault(d.file, n, "%q is unknown here; want a slab's header, a contour or a vertex", key)
	}
	if err != nil {
		return fault(d.file, n, "%s: %v", key, err)
	}
	return nil
}

// finish resolves the boundaries and builds the slab.
func (d *slabDraft) finish(resolve func(string) []string) (*slab.Slab, error) {
	for _, name := range d.boundaries {
		ids := resolve(name)
		if len(ids) == 0 {
			return nil, fault(d.file, d.line, "slab %s: there is no line or boundary %q", d.spec.ID, name)
		}
		d.spec.BoundaryIDs = append(d.spec.BoundaryIDs, ids...)
	}
	slices.Sort(d.spec.BoundaryIDs)
	d.spec.BoundaryIDs = slices.Compact(d.spec.BoundaryIDs)
	var err error
	if d.spec.Surface, err = slab.NewContours(d.contours); err != nil {
		return nil, &FileError{File: d.file, Line: d.line, Detail: "slab " + d.spec.ID, Err: err}
	}
	s, err := slab.New(d.spec)
	if err != nil {
		return nil, &FileError{File: d.file, Line: d.line, Err: err}
	}
	return s, nil
}
