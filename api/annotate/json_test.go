package annotate

import (
	"encoding/json"
	"fmt"
	"strings"
	"testing"

	"github.com/tidwall/gjson"
)

// expectation is what one object or line is to become.
type expectation struct {
	name  string
	in    string
	o     Options
	plate string            // of the answer, "" where there is none
	fault string            // a part of the error, "" where there is none
	raw   map[string]string // members by path, as they are to be spelt; "" where they are to be absent
}

// check compares an object of the output. The answer stands under at.
func (e *expectation) check(t *testing.T, out, at string) {
	t.Helper()
	if !json.Valid([]byte(out)) {
		t.Fatalf("not JSON: %s", out)
	}
	if got := gjson.Get(out, at+"tectonic.plate.code").String(); got != e.plate {
		t.Errorf("plate %q, want %q: %s", got, e.plate, out)
	}
	why := gjson.Get(out, at+"tectonic_error").String()
	if (why == "") != (e.fault == "") || !strings.Contains(why, e.fault) {
		t.Errorf("error %q, want %q", why, e.fault)
	}
	for path, want := range e.raw {
		if got := gjson.Get(out, path).Raw; got != want {
			t.Errorf("%s is %s, want %s", path, got, want)
		}
	}
}

var objects = []expectation{
	{name: "plain", in: `{"lon":61,"lat":5}`, plate: "GG"},
	{name: "number spellings", in: `{"lon":61.000,"lat":5e0,"n":1.50,"big":12345678901234567890,"e":1E+2}`, plate: "GG",
		raw: map[string]string{"lon": "61.000", "lat": "5e0", "n": "1.50", "big": "12345678901234567890", "e": "1E+2"}},
	{name: "unknown members", in: `{"a":{"b":[1, 2 ,{}]},"lon":61,"lat":5,"":null,"u":"\u00fc\/","t":true}`, plate: "GG",
		raw: map[string]string{"a": `{"b":[1, 2 ,{}]}`, "u": `"\u00fc\/"`, "t": "true"}},
	{name: "text", in: `{"lon":"61","lat":" 5 "}`, plate: "GG", raw: map[string]string{"lon": `"61"`, "lat": `" 5 "`}},
	{name: "names in any case", in: `{"Longitude":61,"LAT":5}`, plate: "GG"},
	{name: "an escaped name", in: `{"l\u006fn":61,"lat":5}`, plate: "GG"},
	{name: "members given", in: `{"x":61,"y":5,"lon":0}`, o: Options{LonColumn: "x", LatColumn: "y"}, plate: "GG"},
	{name: "an earlier answer", in: `{"tectonic":{"old":1},"lon":61,"tectonic_error":"old","lat":5}`, plate: "GG", raw: map[string]string{"tectonic.old": ""}},
	{name: "depth", in: `{"lon":62,"lat":-5,"d":100}`, o: Options{DepthColumn: "d"}, plate: "GG", raw: map[string]string{"tectonic.site.depth_km": "100"}},
	{name: "no depth", in: `{"lon":62,"lat":-5}`, o: Options{DepthColumn: "d"}, plate: "GG", raw: map[string]string{"tectonic.site.depth_km": "null"}},
	{name: "depth null", in: `{"lon":62,"lat":-5,"d":null}`, o: Options{DepthColumn: "d"}, plate: "GG", raw: map[string]string{"tectonic.site.depth_km": "null"}},
	{name: "depth not a number", in: `{"lon":62,"lat":-5,"d":[1]}`, o: Options{DepthColumn: "d"}, fault: "d is [1]; it must be a number"},
	{name: "uncertainty", in: `{"lon":62,"lat":-5,"u":2.5}`, o: Options{UncertaintyColumn: "u"}, plate: "GG", raw: map[string]string{"tectonic.site.uncertainty_km": "2.5"}},
	{name: "empty", in: `{}`, fault: "longitude is missing"},
	{name: "no latitude", in: `{"lon":1,"y":2}`, fault: "latitude is missing", raw: map[string]string{"y": "2", "tectonic": ""}},
	{name: "two longitudes", in: `{"lon":1,"long":2,"lat":3}`, fault: `"lon" and "long" could both be the longitude`},
	{name: "one twice", in: `{"lon":1,"lon":2,"lat":3}`, fault: "could both be"},
	{name: "null", in: `{"lon":null,"lat":3}`, fault: "lon: is missing", raw: map[string]string{"lon": "null"}},
	{name: "true", in: `{"lon":true,"lat":3}`, fault: "must be a number"},
	{name: "out of range", in: `{"lon":1,"lat":-91}`, fault: "lat: -91"},
	{name: "beyond floats", in: `{"lon":1e999,"lat":1}`, fault: "can be read"},
	{name: "a decimal comma", in: `{"lon":"1,5","lat":1}`, fault: "decimal comma"},
	{name: "a Feature", in: `{"type":"Feature","geometry":{"type":"Point","coordinates":[61,5]},"properties":{"a":1.0}}`, raw: map[string]string{"properties.a": "1.0", "properties.tectonic.plate.code": `"GG"`, "tectonic": ""}},
	{name: "a type of one's own", in: `{"type":"Feature","lon":61,"lat":5}`, plate: "GG"},
}

func TestNDJSONObjects(t *testing.T) {
	for _, c := range objects {
		t.Run(c.name, func(t *testing.T) {
			out, st, err := run(t, NDJSON, c.in+"\n", c.o)
			if err != nil || st.Rows != 1 || (st.Errors == 1) != (c.fault != "") || strings.Count(out, "\n") != 1 {
				t.Fatalf("%v, %+v: %s", err, st, out)
			}
			c.check(t, out, "")
		})
	}
}

