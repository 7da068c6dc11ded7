package main

import (
	"encoding/json"
	"encoding/xml"
	"io"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
)

const demo = root + "/testdata/demo/sites.csv"

// annotated annotates the demo table and returns the file.
func annotated(t *testing.T, ending string) string {
	t.Helper()
	file := filepath.Join(t.TempDir(), "sites"+ending)
	if ending == ".csv" {
		if got := invoke(t, nil, "", "annotate", demo, "--out", file); got.status != exitRowErrors {
			t.Fatalf("status %d: %s", got.status, got.stderr)
		}
		return file
	}
	const in = `{"id":"a","lon":-71.6,"lat":-33.5}` + "\n" + `{"id":"b","lon":-29.0,"lat":42.1}` + "\n" + `{"id":"c"}` + "\n"
	got := invoke(t, nil, in, "annotate", "-", "--format", "ndjson", "--out", file)
	if got.status != exitRowErrors {
		t.Fatalf("status %d: %s", got.status, got.stderr)
	}
	return file
}

// TestSummary counts the demo table: 41 rows, of which one has lost its position.
func TestSummary(t *testing.T) {
	got := invoke(t, nil, "", "summary", annotated(t, ".csv"), "--json")
	if got.status != exitDone {
		t.Fatalf("status %d: %s", got.status, got.stderr)
	}
	var s fileSummary
	if err := json.Unmarshal([]byte(got.stdout), &s); err != nil {
		t.Fatal(err)
	}
	if s.Rows != 41 || s.Answered != 40 || s.Errors != 1 || len(s.ErrorRows) != 1 || s.ErrorRows[0].Row != 41 || s.ErrorRows[0].Reason != "lon: is missing" {
		t.Errorf("%d rows, %d answered, %d errors: %+v", s.Rows, s.Answered, s.Errors, s.ErrorRows)
	}
	for name, list := range map[string][]summaryCount{"settings": s.Settings, "confidence": s.Confidence, "types": s.BoundaryTypes} {
		sum := 0
		for _, c := range list {
			sum += c.Rows
		}
		if sum != s.Answered {
			t.Errorf("the %s count %d rows of %d", name, sum, s.Answered)
		}
	}
	sum := 0
	for i, b := range s.Distances {
		sum += b.Rows
		if last := i == len(s.Distances)-1; last != (b.ToKm == nil) || i > 0 && b.FromKm != *s.Distances[i-1].ToKm {
			t.Errorf("bin %d is %+v", i, b)
		}
	}
	if sum != s.Answered {
		t.Errorf("the histogram counts %d rows of %d", sum, s.Answered)
	}
	if s.Low == 0 || s.Low != len(s.LowRows) {
		t.Fatalf("%d rows of low confidence, %d listed", s.Low, len(s.LowRows))
	}
	for _, r := range s.LowRows {
		if !strings.Contains(r.Reason, ": met with ") {
			t.Errorf("row %d does not say what else it could be: %q", r.Row, r.Reason)
		}
	}
	table := invoke(t, nil, "", "summary", annotated(t, ".csv"))
	for _, want := range []string{"41 rows, 40 answered, 1 without an answer", "plate_interior", "25 to 50 km", "1600 km and more", "Low confidence", "row 41 (OS-R-099)"} {
		if !strings.Contains(table.stdout, want) {
			t.Errorf("the table lacks %q:\n%s", want, table.stdout)
		}
	}
}

func TestSummaryOfLines(t *testing.T) {
	got := invoke(t, nil, "", "summary", annotated(t, ".ndjson"))
	if got.status != exitDone || !strings.Contains(got.stdout, "3 rows, 2 answered, 1 without an answer") || !strings.Contains(got.stdout, "row 3 (c)") {
		t.Errorf("status %d\n%s%s", got.status, got.stdout, got.stderr)
	}
}

// TestMap draws the demo table: well-formed, with a marker for each answered row, and
// what a report needs.
func TestMap(t *testing.T) {
	file := filepath.Join(t.TempDir(), "map.svg")
	if got := invoke(t, nil, "", "map", annotated(t, ".csv"), "-o", file, "--title", "Sites <1>"); got.status != exitDone || got.stdout != "" {
		t.Fatalf("status %d: %s%s", got.status, got.stdout, got.stderr)
	}
	raw, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	d := xml.NewDecoder(strings.NewReader(string(raw)))
	markers := 0
	for {
		tok, err := d.Token()
		if err == io.EOF {
			break
		}
		if err != nil {
			t.Fatal(err)
		}
		if e, ok := tok.(xml.StartElement); ok {
			for _, a := range e.Attr {
				if a.Name.Local == "class" && strings.HasPrefix(a.Value, "nm-s-") {
					markers++
				}
			}
		}
	}
	if markers != 40+13+1 { // sites, labels in the legend, the open marker's entry
		t.Errorf("%d markers, want 40 sites and 14 in the legend", markers)
	}
	for _, want := range []string{"Sites &lt;1&gt;", "Osprey Mapocho-4", "Plate interior (", "at the equator", "builtin@", "sha256", "Bird, P. (2003)", "CC-BY-4.0", "Natural Earth", "screening aid", "not drawn: 1"} {
		if !strings.Contains(string(raw), want) {
			t.Errorf("the map lacks %q", want)
		}
	}
	if strings.Contains(string(raw), "NaN") || strings.Contains(string(raw), "Inf") {
		t.Error("the map holds a number that is none")
	}
}

