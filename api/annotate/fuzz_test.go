package annotate

import (
	"bytes"
	"context"
	"encoding/csv"
	"encoding/json"
	"errors"
	"io"
	"strings"
	"testing"
	"unicode/utf8"
)

// fuzzRun annotates and sees to it that a fault of the input is an *InputError
// with words.
func fuzzRun(t *testing.T, f Format, in []byte, o Options) (string, Stats, bool) {
	t.Helper()
	var out bytes.Buffer
	st, err := Run(context.Background(), bytes.NewReader(in), &out, f, o)
	if st.Errors > st.Rows || st.Errors < 0 {
		t.Fatalf("%+v", st)
	}
	if err == nil {
		return out.String(), st, true
	}
	var fault *InputError
	if !errors.As(err, &fault) || fault.Detail == "" || !utf8.ValidString(fault.Detail) {
		t.Fatalf("error %#v", err)
	}
	return "", st, false
}

// FuzzCSV: no panic; what comes out is a table of as many rows as were counted,
// every one with an answer or an error.
func FuzzCSV(f *testing.F) {
	for _, seed := range []string{
		"lon,lat\n1,2\n", "lon;lat\r\n1,5;2\r\n", "\xef\xbb\xbflon\tlat\n1\t2", "lon,lat,n\n1,2,\"a\nb\"\n3,4,\"", "lon,lat\n1\n1,2,3\n", "ts_plate,lon,lat,ts_error\na,1,2,b\n",
		"lon,lat\n\"1\"\"\",2\n", "\n\nlon,lat\n", "lon,lat\n\x00,\xff\n", "a\"b,lon,lat\n\"x\" y,1,2\n", "lon,lat,\n,,\n", "lon,lat\n1,2\r3,4\n", "\"lon\",\"lat\"\n",
	} {
		f.Add([]byte(seed))
	}
	o := Options{Lookup: lookup(f, CSV)}
	f.Fuzz(func(t *testing.T, in []byte) {
		out, st, ok := fuzzRun(t, CSV, in, o)
		if !ok {
			return
		}
		comma := separator([]byte(firstRecord(out)))
		r := csv.NewReader(strings.NewReader(out))
		r.Comma, r.FieldsPerRecord = rune(comma), -1
		header, err := r.Read()
		if err != nil {
			t.Fatalf("%v in %q", err, out)
		}
		setting, why := -1, -1
		for i, n := range header {
			switch n {
			case "ts_setting":
				setting = i
			case "ts_error":
				why = i
			}
		}
		if setting < 0 || why < 0 {
			t.Fatalf("columns %q", header)
		}
		rows, faults := int64(0), int64(0)
		for {
			row, err := r.Read()
			if err == io.EOF {
				break
			}
			if err != nil {
				t.Fatalf("%v in %q", err, out)
			}
			rows++
			if len(row) < len(header) || (row[setting] == "") == (row[why] == "") {
				t.Fatalf("row %q", row)
			}
			if row[why] != "" {
				faults++
			}
		}
		if rows != st.Rows || faults != st.Errors {
			t.Fatalf("%d rows and %d errors, counted %+v: %q becomes %q", rows, faults, st, in, out)
		}
	})
}

// firstRecord returns the text up to the first newline outside of quotes.
func firstRecord(s string) string {
	quoted := false
	for i := range len(s) {
		switch {
		case s[i] == '"':
			quoted = !quoted
		case s[i] == '\n' && !quoted:
			return s[:i]
		}
	}
	return s
}

// FuzzNDJSON: no panic; as many lines out as in, each blank or a JSON object.
func FuzzNDJSON(f *testing.F) {
	for _, seed := range []string{
		`{"lon":1,"lat":2}`, "{}\n\n[]\nnull\n", `{"lon":"1","lat":2,"tectonic":1,"tectonic_error":2}`, "\xef\xbb\xbf{}", `{"type":"Feature","geometry":{}}`, `{"type":"Feature","geometry":{"type":"Point","coordinates":[1,2]},"properties":{}}`,
		"{\"a\":\"\xff\"}\r\n", `{"lon":1,"lon":1,"lat":1e999}`, `{"\u006con":1,"lat":0}`, "{\"a\":1}}\n{", `{"properties":1,"type":"Feature","geometry":null,"properties":2}`,
	} {
		f.Add([]byte(seed))
	}
	o := Options{Lookup: lookup(f, NDJSON)}
	f.Fuzz(func(t *testing.T, in []byte) {
		out, st, ok := fuzzRun(t, NDJSON, in, o)
		if !ok {
			return
		}
		want := bytes.Count(in, []byte("\n"))
		if len(in) > 0 && in[len(in)-1] != '\n' {
			want++
		}
		if got := strings.Count(out, "\n"); got != want {
			t.Fatalf("%d lines become %d: %q becomes %q", want, got, in, out)
		}
		rows := int64(0)
		for line := range strings.Lines(out) {
			if line = strings.TrimSuffix(line, "\n"); line == "" {
				continue
			}
			rows++
			if !json.Valid([]byte(line)) || line[0] != '{' {
				t.Fatalf("line %q of %q", line, in)
			}
		}
		if rows != st.Rows {
			t.Fatalf("%d rows, counted %+v", rows, st)
		}
	})
}

