package bundle

import (
	"fmt"
	"regexp"
	"slices"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"

	"nearmargin/setting/boundary"
	"nearmargin/setting/sphere"
)

// The written form of boundaries, one line of text a vertex:
//
//	node bouvet -0.50 -54.80 Bouvet triple junction
//
//	line kermadec-trench
//	name Kermadec Trench
//	plates KE PA
//	subducts PA
//	sigma_km 12
//	sigma_km transform 15
//	source …
//	source_status memory
//	@hikurangi trench
//	-177.30 -35.20
//	-176.40 -32.10 transform Name of this leg
//	@louisville
//
// A node is a place where lines meet; every line starts and ends at one. PLATES
// are the left and the right one. A vertex is longitude, latitude and, where the
// kind changes, the kind of the legs that follow, with a name of their own if
// they have one. What follows a # is a comment. Each run of one kind and name
// becomes one boundary.

// legKinds are the words for types in the written form.
var legKinds = map[string]boundary.Type{
	"trench":      boundary.Subduction,
	"ridge":       boundary.SpreadingRidge,
	"transform":   boundary.OceanicTransform,
	"fault":       boundary.ContinentalTransform,
	"rift":        boundary.ContinentalRift,
	"collision":   boundary.ContinentalConvergent,
	"convergence": boundary.OceanicConvergent,
}

var nameForm = regexp.MustCompile(`^[a-z0-9]+(-[a-z0-9]+)*$`)

type lineNode struct {
	at    sphere.LonLat
	title string
	file  string
	line  int
	used  bool
}

type lineVertex struct {
	node string // name of a node, or "" and at
	at   sphere.LonLat
	kind boundary.Type // Unknown where the last kind holds on
	name string        // of the legs that follow
	line int
}

type lineDraft struct {
	file       string
	line       int
	id         string
	name       string
	left       string
	right      string
	subducting string
	sigmaKm    map[boundary.Type]float64 // Unknown: for all types without their own
	source     string
	status     string
	path       []lineVertex
}

// lineSet is what all files of the written form hold together.
type lineSet struct {
	nodes  map[string]*lineNode
	drafts []*lineDraft
}

// parse reads one file into the set.
func (s *lineSet) parse(file, text string) error {
	var cur *lineDraft
	for i, raw := range strings.Split(text, "\n") {
		n := i + 1
		body, words, err := splitLine(file, n, raw)
		if err != nil {
			return err
		}
		if len(words) == 0 {
			continue
		}
		switch key := words[0]; {
		case key == "node":
			if err := s.parseNode(file, n, words); err != nil {
				return err
			}
		case key == "line":
			if len(words) != 2 || !nameForm.MatchString(words[1]) {
				return fault(file, n, `want "line ID", the id in lower case with hyphens, not %q`, strings.TrimSpace(body))
			}
			cur = &lineDraft{file: file, line: n, id: words[1], sigmaKm: map[boundary.Type]float64{}}
			s.drafts = append(s.drafts, cur)
		case cur == nil:
			return fault(file, n, "%q stands before the first line or node", strings.TrimSpace(body))
		case key[0] == '@' || key[0] == '-' || key[0] == '.' || key[0] >= '0' && key[0] <= '9':
			v, err := parseVertex(file, n, words)
			if err != nil {
				return err
			}
			cur.path = append(cur.path, v)
		default:
			if err := cur.parseHeader(n, key, words[1:]); err != nil {
				return err
			}
		}
	}
	return nil
}

// splitLine returns what stands before any # in a line, and its words.
func splitLine(file string, n int, raw string) (body string, words []string, err error) {
	if !utf8.ValidString(raw) {
		return "", nil, &FileError{File: file, Line: n, Err: errNotUTF8}
	}
	body, _, _ = strings.Cut(raw, "#")
	words = strings.Fields(body)
	for i, w := range words {
		if strings.ContainsFunc(w, unicode.IsControl) {
			return "", nil, fault(file, n, "word %d, %q, holds a control character", i+1, w)
		}
	}
	return body, words, nil
}

