package annotate

import (
	"bytes"
	"context"
	"encoding/csv"
	"encoding/json"
	"maps"
	"slices"
	"strconv"
	"strings"
	"testing"

	"github.com/tidwall/gjson"
	"pgregory.net/rapid"
)

// drawNumber draws the text of a coordinate: mostly good, sometimes not.
func drawNumber(t *rapid.T, name string, limit float64) string {
	return rapid.OneOf(
		rapid.Map(rapid.Float64Range(-limit, limit), func(x float64) string { return strconv.FormatFloat(x, 'f', 4, 64) }),
		rapid.Map(rapid.Float64Range(-limit, limit), func(x float64) string { return strconv.FormatFloat(x, 'e', -1, 64) }),
		rapid.SampledFrom([]string{"", "NA", "-999.25", "x", "0", "-0", "1e999", "999", "1,5", `"`}),
	).Draw(t, name)
}

// cellText draws what people write into cells. A carriage return before a line
// feed is left out: encoding/csv drops it.
var cellText = rapid.Map(rapid.OneOf(
	rapid.StringOf(rapid.RuneFrom([]rune("ab1.,;\t \"'\n-é=日"))),
	rapid.String(),
	rapid.SampledFrom([]string{"", "007", "NA", "TRUE", "1e5", " lead", "trail ", "a,b", `say "x"`}),
), func(s string) string { return strings.ToValidUTF8(strings.ReplaceAll(s, "\r", ""), "?") })

// drawTable draws rows under a header that names its coordinates.
func drawTable(t *rapid.T) ([]string, [][]string) {
	header := []string{"id", "lon", "note", "lat", "ts_family", "plate"}
	n := rapid.IntRange(0, 12).Draw(t, "rows")
	rows := make([][]string, n)
	for i := range rows {
		rows[i] = []string{
			cellText.Draw(t, "id"), drawNumber(t, "lon", 180), cellText.Draw(t, "note"), drawNumber(t, "lat", 90),
			cellText.Draw(t, "family"), cellText.Draw(t, "plate"),
		}
	}
	return header, rows
}

func writeCSV(t *rapid.T, comma rune, header []string, rows [][]string) string {
	var b bytes.Buffer
	w := csv.NewWriter(&b)
	w.Comma = comma
	if err := w.WriteAll(append([][]string{header}, rows...)); err != nil {
		t.Fatal(err)
	}
	return b.String()
}

// TestTableProperties: given any table, expect as many rows out as in, in order,
// the cells as they were, and the same bytes when it is annotated once more.
func TestTableProperties(t *testing.T) {
	l := lookup(t, CSV)
	rapid.Check(t, func(t *rapid.T) {
		header, rows := drawTable(t)
		comma := rapid.SampledFrom([]rune{',', ';', '\t'}).Draw(t, "comma")
		pass := func(in string) (string, Stats) {
			var out bytes.Buffer
			st, err := Run(context.Background(), strings.NewReader(in), &out, CSV, Options{Lookup: l})
			if err != nil {
				t.Fatalf("%v in %q", err, in)
			}
			return out.String(), st
		}
		once, st := pass(writeCSV(t, comma, header, rows))
		r := csv.NewReader(strings.NewReader(once))
		r.Comma = comma
		got, err := r.ReadAll() // also checks that all rows have as many fields
		if err != nil {
			t.Fatalf("%v in %q", err, once)
		}
		if len(got) != len(rows)+1 || st.Rows != int64(len(rows)) {
			t.Fatalf("%d rows become %d, counted %d", len(rows), len(got)-1, st.Rows)
		}
		at := map[string]int{}
		for i, name := range got[0] {
			at[name] = i
		}
		errors := 0
		for i, row := range rows {
			for j, name := range header {
				if name != "ts_family" && got[i+1][j] != row[j] {
					t.Fatalf("row %d: %s is %q, was %q", i+1, name, got[i+1][j], row[j])
				}
			}
			answered, why := got[i+1][at["ts_setting"]] != "", got[i+1][at["ts_error"]]
			if answered == (why != "") || answered != (got[i+1][at["ts_plate"]] != "") {
				t.Fatalf("row %d has both an answer and an error, or none: %q", i+1, got[i+1])
			}
			if !answered {
				errors++
			}
		}
		if st.Errors != int64(errors) {
			t.Fatalf("%d errors counted, there are %d", st.Errors, errors)
		}
		if twice, again := pass(once); twice != once || again != st {
			t.Fatalf("annotated once more:\n%q\nbefore:\n%q", twice, once)
		}
	})
}

