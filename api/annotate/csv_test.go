package annotate

import (
	"bufio"
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"slices"
	"strings"
	"testing"
	"testing/iotest"
	"time"
)

// TestTables: given tables as people have them, expect an answer or an error in
// every row, and the cells as they were.
func TestTables(t *testing.T) {
	for _, c := range []struct {
		name   string
		in     string
		comma  rune
		o      Options
		plates []string // of each row
		errors []string // a part of each row's error
	}{
		{name: "plain", in: "id,lon,lat\na,61,5\nb,-90,20\n", plates: []string{"GG", "NA"}},
		{name: "no newline at the end", in: "lon,lat\n61,5", plates: []string{"GG"}},
		{name: "byte order mark", in: "\xef\xbb\xbflon,lat\n61,5\n", plates: []string{"GG"}},
		{name: "CRLF", in: "id,lon,lat\r\na,61,5\r\n", plates: []string{"GG"}},
		{name: "semicolons", in: "id;lon;lat\na;61;5\n", comma: ';', plates: []string{"GG"}},
		{name: "tabs", in: "id\tlon\tlat\na\t61\t5\n", comma: '\t', plates: []string{"GG"}},
		{name: "a blank line first", in: "\n\r\nid;lon;lat\na;61;5\n", comma: ';', plates: []string{"GG"}},
		{name: "blank lines between", in: "lon,lat\n\n61,5\n\n\n-90,20\n", plates: []string{"GG", "NA"}},
		{name: "commas within quotes of the header", in: "\"a,b,c,d\";lon;lat\nx;61;5\n", comma: ';', plates: []string{"GG"}},
		{name: "newline within the header", in: "\"a\nb\";lon;lat\nx;61;5\n", comma: ';', plates: []string{"GG"}},
		{name: "newline within quotes", in: "note,lon,lat\n\"two\nlines\",61,5\n", plates: []string{"GG"}},
		{name: "newline within the last cell", in: "lon,lat,note\n61,5,\"two\nlines\"\n61,5,\"two\nlines\n\"", plates: []string{"GG", "GG"}},
		{name: "bare quotes", in: "pipe,lon,lat\n5\" pipe,61,5\n", plates: []string{"GG"}},
		{name: "upper case", in: "ID,LON,LAT\na,61,5\n", plates: []string{"GG"}},
		{name: "whole words with units", in: "Longitude (deg),LATITUDE [degrees]\n61,5\n", plates: []string{"GG"}},
		{name: "other spellings", in: "long_dd, Lat (°) \n61,5\n", plates: []string{"GG"}},
		{name: "WGS84", in: "lon_wgs84,lat wgs 84\n61,5\n", plates: []string{"GG"}},
		{name: "columns given", in: "lon,x,y\n0,61,5\n", o: Options{LonColumn: "x", LatColumn: "y"}, plates: []string{"GG"}},
		{name: "one column given", in: "lon,Longitude,lat\n0,61,5\n", o: Options{LonColumn: "Longitude"}, plates: []string{"GG"}},
		{name: "latitude first", in: "lat,lon\n5,61\n", plates: []string{"GG"}},
		{name: "decimal comma", in: "lon;lat\n61,5;5,25\n61.5;5\n", comma: ';', plates: []string{"GG", "GG"}},
		{name: "decimal comma after tabs", in: "lon\tlat\n61,5\t5\n", comma: '\t', plates: []string{"GG"}},
		{name: "decimal comma within quotes", in: "lon,lat\n\"61,5\",5\n", plates: []string{""}, errors: []string{"a decimal comma is read only where"}},
		{name: "thousands", in: "lon;lat\n1.061,5;5\n", comma: ';', plates: []string{""}, errors: []string{"not a number"}},
		{name: "blanks around", in: "lon,lat\n 61 ,\t5\n", plates: []string{"GG"}},
		{name: "exponents and signs", in: "lon,lat\n+6.1e1,5E0\n", plates: []string{"GG"}},
		{name: "degrees and minutes", in: "lon,lat\n61°30'E,5\n", plates: []string{""}, errors: []string{"-33.45 for 33°27'S"}},
		{name: "missing values", in: "lon,lat\n-999.25,5\nNaN,5\nNULL,5\n,5\n ,5\n-,5\nn/a,5\nnone,5\n61,NA\n-9999,-9999\n",
			plates: make([]string, 10), errors: []string{"lon: is missing", "lon: is missing", "lon: is missing", "lon: is missing", "lon: is missing", "lon: is missing", "lon: is missing", "lon: is missing", "lat: is missing", "lon: is missing"}},
		{name: "out of range", in: "lon,lat\n361,5\n5,91\n-36,-172\n", plates: make([]string, 3), errors: []string{"lon: 361", "lat: 91", "swapped?"}},
		{name: "infinity", in: "lon,lat\nInf,5\n1e999,5\n", plates: make([]string, 2), errors: []string{"not a number", "can be read"}},
		{name: "short row", in: "id,lon,lat,note\na,61,5\nb,61\nc\n", plates: []string{"GG", "", ""}, errors: []string{"", "2 fields and the header 4", "1 fields"}},
		{name: "long row", in: "id,lon,lat\na,61,5,more\nb,61,5,,\n", plates: []string{"", "GG"}, errors: []string{"4 fields and the header 3"}},
		{name: "a zero byte", in: "lon,lat\n6\x001,5\n61,5\n", plates: []string{"", "GG"}, errors: []string{"not a number"}},
		{name: "Latin-1 in a cell", in: "n\xfcmber,lon,lat\n"[2:] + "\xfc,61,5\n", plates: []string{"GG"}},
		{name: "depth and uncertainty", in: "lon,lat,d,u\n62,-5,100,3\n62,-5,,\n62,-5,900,\n62,-5,1,x\n", o: Options{DepthColumn: "d", UncertaintyColumn: "u"},
			plates: []string{"GG", "GG", "", ""}, errors: []string{"", "", "depth_km: 900", "uncertainty_km:"}},
		{name: "header alone", in: "lon,lat\n"},
	} {
		t.Run(c.name, func(t *testing.T) {
			if c.comma == 0 {
				c.comma = ','
			}
			out, st, err := run(t, CSV, c.in, c.o)
			if err != nil {
				t.Fatal(err)
			}
			got := readTable(t, out, c.comma)
			if len(got.rows) != len(c.plates) || st.Rows != int64(len(c.plates)) {
				t.Fatalf("%d rows, counted %d, want %d: %s", len(got.rows), st.Rows, len(c.plates), out)
			}
			faults := 0
			for i, plate := range c.plates {
				if p := got.cell(t, i, "ts_plate"); p != plate {
					t.Errorf("row %d: plate %q, want %q", i+1, p, plate)
				}
				want, why := "", got.cell(t, i, "ts_error")
				if i < len(c.errors) {
					want = c.errors[i]
				}
				if (want == "") != (why == "") || !strings.Contains(why, want) {
					t.Errorf("row %d: error %q, want %q", i+1, why, want)
				}
				if why != "" {
					faults++
				}
			}
			if st.Errors != int64(faults) {
				t.Errorf("%d errors counted, %d are there", st.Errors, faults)
			}
			if crlf := strings.Contains(c.in, "lat\r\n"); crlf != strings.HasSuffix(out, "\r\n") {
				t.Errorf("the newline is not that of the input: %q", out[len(out)-2:])
			}
		})
	}
}