func (s *lineSet) parseNode(file string, n int, words []string) error {
	if len(words) < 4 || !nameForm.MatchString(words[1]) {
		return fault(file, n, `want "node NAME LON LAT TITLE", the name in lower case with hyphens`)
	}
	at, err := parsePosition(words[2], words[3])
	if err != nil {
		return fault(file, n, "node %s: %v", words[1], err)
	}
	if have := s.nodes[words[1]]; have != nil {
		return fault(file, n, "node %s stands already at %s:%d", words[1], have.file, have.line)
	}
	s.nodes[words[1]] = &lineNode{at: at, title: strings.Join(words[4:], " "), file: file, line: n}
	return nil
}

func (d *lineDraft) parseHeader(n int, key string, args []string) error {
	text := strings.Join(args, " ")
	if len(args) == 0 {
		return fault(d.file, n, "%s has no value", key)
	}
	switch key {
	case "name":
		d.name = text
	case "plates":
		if len(args) != 2 {
			return fault(d.file, n, `want "plates LEFT RIGHT", not %q`, text)
		}
		d.left, d.right = args[0], args[1]
	case "subducts":
		d.subducting = text
	case "source":
		d.source = text
	case "source_status":
		d.status = text
	case "sigma_km":
		kind := boundary.Unknown
		if len(args) == 2 {
			var ok bool
			if kind, ok = legKinds[args[0]]; !ok {
				return fault(d.file, n, "%q is no kind of leg; the kinds are %s", args[0], kindWords())
			}
		}
		km, err := strconv.ParseFloat(args[len(args)-1], 64)
		if err != nil || len(args) > 2 {
			return fault(d.file, n, `want "sigma_km [KIND] NUMBER", not %q`, text)
		}
		d.sigmaKm[kind] = km
	default:
		return fault(d.file, n, "%q is unknown here; want name, plates, subducts, sigma_km, source, source_status or a vertex", key)
	}
	return nil
}

func parseVertex(file string, n int, words []string) (lineVertex, error) {
	v := lineVertex{line: n}
	rest := words[1:]
	if name, ok := strings.CutPrefix(words[0], "@"); ok {
		v.node = name
	} else {
		if len(words) < 2 {
			return v, fault(file, n, `want "LON LAT [KIND [NAME]]" or "@NODE [KIND [NAME]]"`)
		}
		var err error
		if v.at, err = parsePosition(words[0], words[1]); err != nil {
			return v, fault(file, n, "%v", err)
		}
		rest = words[2:]
	}
	if len(rest) > 0 {
		var ok bool
		if v.kind, ok = legKinds[rest[0]]; !ok {
			return v, fault(file, n, "%q is no kind of leg; the kinds are %s", rest[0], kindWords())
		}
		v.name = strings.Join(rest[1:], " ")
	}
	return v, nil
}

func kindWords() string {
	var words []string
	for w := range legKinds {
		words = append(words, w)
	}
	slices.Sort(words)
	return strings.Join(words, ", ")
}

func parsePosition(lon, lat string) (sphere.LonLat, error) {
	x, err1 := strconv.ParseFloat(lon, 64)
	y, err2 := strconv.ParseFloat(lat, 64)
	if err1 != nil || err2 != nil {
		return sphere.LonLat{}, fmt.Errorf("%q %q is not a longitude and a latitude", lon, lat)
	}
	return position(x, y)
}

// position checks a longitude and a latitude of a model file.
func position(lon, lat float64) (sphere.LonLat, error) {
	if !(lon >= -180 && lon <= 180) {
		return sphere.LonLat{}, fmt.Errorf("longitude %g is out of range -180 to 180", lon)
	}
	if !(lat >= -90 && lat <= 90) {
		return sphere.LonLat{}, fmt.Errorf("latitude %g is out of range -90 to 90", lat)
	}
	return sphere.LonLat{Lon: sphere.WrapLon(lon), Lat: lat}, nil
}