func TestMapAndSummaryRefuse(t *testing.T) {
	plain := filepath.Join(t.TempDir(), "plain.geojson")
	if err := os.WriteFile(plain, []byte(`{"type":"FeatureCollection","features":[{"type":"Feature","properties":{},"geometry":null}]}`), 0o644); err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct {
		name, stdin string
		args        []string
		status      int
		stderr      string
	}{
		{"not annotated", "", []string{"summary", demo}, exitFailed, "no column ts_setting; add the answers first"},
		{"not annotated, GeoJSON", "", []string{"map", plain}, exitFailed, "add the answers first"},
		{"no file", "", []string{"map"}, exitUsage, "want FILE|-"},
		{"no site", "lon,lat,ts_setting,ts_error\n,,,lon: is missing\n", []string{"map", "-"}, exitFailed, "no row has both a place and an answer"},
		{"unknown ending", "", []string{"summary", "x.xlsx"}, exitUsage, "--format"},
	} {
		t.Run(c.name, func(t *testing.T) {
			if got := invoke(t, nil, c.stdin, c.args...); got.status != c.status || !strings.Contains(got.stderr, c.stderr) {
				t.Errorf("status %d, want %d; stderr %q, want %q in it", got.status, c.status, got.stderr, c.stderr)
			}
		})
	}
}

// TestSummaryOfStrangeText: what a stranger's file says steers no terminal, and a long list
// is cut in tables.
func TestSummaryOfStrangeText(t *testing.T) {
	in := "name,lon,lat,ts_setting,ts_error\n"
	for range 30 {
		in += "\"\x1b[31mred\nline \u202etwo\",,,,lon: is missing\n"
	}
	got := invoke(t, nil, in, "summary", "-")
	if got.status != exitDone || strings.ContainsAny(got.stdout, "\x1b\u202e") || !strings.Contains(got.stdout, "row 20 (\uFFFD[31mred line \uFFFDtwo): lon: is missing\n") {
		t.Errorf("status %d: %q", got.status, got.stdout)
	}
	if strings.Contains(got.stdout, "row 21 ") || !strings.Contains(got.stdout, "and 10 more (--rows ") {
		t.Errorf("the list is not cut after 20: %s", got.stdout)
	}
	if got := invoke(t, nil, in, "summary", "-", "--rows", "25"); !strings.Contains(got.stdout, "row 25 ") || !strings.Contains(got.stdout, "and 5 more") {
		t.Errorf("--rows 25 gives %s", got.stdout)
	}
	if got := invoke(t, nil, in, "summary", "-", "--rows", "1001"); got.status != exitUsage {
		t.Errorf("--rows 1001 gives status %d", got.status)
	}
	var s fileSummary
	if err := json.Unmarshal([]byte(invoke(t, nil, in, "summary", "-", "--json").stdout), &s); err != nil || len(s.ErrorRows) != 30 || !strings.HasPrefix(s.ErrorRows[0].Name, "\x1b[31mred\n") {
		t.Errorf("%v: %+v", err, s.ErrorRows)
	}
}

// TestSummaryBins: a bin holds its lower end and not its upper.
func TestSummaryBins(t *testing.T) {
	in := "lon,lat,ts_setting,ts_distance_km\n"
	for _, d := range []string{"0", "9.99", "10", "24.9", "1599.99", "1600", "9000", ""} {
		in += "1,2,plate_interior," + d + "\n"
	}
	got := invoke(t, nil, in, "summary", "-", "--json")
	var s fileSummary
	if err := json.Unmarshal([]byte(got.stdout), &s); err != nil {
		t.Fatalf("%v: %s", err, got.stderr)
	}
	var counts []int
	for _, b := range s.Distances {
		counts = append(counts, b.Rows)
	}
	if want := []int{2, 2, 0, 0, 0, 0, 0, 1, 2}; !slices.Equal(counts, want) {
		t.Errorf("bins %v, want %v", counts, want)
	}
}