// TestTablesRefused: faults of a table as a whole.
func TestTablesRefused(t *testing.T) {
	for _, c := range []struct {
		name string
		in   string
		o    Options
		want InputError
	}{
		{"empty", "", Options{}, InputError{Line: 1, Detail: "id,lon,lat"}},
		{"blank lines alone", "\n\r\n\n", Options{}, InputError{Line: 1, Detail: "empty"}},
		{"a byte order mark alone", "\xef\xbb\xbf", Options{}, InputError{Line: 1, Detail: "empty"}},
		{"UTF-16, little end first", "\xff\xfel\x00o\x00", Options{}, InputError{Line: 1, Detail: "save it as UTF-8"}},
		{"UTF-16, big end first", "\xfe\xff\x00l\x00o", Options{}, InputError{Line: 1, Detail: "save it as UTF-8"}},
		{"zero bytes in the header", "lon,l\x00at\n1,2\n", Options{}, InputError{Line: 1, Detail: "zero byte"}},
		{"Latin-1 in the header", "lon,lat,gr\xfc\xdfe\n1,2,3\n", Options{}, InputError{Line: 1, Detail: "column 3 is not UTF-8"}},
		{"no coordinates", "id,east,north\n", Options{}, InputError{Line: 1, Parameter: "lon_column", Detail: "the columns are id, east, north"}},
		{"no latitude", "lon,y\n", Options{}, InputError{Line: 1, Parameter: "lat_column", Detail: "the columns are lon, y"}},
		{"two longitudes", "lon,LONG (deg),lat\n", Options{}, InputError{Line: 1, Parameter: "lon_column", Detail: "columns 1 (lon) and 2 (LONG (deg))"}},
		{"two latitudes", "lat,lon,lat\n", Options{}, InputError{Line: 1, Parameter: "lat_column", Detail: "columns 1 (lat) and 3 (lat)"}},
		{"a column that is not there", "lon,lat\n", Options{LonColumn: "Lon"}, InputError{Line: 1, Parameter: "lon_column", Detail: `no column "Lon"; the columns are lon, lat`}},
		{"one for both", "a,b\n", Options{LonColumn: "a", LatColumn: "a"}, InputError{Line: 1, Parameter: "lat_column", Detail: "as longitude and as latitude"}},
		{"no depth", "lon,lat\n", Options{DepthColumn: "z"}, InputError{Line: 1, Parameter: "depth_column", Detail: `"z"`}},
		{"no uncertainty", "lon,lat\n", Options{UncertaintyColumn: "u"}, InputError{Line: 1, Parameter: "uncertainty_column", Detail: `"u"`}},
		{"many columns", strings.Repeat("c,", 100) + "c\n", Options{}, InputError{Line: 1, Parameter: "lon_column", Detail: "and 71 more"}},
		{"an open quote", "lon,lat,n\n1,2,a\n3,4,\"b\n5,6,c\n", Options{}, InputError{Line: 3, Detail: "not closed"}},
	} {
		t.Run(c.name, func(t *testing.T) {
			out, _, err := run(t, CSV, c.in, c.o)
			wantFault(t, err, c.want)
			if out != "" {
				t.Errorf("%q was written", out)
			}
		})
	}
}

