package annotate

import (
	"bufio"
	"bytes"
	"encoding/csv"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"math"
	"regexp"
	"slices"
	"strconv"
	"strings"

	"github.com/tidwall/gjson"
)

// Row is what one row, object or feature of an annotated file says.
type Row struct {
	Number       int64   // from 1
	Name         string  // from a column such as name, site or id; "" where there is none
	Lon, Lat     float64 // degrees; NaN where the row has no place that can be read
	Label        string  // "" where the row carries an error, or is an area
	Family       string
	Confidence   string
	Reason       string // what speaks for the label; with low confidence what speaks against it, where the file says so
	BoundaryType string // of the nearest boundary
	DistanceKm   float64
	Model        string // id@edition
	Error        string // why there is no answer
	Brief        bool   // the file, a table, does not say what else the row could be
	Area         bool   // a polygon; the members above but Model say nothing
}

// ReadOptions say how an annotated file is read.
type ReadOptions struct {
	LonColumn, LatColumn string // "" finds them by name
	Prefix               string // of the added columns; "" means DefaultPrefix
}

// Read reads an annotated file row by row and calls each for every one, in order. A
// text of a Row holds all of the row's memory: copy what is kept of many.
func Read(in io.Reader, f Format, o ReadOptions, each func(Row) error) error {
	if o.Prefix == "" {
		o.Prefix = DefaultPrefix
	}
	switch f {
	case CSV:
		return readCSV(in, o, each)
	case NDJSON:
		return readNDJSON(in, each)
	case GeoJSON:
		return readGeoJSON(in, each)
	}
	return &InputError{Parameter: "format", Detail: fmt.Sprintf("%q is not read here; want csv, ndjson or geojson", f)}
}

// notAnnotated is the fault of a file without answers.
func notAnnotated(what string) error {
	return &InputError{Detail: fmt.Sprintf("the file has no %s; add the answers first: nearmargin annotate FILE --out ANNOTATED", what)}
}

// nameForms are the columns that name a row, the best first.
var nameForms = []*regexp.Regexp{regexp.MustCompile(`(?i)name`), regexp.MustCompile(`(?i)site|station|well|sample`), regexp.MustCompile(`(?i)^(id|key|code)$`)}

func nameColumn(names []string, skip string) int {
	for _, form := range nameForms {
		for i, n := range names {
			if form.MatchString(n) && !strings.HasPrefix(n, skip) {
				return i
			}
		}
	}
	return -1
}

func readCSV(in io.Reader, o ReadOptions, each func(Row) error) error {
	br := bufio.NewReaderSize(in, 64<<10)
	var j csvJob
	if _, err := j.sniff(br); err != nil {
		return err
	}
	r := csv.NewReader(br)
	r.Comma, r.FieldsPerRecord, r.LazyQuotes, r.ReuseRecord = rune(j.comma), -1, true, true
	names, err := r.Read()
	if err != nil {
		return csvFault(err, MaxRowBytes)
	}
	names = slices.Clone(names)
	if !slices.Contains(names, o.Prefix+"setting") {
		return notAnnotated("column " + o.Prefix + "setting")
	}
	lon, err := findColumn(names, o.LonColumn, "lon_column", "longitude", lonName)
	if err != nil {
		return err
	}
	lat, err := findColumn(names, o.LatColumn, "lat_column", "latitude", latName)
	if err != nil {
		return err
	}
	at := map[string]int{}
	for i, n := range names {
		at[n] = i
	}
	name := nameColumn(names, o.Prefix)
	for n := int64(1); ; n++ {
		rec, err := r.Read()
		if err == io.EOF {
			return nil
		}
		if err != nil {
			return csvFault(err, MaxRowBytes)
		}
		cell := func(i int) string {
			if i < 0 || i >= len(rec) {
				return ""
			}
			return rec[i]
		}
		added := func(c string) string {
			i, ok := at[o.Prefix+c]
			if !ok {
				return ""
			}
			return cell(i)
		}
		row := Row{Number: n, Name: strings.TrimSpace(cell(name)), Lon: place(cell(lon), j.decimal, -180, 360), Lat: place(cell(lat), j.decimal, -90, 90),
			Label: added("setting"), Family: added("family"), Confidence: added("confidence"), Reason: added("reason"), Brief: true, BoundaryType: added("boundary_type"),
			DistanceKm: distance(added("distance_km")), Model: added("model"), Error: added("error")}
		if err := each(row); err != nil {
			return err
		}
	}
}

// place reads a coordinate, NaN where it is none.
func place(s string, comma bool, low, high float64) float64 {
	if isMissing(s) {
		return math.NaN()
	}
	x, err := parseNumber(s, comma)
	if err != nil || !(x >= low && x <= high) {
		return math.NaN()
	}
	return x
}

func distance(s string) float64 {
	x, err := strconv.ParseFloat(s, 64)
	if err != nil {
		return math.NaN()
	}
	return x
}

// longestAnswer is more than an answer takes up in a line.
const longestAnswer = 256 << 10

func readNDJSON(in io.Reader, each func(Row) error) error {
	s := bufio.NewScanner(in)
	s.Buffer(nil, MaxRowBytes+longestAnswer)
	n, any := int64(0), false
	for s.Scan() {
		line := bytes.TrimPrefix(bytes.TrimSpace(s.Bytes()), byteOrderMark)
		if len(line) == 0 {
			continue
		}
		n++
		if !gjson.ValidBytes(line) {
			return badLine(int(n), "not a JSON object")
		}
		row := jsonRow(n, gjson.ParseBytes(line), gjson.ParseBytes(line))
		any = any || row.Label != "" || row.Error != ""
		if err := each(row); err != nil {
			return err
		}
	}
	if errors.Is(s.Err(), bufio.ErrTooLong) {
		return badLine(int(n+1), "longer than %d bytes", MaxRowBytes+longestAnswer)
	} else if s.Err() != nil {
		return s.Err()
	}
	if n > 0 && !any {
		return notAnnotated("member tectonic in any line")
	}
	return nil
}

