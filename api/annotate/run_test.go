package annotate

import (
	"bytes"
	"context"
	"encoding/csv"
	"errors"
	"io"
	"strings"
	"testing"

	"nearmargin/api/internal/testmodel"
	"nearmargin/api/wire"
	"nearmargin/setting"
)

// lookup returns a look-up on the made-up model, brief for tables.
func lookup(tb testing.TB, f Format) *setting.Lookup {
	tb.Helper()
	l, err := testmodel.New(tb).Lookup(setting.Options{Brief: f == CSV})
	if err != nil {
		tb.Fatal(err)
	}
	return l
}

// run annotates a text and returns the output.
func run(tb testing.TB, f Format, in string, o Options) (string, Stats, error) {
	tb.Helper()
	if o.Lookup == nil {
		o.Lookup = lookup(tb, f)
	}
	var out bytes.Buffer
	st, err := Run(context.Background(), strings.NewReader(in), &out, f, o)
	return out.String(), st, err
}

// wantFault wants an *InputError at a place, with a part of its text.
func wantFault(t *testing.T, err error, at InputError) {
	t.Helper()
	var got *InputError
	if !errors.As(err, &got) {
		t.Fatalf("error %v, want an *InputError that says %q", err, at.Detail)
	}
	if got.Line != at.Line || got.Parameter != at.Parameter || got.Pointer != at.Pointer || !strings.Contains(got.Detail, at.Detail) {
		t.Errorf("fault %+v, want %+v", *got, at)
	}
	if got.Error() == "" {
		t.Error("the error has no text")
	}
}

// table is a CSV file read by encoding/csv.
type table struct {
	header map[string]int
	names  []string
	rows   [][]string
}

func readTable(tb testing.TB, text string, comma rune) table {
	tb.Helper()
	r := csv.NewReader(strings.NewReader(text))
	r.Comma, r.FieldsPerRecord = comma, -1
	all, err := r.ReadAll()
	if err != nil {
		tb.Fatalf("%v in %s", err, text)
	}
	if len(all) == 0 {
		tb.Fatalf("no header in %q", text)
	}
	t := table{header: map[string]int{}, names: all[0], rows: all[1:]}
	for i, n := range t.names {
		if _, twice := t.header[n]; !twice {
			t.header[n] = i
		}
	}
	return t
}

// cell returns a value by the name of its column.
func (t *table) cell(tb testing.TB, row int, column string) string {
	tb.Helper()
	i, ok := t.header[column]
	if !ok {
		tb.Fatalf("there is no column %q among %v", column, t.names)
	}
	return t.rows[row][i]
}

// TestRunRefuses: what is no format and no prefix.
func TestRunRefuses(t *testing.T) {
	if _, _, err := run(t, "xml", "", Options{}); err == nil || !strings.Contains(err.Error(), "csv, ndjson, geojson or json") {
		t.Errorf("format xml: %v", err)
	}
	for _, prefix := range []string{"1", "_a", "a b", "a,", "ü", strings.Repeat("a", 33), "a\n"} {
		_, _, err := run(t, CSV, "lon,lat\n", Options{Prefix: prefix})
		wantFault(t, err, InputError{Parameter: "prefix", Detail: "letter"})
	}
	for _, prefix := range []string{"a", "A.b-c_9", strings.Repeat("a", 32)} {
		if _, _, err := run(t, CSV, "lon,lat\n", Options{Prefix: prefix}); err != nil {
			t.Errorf("prefix %q: %v", prefix, err)
		}
	}
}

// TestProgressEndsWithTheTotal: for every streamed format.
func TestProgressEndsWithTheTotal(t *testing.T) {
	for f, in := range map[Format]string{
		CSV:     "lon,lat\n" + strings.Repeat("1,2\n", 1000) + "x,1\n",
		NDJSON:  strings.Repeat(`{"lon":1,"lat":2}`+"\n", 1000) + "x\n",
		GeoJSON: `{"type":"FeatureCollection","features":[` + strings.Repeat(`{"type":"Feature","geometry":{"type":"Point","coordinates":[1,2]}},`, 1000) + `{}]}`,
	} {
		var seen []Stats
		_, st, err := run(t, f, in, Options{Progress: func(s Stats) { seen = append(seen, s) }})
		if err != nil {
			t.Fatalf("%s: %v", f, err)
		}
		if want := (Stats{Rows: 1001, Errors: 1}); st != want || len(seen) < 3 || seen[len(seen)-1] != want {
			t.Errorf("%s: %+v, progress %+v, want %+v at the end", f, st, seen, want)
		}
	}
}

// errFull is what a writer says that takes no more.
var errFull = errors.New("no space left")

type fullWriter struct{}

func (fullWriter) Write([]byte) (int, error) { return 0, errFull }

// TestFaultsOfReaderAndWriter come back as they are, never as a fault of the input.
func TestFaultsOfReaderAndWriter(t *testing.T) {
	errDisk := errors.New("disk fault")
	for f, in := range map[Format]string{CSV: "lon,lat\n1,2\n", NDJSON: `{"lon":1,"lat":2}`, GeoJSON: `{"type":"FeatureCollection","features":[]}`, JSON: "[]"} {
		o := Options{Lookup: lookup(t, f)}
		if _, err := Run(context.Background(), strings.NewReader(in), fullWriter{}, f, o); !errors.Is(err, errFull) {
			t.Errorf("%s: a full disk gives %v", f, err)
		}
		r := io.MultiReader(strings.NewReader(in[:2]), &failing{errDisk})
		if _, err := Run(context.Background(), r, io.Discard, f, o); !errors.Is(err, errDisk) {
			t.Errorf("%s: a faulty disk gives %v", f, err)
		}
	}
}

type failing struct{ err error }

func (f *failing) Read([]byte) (int, error) { return 0, f.err }

// TestCancelled: a context that has ended stops the work.
func TestCancelled(t *testing.T) {
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	for f, in := range map[Format]string{CSV: "lon,lat\n1,2\n", NDJSON: `{"lon":1,"lat":2}`, GeoJSON: `{"type":"FeatureCollection","features":[{}]}`} {
		var out bytes.Buffer
		st, err := Run(ctx, strings.NewReader(in), &out, f, Options{Lookup: lookup(t, f)})
		if !errors.Is(err, context.Canceled) || st.Rows != 0 || out.Len() != 0 {
			t.Errorf("%s: %v after %d rows and %d bytes", f, err, st.Rows, out.Len())
		}
	}
}

// columns are the names of the added columns with a prefix.
func columns(prefix string) []string {
	var out []string
	for _, c := range wire.Columns {
		out = append(out, prefix+c)
	}
	return out
}