// TestCellsComeBack: the caller's own cells, character by character.
func TestCellsComeBack(t *testing.T) {
	in := "id,lon,lat,plate,note\n" +
		"007,61.000,5e0,NA,\"a, b\"\n" +
		"0x1F,-0,+0.0,,\"say \"\"x\"\"\"\n" +
		"1e5,NA,NA,NA, lead\n" +
		"=1+1,61,5,TRUE,\"l1\nl2\"\n"
	out, _, err := run(t, CSV, in, Options{})
	if err != nil {
		t.Fatal(err)
	}
	got, want := readTable(t, out, ','), readTable(t, in, ',')
	if !slices.Equal(got.names, append(slices.Clone(want.names), columns("ts_")...)) {
		t.Errorf("columns %v", got.names)
	}
	for i := range want.rows {
		if !slices.Equal(got.rows[i][:5], want.rows[i]) {
			t.Errorf("row %d: %q, want %q", i+1, got.rows[i][:5], want.rows[i])
		}
	}
	if notes := got.cell(t, 1, "ts_notes"); !strings.Contains(notes, "zero_coordinates") {
		t.Errorf("0, 0 has the notes %q", notes)
	}
	if why := got.cell(t, 2, "ts_error"); why != "lon: is missing" {
		t.Errorf("NA, NA has the error %q", why)
	}
}

// TestColumnsReplacedInPlace: columns of an earlier pass are filled anew where
// they stand, and no other is touched.
func TestColumnsReplacedInPlace(t *testing.T) {
	in := "ts_setting,lon,ts_error,lat,xx_plate,ts_plate\nold,61,old,5,mine,old\n"
	out, _, err := run(t, CSV, in, Options{})
	if err != nil {
		t.Fatal(err)
	}
	got := readTable(t, out, ',')
	if !slices.Equal(got.names[:6], []string{"ts_setting", "lon", "ts_error", "lat", "xx_plate", "ts_plate"}) {
		t.Errorf("columns %v", got.names)
	}
	if row := got.rows[0][:6]; !slices.Equal(row, []string{"forearc", "61", "", "5", "mine", "GG"}) {
		t.Errorf("row %q", row)
	}
	sorted := slices.Sorted(slices.Values(got.names))
	if len(slices.Compact(sorted)) != len(got.names) || len(got.names) != 3+len(columns("ts_")) {
		t.Errorf("columns stand twice or lack: %v", got.names)
	}
	out, _, err = run(t, CSV, in, Options{Prefix: "xx_"})
	if err != nil {
		t.Fatal(err)
	}
	got = readTable(t, out, ',')
	if row := got.rows[0][:6]; !slices.Equal(row, []string{"old", "61", "old", "5", "GG", "old"}) {
		t.Errorf("with another prefix: %q", row)
	}
}

