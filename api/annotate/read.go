package annotate

import (
	"bufio"
	"bytes"
	"encoding/csv"
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

// Read reads an annotated file and calls each for every row, in order. CSV and
// NDJSON are read row by row, GeoJSON as a whole.
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

func readNDJSON(in io.Reader, each func(Row) error) error {
	s := bufio.NewScanner(in)
	s.Buffer(nil, MaxRowBytes)
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
	if err := s.Err(); err != nil {
		return err
	}
	if n > 0 && !any {
		return notAnnotated("member tectonic in any line")
	}
	return nil
}

func readGeoJSON(in io.Reader, each func(Row) error) error {
	b, err := io.ReadAll(in)
	if err != nil {
		return err
	}
	b = bytes.TrimPrefix(b, byteOrderMark)
	if !gjson.ValidBytes(b) {
		return &InputError{Detail: "the file is not JSON; want a GeoJSON Feature or FeatureCollection"}
	}
	doc := gjson.ParseBytes(b)
	list := []gjson.Result{doc}
	if f := doc.Get("features"); f.IsArray() {
		list = f.Array()
	}
	any := false
	for i, f := range list {
		p := f.Get("properties")
		row := jsonRow(int64(i+1), p, f)
		any = any || row.Label != "" || row.Error != "" || row.Area
		if err := each(row); err != nil {
			return err
		}
	}
	if len(list) > 0 && !any {
		return notAnnotated("property tectonic in any feature")
	}
	return nil
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
	row.Lon, row.Lat = t.Get("site.lon").Float(), t.Get("site.lat").Float()
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
	row.BoundaryType, row.DistanceKm = t.Get("nearest_boundary.type").String(), t.Get("nearest_boundary.distance_km").Float()
	return row
}