// geoReader reads an annotated FeatureCollection feature by feature, or one Feature.
type geoReader struct {
	d    *json.Decoder
	each func(Row) error
	rows int64
	any  bool // of the rows has an answer or an error
}

func readGeoJSON(in io.Reader, each func(Row) error) error {
	br := bufio.NewReaderSize(in, 64<<10)
	if mark, err := br.Peek(len(byteOrderMark)); err == nil && bytes.Equal(mark, byteOrderMark) {
		_, _ = br.Discard(len(mark)) // it is in the buffer
	}
	g := &geoReader{d: json.NewDecoder(br), each: each}
	if tok, err := g.d.Token(); err != nil || tok != json.Delim('{') {
		return g.fault(err, "the file is not a JSON object; want a GeoJSON Feature or FeatureCollection")
	}
	single, collection := map[string]json.RawMessage{}, false
	for g.d.More() {
		key, err := g.d.Token()
		if err != nil {
			return g.fault(err, "")
		}
		name, _ := key.(string) // the name of a member is always a string
		if name == "features" && !collection {
			collection = true
			if err := g.features(); err != nil {
				return err
			}
			continue
		}
		var raw json.RawMessage
		if err := g.d.Decode(&raw); err != nil {
			return g.fault(err, "")
		}
		if name == "properties" || name == "id" {
			single[name] = raw
		}
	}
	if _, err := g.d.Token(); err != nil {
		return g.fault(err, "")
	}
	if _, err := g.d.Token(); err != io.EOF {
		return g.fault(nil, fmt.Sprintf("something follows the JSON object, at byte %d", g.d.InputOffset()))
	}
	if !collection {
		outer, err := json.Marshal(single)
		if err != nil {
			return err
		}
		if err := g.row(gjson.ParseBytes(outer)); err != nil {
			return err
		}
	}
	if g.rows > 0 && !g.any {
		return notAnnotated("property tectonic in any feature")
	}
	return nil
}

// features reads the array of features.
func (g *geoReader) features() error {
	if tok, err := g.d.Token(); err != nil || tok != json.Delim('[') {
		return g.fault(err, "features must be an array")
	}
	var raw json.RawMessage
	for g.d.More() {
		if err := g.d.Decode(&raw); err != nil {
			return g.fault(err, "")
		}
		if err := g.row(gjson.ParseBytes(raw)); err != nil {
			return err
		}
	}
	if _, err := g.d.Token(); err != nil {
		return g.fault(err, "")
	}
	return nil
}

func (g *geoReader) row(feature gjson.Result) error {
	g.rows++
	row := jsonRow(g.rows, feature.Get("properties"), feature)
	g.any = g.any || row.Label != "" || row.Error != "" || row.Area
	return g.each(row)
}

// fault says where the JSON is broken, or what else is wrong where it is not.
func (g *geoReader) fault(err error, otherwise string) error {
	if err == nil || otherwise != "" && !errors.As(err, new(*json.SyntaxError)) && err != io.EOF {
		return &InputError{Detail: otherwise}
	}
	if err == io.EOF {
		err = io.ErrUnexpectedEOF
	}
	return &InputError{Detail: fmt.Sprintf("the file is not JSON, near byte %d: %v; want a GeoJSON Feature or FeatureCollection", g.d.InputOffset(), err)}
}

// jsonRow reads the answer within an object's members; outer may name it by its id.
func jsonRow(n int64, members, outer gjson.Result) Row {
	row := Row{Number: n, Lon: math.NaN(), Lat: math.NaN(), DistanceKm: math.NaN(), Error: members.Get("tectonic_error").String()}
	var names []string
	members.ForEach(func(k, _ gjson.Result) bool {
		names = append(names, k.String())
		return true
	})
	if i := nameColumn(names, "tectonic"); i >= 0 {
		row.Name = members.Get(gjson.Escape(names[i])).String()
	} else if id := outer.Get("id"); id.Exists() {
		row.Name = id.String()
	}
	t := members.Get("tectonic")
	if !t.IsObject() {
		return row
	}
	row.Model = t.Get("model.id").String() + "@" + t.Get("model.edition").String()
	if t.Get("area_km2").Exists() {
		row.Area = true
		return row
	}
	row.Lon, row.Lat = place(t.Get("site.lon").Raw, false, -180, 360), place(t.Get("site.lat").Raw, false, -90, 90)
	s := t.Get("setting")
	row.Label, row.Family, row.Confidence = s.Get("label").String(), s.Get("family").String(), s.Get("confidence").String()
	row.Reason = s.Get("reasons.0").String()
	if alternatives := s.Get("alternatives").Array(); row.Confidence == "low" && len(alternatives) > 0 {
		var all []string
		for _, a := range alternatives {
			all = append(all, a.Get("label").String()+": "+a.Get("reason").String())
		}
		row.Reason = strings.Join(all, "; ")
	}
	row.BoundaryType, row.DistanceKm = t.Get("nearest_boundary.type").String(), distance(t.Get("nearest_boundary.distance_km").Raw)
	return row
}