// TestExtraFieldsStayAtTheEnd: fields beyond the header come back after the
// added columns.
func TestExtraFieldsStayAtTheEnd(t *testing.T) {
	out, _, err := run(t, CSV, "lon,lat\n61,5,x,y\n", Options{})
	if err != nil {
		t.Fatal(err)
	}
	got := readTable(t, out, ',')
	if row := got.rows[0]; len(row) != len(got.names)+2 || !slices.Equal(row[len(row)-2:], []string{"x", "y"}) {
		t.Errorf("row %q", row)
	}
}

// endless gives a text and then one byte, far more often than it should be
// asked for, and counts.
type endless struct {
	head []byte
	fill byte
	n    int64
}

func (e *endless) Read(p []byte) (int, error) {
	if e.n > 64*MaxRowBytes {
		return 0, io.EOF
	}
	n := copy(p, e.head)
	e.head = e.head[n:]
	for i := n; i < len(p); i++ {
		p[i] = e.fill
	}
	e.n += int64(len(p))
	return len(p), nil
}

// TestRowsWithoutEnd: given input that never ends its row, in each streamed
// format, expect an error that says so after little more than one row's worth.
func TestRowsWithoutEnd(t *testing.T) {
	for f, head := range map[Format]string{
		CSV:     "lon,lat\n61,5\n61,\"5",
		NDJSON:  "{\"lon\":1,\"lat\":2}\n{\"x\":\"",
		GeoJSON: `{"type":"FeatureCollection","features":[{"type":"Feature"},{"x":"`,
	} {
		in := &endless{head: []byte(head), fill: 'x'}
		var out bytes.Buffer
		_, err := Run(context.Background(), in, &out, f, Options{Lookup: lookup(t, f)})
		if err == nil || !strings.Contains(err.Error(), "longer than 1048576 bytes") {
			t.Errorf("%s: %v", f, err)
		}
		if in.n > 4*MaxRowBytes {
			t.Errorf("%s: %d bytes were read", f, in.n)
		}
	}
	_, err := Run(context.Background(), &endless{head: []byte("["), fill: ' '}, io.Discard, JSON, Options{Lookup: lookup(t, JSON)})
	if err == nil || !strings.Contains(err.Error(), "send NDJSON or CSV") {
		t.Errorf("json: %v", err)
	}
}

// TestFirstLineIsNotWaitedBeyond sends a table in two parts, the second only when the
// separator has been found in the first.
func TestFirstLineIsNotWaitedBeyond(t *testing.T) {
	for _, head := range []string{"id;lon;lat\n", "\xef\xbb\xbf\r\n\"a\nb\";lon;lat\r\n"} {
		in, out := io.Pipe()
		go out.Write([]byte(head))
		late := time.AfterFunc(10*time.Second, func() { out.CloseWithError(errors.New("it waits for more")) })
		var j csvJob
		if _, err := j.sniff(bufio.NewReaderSize(in, 64<<10)); err != nil || j.comma != ';' {
			t.Errorf("%q: separator %q, %v", head, j.comma, err)
		}
		if !late.Stop() {
			t.Errorf("%q: it waited for more", head)
		}
		in.Close()
	}
}

// TestHeadComesByteByByte reads tables a byte at a time.
func TestHeadComesByteByByte(t *testing.T) {
	for _, text := range []string{"lon,lat\n1,2\n", "\xef\xbb\xbf\n\nlon\tlat\r\n1\t2\r\n", "lon,lat", `"l` + "\n" + `on",lat` + "\n1,2\n", ""} {
		var whole, bytewise csvJob
		n, err := whole.sniff(bufio.NewReaderSize(strings.NewReader(text), 64<<10))
		m, err2 := bytewise.sniff(bufio.NewReaderSize(iotest.OneByteReader(strings.NewReader(text)), 64<<10))
		if n != m || whole.comma != bytewise.comma || whole.newline != bytewise.newline || fmt.Sprint(err) != fmt.Sprint(err2) {
			t.Errorf("%q: %d, %q, %q, %v; a byte at a time %d, %q, %q, %v", text, n, whole.comma, whole.newline, err, m, bytewise.comma, bytewise.newline, err2)
		}
	}
}