// FuzzGeoJSON: no panic; what comes out is valid JSON with as many features.
func FuzzGeoJSON(f *testing.F) {
	for _, seed := range []string{
		`{"type":"FeatureCollection","features":[{"type":"Feature","properties":{},"geometry":{"type":"Point","coordinates":[1,2]}}]}`,
		`{"type":"Feature","geometry":{"type":"Point","coordinates":[1,2,3]}}`, `{"features":[],"type":"FeatureCollection","a":1}`, `{"type":"FeatureCollection","features":[{},{}]}`,
		`{"type":"FeatureCollection","features":[1]}`, `{"type":"Feature"}`, `{}`, `[`, `{"type":"FeatureCollection","features":[{"properties":[]}]} `, `{"":{},"type":"Feature","properties":{"tectonic":0}}`,
	} {
		f.Add([]byte(seed))
	}
	o := Options{Lookup: lookup(f, GeoJSON), DepthColumn: ThirdCoordinate}
	f.Fuzz(func(t *testing.T, in []byte) {
		out, st, ok := fuzzRun(t, GeoJSON, in, o)
		if !ok {
			return
		}
		if !json.Valid(in) {
			t.Fatalf("%q is let through", in)
		}
		var members map[string]json.RawMessage // not a struct: its fields match in any letter case
		if err := json.Unmarshal([]byte(out), &members); err != nil {
			t.Fatalf("%v: %q becomes %q", err, in, out)
		}
		var got struct{ Features []json.RawMessage }
		if raw, ok := members["features"]; ok {
			if err := json.Unmarshal(raw, &got.Features); err != nil {
				t.Fatalf("%v: %q becomes %q", err, in, out)
			}
		}
		if n := int64(len(got.Features)); n != st.Rows && st.Rows != 1 {
			t.Fatalf("%d features, counted %+v: %q becomes %q", n, st, in, out)
		}
	})
}

// FuzzArray: no panic; what comes out is an array of as many objects.
func FuzzArray(f *testing.F) {
	for _, seed := range []string{`[]`, `[{"lon":1,"lat":2}]`, `[{},{"lon":"x"}]`, `[1]`, `null`, ` [ {"tectonic":[]} ] `, `[{"type":"Feature","geometry":1}]`, "[{\"\xff\":1}]"} {
		f.Add([]byte(seed))
	}
	o := Options{Lookup: lookup(f, JSON)}
	f.Fuzz(func(t *testing.T, in []byte) {
		out, st, ok := fuzzRun(t, JSON, in, o)
		if !ok {
			return
		}
		var was, got []map[string]json.RawMessage
		if err := json.Unmarshal(in, &was); err != nil {
			t.Fatalf("%q is let through: %v", in, err)
		}
		if err := json.Unmarshal([]byte(out), &got); err != nil {
			t.Fatalf("%v: %q becomes %q", err, in, out)
		}
		if len(got) != len(was) || st.Rows != int64(len(was)) {
			t.Fatalf("%d objects become %d, counted %+v", len(was), len(got), st)
		}
	})
}

// FuzzRead: no panic whatever an annotated file holds; rows are numbered from 1, a place
// is on Earth or none, and a fault of the file says so in words.
func FuzzRead(f *testing.F) {
	for _, seed := range []string{
		"name,lon,lat,ts_setting,ts_distance_km\na,1,2,trench,3\n", "lon;lat;ts_setting\n1,5;2;trench\n", "lon,lat,ts_setting\n,,\n",
		`{"id":"a","lon":1,"tectonic":{"site":{"lon":1,"lat":2},"setting":{"label":"trench"}}}` + "\n" + `{"tectonic_error":"x"}`,
		`{"type":"FeatureCollection","features":[{"id":1,"properties":{"tectonic":{"area_km2":1}}},null,7]}`, `{"type":"Feature","properties":{"tectonic":{}}}`,
		"\xef\xbb\xbf{\"features\":[]}", `{"features":[],"features":[]}`, `{"features":[{"properties":{"tectonic":{"site":{"lon":1e9,"lat":"x"},"setting":{"label":"trench"}}}}]}`, `{"features":[`, "{}\n\x00",
	} {
		for format := range byte(3) {
			f.Add([]byte(seed), format)
		}
	}
	f.Fuzz(func(t *testing.T, in []byte, format byte) {
		n := int64(0)
		err := Read(bytes.NewReader(in), []Format{CSV, NDJSON, GeoJSON}[format%3], ReadOptions{}, func(r Row) error {
			n++
			if r.Number != n {
				t.Fatalf("row %d has number %d", n, r.Number)
			}
			if r.Lon < -180 || r.Lon > 360 || r.Lat < -90 || r.Lat > 90 {
				t.Fatalf("row %d lies at %g, %g", n, r.Lon, r.Lat)
			}
			return nil
		})
		var fault *InputError
		if err != nil && (!errors.As(err, &fault) || fault.Detail == "") {
			t.Fatalf("error %#v", err)
		}
	})
}
