package annotate

import (
	"bytes"
	"context"
	"encoding/csv"
	"encoding/json"
	"fmt"
	"io"
	"runtime"
	"strconv"
	"strings"
	"testing"

	"nearmargin/api/wire"
	"nearmargin/setting"
	"nearmargin/setting/builtin"
	"nearmargin/testdata/bench/rounds"
)

// BenchmarkRatio gives how the annotation of a table and of NDJSON compares with
// the least that others would do, the two measured in turn: a copy by encoding/csv
// that appends as many columns, their numbers formatted anew; json.Unmarshal of
// each line into a map, and json.Encoder on it with an answer of the same size
// (a map as well) added. One core and all.
func BenchmarkRatio(b *testing.B) {
	table := benchInput(csvHeader, csvRow)
	lines := benchInput("", `{"id":"%06d","lon":%.2f,"lat":%.2f}`+"\n")
	run := func(b *testing.B, f Format, in string) func(int) {
		o := Options{Lookup: builtinLookup(b, f)}
		return func(int) {
			st, err := Run(context.Background(), strings.NewReader(in), io.Discard, f, o)
			if err != nil || st.Rows != benchRows || st.Errors != 0 {
				b.Fatalf("%+v, %v", st, err)
			}
		}
	}
	for _, cores := range []int{1, runtime.NumCPU()} {
		for _, x := range []struct {
			name   string
			us     func(int)
			theirs func(int)
		}{
			{"csv", run(b, CSV, table), csvCopy(b, table)},
			{"ndjson", run(b, NDJSON, lines), jsonCopy(b, lines)},
		} {
			b.Run(fmt.Sprintf("%s/cores=%d", x.name, cores), func(b *testing.B) {
				before := runtime.GOMAXPROCS(cores)
				defer runtime.GOMAXPROCS(before)
				for b.Loop() {
					ns := rounds.WallMedians(11, rounds.Slice, x.us, x.theirs)
					b.ReportMetric(benchRows*1e9/ns[0], "rows/s")
					b.ReportMetric(benchRows*1e9/ns[1], "copied-rows/s")
					b.ReportMetric(ns[1]/ns[0], "of-the-copy")
					cpu := rounds.ProcessMedians(11, rounds.Slice, x.us, x.theirs)
					b.ReportMetric(cpu[1]/cpu[0], "of-the-copy-by-cpu")
				}
			})
		}
	}
}

func builtinLookup(b *testing.B, f Format) *setting.Lookup {
	b.Helper()
	bundle, err := builtin.Load()
	if err != nil {
		b.Fatal(err)
	}
	l, err := bundle.Model.Lookup(setting.Options{Brief: f == CSV})
	if err != nil {
		b.Fatal(err)
	}
	return l
}

// csvCopy copies a table with encoding/csv and appends the columns of an answer.
func csvCopy(b *testing.B, in string) func(int) {
	var out bytes.Buffer
	if _, err := Run(context.Background(), strings.NewReader(in), &out, CSV, Options{Lookup: builtinLookup(b, CSV)}); err != nil {
		b.Fatal(err)
	}
	all, err := csv.NewReader(&out).ReadAll()
	if err != nil {
		b.Fatal(err)
	}
	width := len(all[0]) - wire.NumColumns
	numbers := make([][]float64, len(all))
	for i, row := range all[1:] {
		for k, v := range row[width:] {
			if x, err := strconv.ParseFloat(v, 64); err == nil {
				numbers[i] = append(numbers[i], x)
				row[width+k] = "\x00" // to be formatted
			}
		}
	}
	return func(int) {
		r, w := csv.NewReader(strings.NewReader(in)), csv.NewWriter(io.Discard)
		r.ReuseRecord = true
		var row []string
		if _, err := r.Read(); err != nil {
			b.Fatal(err)
		}
		for i := 0; ; i++ {
			given, err := r.Read()
			if err == io.EOF {
				break
			}
			row = append(row[:0], given...)
			next := 0
			for _, v := range all[i+1][width:] {
				if v == "\x00" {
					v = strconv.FormatFloat(numbers[i][next], 'f', -1, 64)
					next++
				}
				row = append(row, v)
			}
			if err := w.Write(row); err != nil {
				b.Fatal(err)
			}
		}
		w.Flush()
	}
}

// jsonCopy copies lines with encoding/json and adds an answer to each.
func jsonCopy(b *testing.B, in string) func(int) {
	var out bytes.Buffer
	if _, err := Run(context.Background(), strings.NewReader(in), &out, NDJSON, Options{Lookup: builtinLookup(b, NDJSON)}); err != nil {
		b.Fatal(err)
	}
	var answers []any
	for d := json.NewDecoder(&out); d.More(); {
		var row map[string]any
		if err := d.Decode(&row); err != nil {
			b.Fatal(err)
		}
		answers = append(answers, row[memberAnswer])
	}
	given := strings.Split(strings.TrimSpace(in), "\n")
	return func(int) {
		e := json.NewEncoder(io.Discard)
		for i, line := range given {
			var row map[string]any
			if err := json.Unmarshal([]byte(line), &row); err != nil {
				b.Fatal(err)
			}
			row[memberAnswer] = answers[i]
			if err := e.Encode(row); err != nil {
				b.Fatal(err)
			}
		}
	}
}