// TestJSONProperties: the same for NDJSON, GeoJSON and arrays.
func TestJSONProperties(t *testing.T) {
	l := lookup(t, NDJSON)
	member := rapid.MapOf(rapid.StringMatching(`[a-z]{1,3}`).Filter(func(s string) bool { return s != "lon" && s != "lat" }),
		rapid.SampledFrom([]string{"1.0", "1e2", "null", `"t\u00e9xt"`, "[1, {}]", "-0"}))
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(0, 8).Draw(t, "rows")
		format := rapid.SampledFrom([]Format{NDJSON, GeoJSON, JSON}).Draw(t, "format")
		var items []string
		var kept []map[string]string
		for range n {
			own := member.Draw(t, "members")
			kept = append(kept, own)
			text := ""
			for _, k := range slices.Sorted(maps.Keys(own)) {
				text += `"` + k + `":` + own[k] + ","
			}
			lon := rapid.SampledFrom([]string{"61", "-1.50", "1e2", "400", "null"}).Draw(t, "lon")
			if format == GeoJSON {
				items = append(items, `{"type":"Feature","properties":{`+strings.TrimSuffix(text, ",")+`},"geometry":{"type":"Point","coordinates":[`+lon+`,5.0]}}`)
			} else {
				items = append(items, `{`+text+`"lon":`+lon+`,"lat":5.0}`)
			}
		}
		in, list, own := "", "", ""
		switch format {
		case NDJSON:
			in = strings.Join(items, "\n")
		case JSON:
			in = "[" + strings.Join(items, ",") + "]"
		case GeoJSON:
			in, list, own = `{"type":"FeatureCollection","features":[`+strings.Join(items, ",")+`]}`, "features", "properties."
		}
		pass := func(in string) (string, Stats) {
			var out bytes.Buffer
			st, err := Run(context.Background(), strings.NewReader(in), &out, format, Options{Lookup: l})
			if err != nil {
				t.Fatalf("%v in %s", err, in)
			}
			return out.String(), st
		}
		once, st := pass(in)
		var got []gjson.Result
		if format == NDJSON {
			for line := range strings.Lines(once) {
				got = append(got, gjson.Parse(line))
			}
		} else if list == "" {
			got = gjson.Parse(once).Array()
		} else {
			got = gjson.Get(once, list).Array()
		}
		if len(got) != n || st.Rows != int64(n) {
			t.Fatalf("%d rows become %d, counted %d: %s", n, len(got), st.Rows, once)
		}
		for i, r := range got {
			if !json.Valid([]byte(r.Raw)) {
				t.Fatalf("row %d: not JSON: %s", i+1, r.Raw)
			}
			for k, want := range kept[i] {
				if v := r.Get(own + k).Raw; v != want {
					t.Fatalf("row %d: %s is %s, was %s", i+1, k, v, want)
				}
			}
			if r.Get(own+"tectonic").Exists() == r.Get(own+"tectonic_error").Exists() {
				t.Fatalf("row %d has both an answer and an error, or none: %s", i+1, r.Raw)
			}
		}
		if twice, again := pass(once); twice != once || again != st {
			t.Fatalf("annotated once more:\n%s\nbefore:\n%s", twice, once)
		}
	})
}