func TestArrayObjects(t *testing.T) {
	for _, c := range objects {
		t.Run(c.name, func(t *testing.T) {
			out, st, err := run(t, JSON, " [ "+c.in+" ,\n"+c.in+"]", c.o)
			if err != nil || st.Rows != 2 || (st.Errors == 2) != (c.fault != "") || gjson.Get(out, "#").Int() != 2 {
				t.Fatalf("%v, %+v: %s", err, st, out)
			}
			for i := range 2 {
				c.check(t, gjson.Get(out, fmt.Sprint(i)).Raw, "")
			}
		})
	}
}

// TestNDJSONLines: lines that are no objects keep their place and their text.
func TestNDJSONLines(t *testing.T) {
	const good = `{"lon":61,"lat":5}`
	for _, c := range []struct {
		name, in string
		want     []string // of each line of the output: "ok", "" for a blank one, or a part of the error
	}{
		{"empty", "", nil},
		{"a blank line", good + "\n\n" + good + "\n", []string{"ok", "", "ok"}},
		{"no newline at the end", good, []string{"ok"}},
		{"CRLF and blanks", "  " + good + "  \r\n" + good + "\r\n", []string{"ok", "ok"}},
		{"byte order mark", "\xef\xbb\xbf" + good, []string{"ok"}},
		{"cut short", `{"lon":61` + "\n" + good, []string{"line 1: not JSON", "ok"}},
		{"an array", "[1]\n" + good, []string{"line 1: not a JSON object", "ok"}},
		{"null", "null", []string{"not a JSON object"}},
		{"two objects", good + good, []string{"not JSON"}},
		{"bytes", "\x00\xff\n" + good, []string{"line 1: not JSON", "ok"}},
		{"text", good + "\nlon,lat\n", []string{"ok", "line 2: not JSON"}},
		{"NaN", `{"lon":NaN,"lat":5}`, []string{"not JSON"}},
	} {
		t.Run(c.name, func(t *testing.T) {
			out, st, err := run(t, NDJSON, c.in, Options{})
			if err != nil {
				t.Fatal(err)
			}
			var lines []string
			for line := range strings.Lines(out) {
				lines = append(lines, strings.TrimSuffix(line, "\n"))
			}
			if len(lines) != len(c.want) {
				t.Fatalf("%d lines, want %d: %q", len(lines), len(c.want), out)
			}
			rows, errs := 0, 0
			for i, want := range c.want {
				why := gjson.Get(lines[i], "tectonic_error").String()
				switch want {
				case "":
					if lines[i] != "" {
						t.Errorf("line %d: %q, want a blank one", i+1, lines[i])
					}
					continue
				case "ok":
					if why != "" || !gjson.Get(lines[i], "tectonic.plate.code").Exists() {
						t.Errorf("line %d: %s", i+1, lines[i])
					}
				default:
					errs++
					if !strings.Contains(why, want) || !gjson.Get(lines[i], "line_text").Exists() || !json.Valid([]byte(lines[i])) {
						t.Errorf("line %d: %s, want %q", i+1, lines[i], want)
					}
				}
				rows++
			}
			if st.Rows != int64(rows) || st.Errors != int64(errs) {
				t.Errorf("%+v, want %d rows and %d errors", st, rows, errs)
			}
		})
	}
}

// TestArrayLimits: what is no array of objects, and one that is too long.
func TestArrayLimits(t *testing.T) {
	for _, c := range []struct {
		name, in string
		want     InputError
	}{
		{"nothing", "", InputError{Line: 1, Detail: "not JSON"}},
		{"null", "null", InputError{Line: 1, Detail: "array of objects"}},
		{"an object", `{"lon":1,"lat":2}`, InputError{Line: 1, Detail: "array of objects"}},
		{"text", `"x"`, InputError{Line: 1, Detail: "array of objects"}},
		{"cut short", `[{"lon":1}`, InputError{Line: 1, Detail: "byte 10"}},
		{"trailing bytes", `[] x`, InputError{Line: 1, Detail: "not JSON"}},
		{"a number within", `[{}, 5]`, InputError{Pointer: "/1", Detail: "must be an object"}},
		{"null within", `[null]`, InputError{Pointer: "/0", Detail: "must be an object"}},
		{"1001 objects", "[" + strings.Repeat("{},", MaxArray) + "{}]", InputError{Pointer: "/1000", Detail: "1001 elements and 1000 are the limit"}},
		{"too many bytes", "[" + strings.Repeat(" ", MaxArrayBytes) + "]", InputError{Line: 1, Detail: "NDJSON or CSV"}},
	} {
		t.Run(c.name, func(t *testing.T) {
			out, _, err := run(t, JSON, c.in, Options{})
			wantFault(t, err, c.want)
			if out != "" {
				t.Errorf("%q was written", out)
			}
		})
	}
	for in, want := range map[string]int64{"[]": 0, "[" + strings.Repeat(`{"lon":1,"lat":2},`, MaxArray-1) + "{}]": MaxArray} {
		out, st, err := run(t, JSON, in, Options{})
		if err != nil || st.Rows != want || gjson.Get(out, "#").Int() != want {
			t.Errorf("%.30s: %d rows, want %d, %v", in, st.Rows, want, err)
		}
	}
}