// boundaries resolves the nodes and cuts every draft into runs of one kind and
// name. It also returns the titles of the nodes.
func (s *lineSet) boundaries() ([]*boundary.Boundary, map[sphere.LonLat]string, error) {
	var out []*boundary.Boundary
	ids := map[string]*lineDraft{}
	for _, d := range s.drafts {
		if have := ids[d.id]; have != nil {
			return nil, nil, fault(d.file, d.line, "line %s stands already at %s:%d", d.id, have.file, have.line)
		}
		ids[d.id] = d
		runs, err := s.cut(d)
		if err != nil {
			return nil, nil, err
		}
		out = append(out, runs...)
	}
	titles := map[sphere.LonLat]string{}
	for name, n := range s.nodes {
		if !n.used {
			return nil, nil, fault(n.file, n.line, "no line ends at node %s", name)
		}
		if n.title != "" {
			titles[n.at] = n.title
		}
	}
	return out, titles, nil
}

// cut makes one boundary of each run of a draft.
func (s *lineSet) cut(d *lineDraft) ([]*boundary.Boundary, error) {
	if len(d.path) < 2 {
		return nil, fault(d.file, d.line, "line %s has %d vertices; at least 2 are needed", d.id, len(d.path))
	}
	if d.path[0].kind == boundary.Unknown {
		return nil, fault(d.file, d.path[0].line, "the first vertex of a line needs a kind: %s", kindWords())
	}
	var runs []boundary.Spec
	for i := range d.path {
		v := &d.path[i]
		last := i == len(d.path)-1
		if v.node != "" {
			n := s.nodes[v.node]
			switch {
			case n == nil:
				return nil, fault(d.file, v.line, "there is no node %s", v.node)
			case i > 0 && !last:
				return nil, fault(d.file, v.line, "node %s stands inside line %s; lines meet at their ends only", v.node, d.id)
			}
			n.used = true
			v.at = n.at
		} else if i == 0 || last {
			return nil, fault(d.file, v.line, "line %s must start and end at a node, such as @name", d.id)
		}
		if i > 0 {
			r := &runs[len(runs)-1]
			r.Path = append(r.Path, v.at)
		}
		if v.kind != boundary.Unknown && !last {
			name := v.name
			if name == "" {
				name = d.name
			}
			if len(runs) == 0 || runs[len(runs)-1].Type != v.kind || runs[len(runs)-1].Name != name {
				runs = append(runs, boundary.Spec{Name: name, Type: v.kind, Path: []sphere.LonLat{v.at}})
			}
		}
	}
	return d.finish(runs)
}

// finish fills in what all runs of a draft share, and numbers them.
func (d *lineDraft) finish(runs []boundary.Spec) ([]*boundary.Boundary, error) {
	width := len(strconv.Itoa(len(runs)))
	var out []*boundary.Boundary
	for i, r := range runs {
		r.ID = d.id
		if len(runs) > 1 {
			r.ID = fmt.Sprintf("%s-%0*d", d.id, width, i+1)
		}
		r.Left, r.Right = d.left, d.right
		if r.Type == boundary.Subduction || r.Type == boundary.ContinentalConvergent || r.Type == boundary.OceanicConvergent {
			r.Subducting = d.subducting
		}
		var ok bool
		if r.SigmaKm, ok = d.sigmaKm[r.Type]; !ok {
			r.SigmaKm = d.sigmaKm[boundary.Unknown]
		}
		r.Source, r.SourceStatus = d.source, boundary.SourceStatus(d.status)
		b, err := boundary.New(r)
		if err != nil {
			return nil, &FileError{File: d.file, Line: d.line, Err: err}
		}
		out = append(out, b)
	}
	return out, nil
}
